"""No more core recovered than was cut, and no sample below what was recovered."""

from typing import Any

import numpy as np
import pandas as pd

from qc.rules.outside_core import CUT
from qc.rules.rule import CANNOT_EVALUATE, FIRE, NOT_APPLICABLE, PASS, REJECT, WARN, Answer, Finding, Rule, say
from qc.rules.table import Table


def check(table: Table, *, recovery_warn: float, recovery_max: float, tolerance: float) -> Answer:
    """For each core run its recovery, and each core sample in it against the end of what was recovered."""
    samples = table.samples()
    outcomes: list[tuple[int, str]] = []
    findings: list[Finding] = []
    for well, runs in table.cores.groupby("well", sort=True):
        own = samples[samples["well"] == well]
        if own.empty:
            continue
        cut = own[own["kind"].isin(CUT) & own["top_m"].notna() & ~own["depth_kind"].isin(["logger", "TVD"])]
        run: Any
        for run in runs.sort_values("number").itertuples():
            within = cut[(cut["top_m"] >= run.top_m) & (cut["top_m"] <= run.base_m)]
            rows = tuple(int(row) for row in within.index) or (int(own.index[0]),)
            made = _recovery(run, rows, recovery_warn, recovery_max)
            made += [_below(within, int(row), run, tolerance) for row in within.index]
            outcomes += [(row, outcome) for row, outcome, _ in made]
            findings += [finding for _, _, finding in made if finding]
    if not outcomes:
        return Answer(pd.Series(NOT_APPLICABLE, index=samples.index, dtype=object))
    return Answer(pd.Series([one for _, one in outcomes], index=[row for row, _ in outcomes], dtype=object), findings)


Made = tuple[int, str, Finding | None]


def recovery(cut: float, recovered: float) -> float:
    """Recovery [%]."""
    return 100 * recovered / cut


def _recovery(run: Any, rows: tuple[int, ...], warn: float, most: float) -> list[Made]:
    """The outcome of one run."""
    recovered = np.nan if run.recovered_m is None else float(run.recovered_m)
    if np.isnan(recovered):
        return [(rows[0], CANNOT_EVALUATE, None)]
    share = recovery(run.base_m - run.top_m, recovered)
    if share <= warn + 1e-9:
        return [(rows[0], PASS, None)]
    text = (
        f"Core {run.number:.0f} recovered {say(recovered)} m of {say(run.base_m - run.top_m)} m cut, {share:.1f} %, "
        f"more than {say(most if share > most else warn)} %."
    )
    more = {
        "interval_m": [float(run.top_m), float(run.base_m)],
        "alternatives": ["rounding of the lengths", "rubble of the run before picked up", "expansion of the core", "typing error"],
        "discriminating_test": "compare with the coring report and the core photographs",
    }  # fmt: skip
    severity = REJECT if share > most else WARN
    limit = most if share > most else warn
    return [(rows[0], FIRE, Finding(None, "", severity, text, (), round(share, 2), limit, rows=rows, more=more))]


def _below(within: pd.DataFrame, row: int, run: Any, tolerance: float) -> Made:
    """The outcome of one core sample of the run."""
    recovered = np.nan if run.recovered_m is None else float(run.recovered_m)
    if np.isnan(recovered):
        return row, CANNOT_EVALUATE, None
    depth, end = float(within["top_m"][row]), float(run.top_m) + recovered
    if depth <= end + tolerance:
        return row, PASS, None
    text = (
        f"{depth:.2f} m lies below the {say(recovered)} m recovered of core {run.number:.0f}, which end at {end:.2f} m."
    )
    more = {
        "alternatives": ["lost core was not at the bottom of the run", "depth shifted to the log", "typing error"],
        "discriminating_test": "core photographs with depth marks",
    }
    return row, FIRE, Finding(row, "", WARN, text, (), depth, round(end, 3), more=more)


RULE = Rule(
    id="core_recovery",
    family="depth",
    title="Core recovered and core cut",
    tests="A run cannot recover more than it cut, and its samples lie within what was recovered.",
    check=check,
    inputs=("core runs", "recovered length", "top"),
    flags="the run, or the sample below what was recovered",
    formula="100 recovered/cut > 101: warning; > 105: candidate for rejection; depth > top + recovered",
    message="The core is longer than what was cut, or the sample below what was recovered",
    source="our default, no publication",
    must_not_fire="On depths shifted to the log; where the recovered length is not recorded (cannot be evaluated).",
    example="Cut 9.0 m, recovered 9.4 m: 104.4 %, warning.",
)
