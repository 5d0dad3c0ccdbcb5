"""Core samples lie in a core run."""

from typing import Any

import numpy as np
import pandas as pd

from qc.rules.rule import CANNOT_EVALUATE, FIRE, NOT_APPLICABLE, PASS, WARN, Answer, Finding, Rule
from qc.rules.table import IDENTITY, Table

CUT = frozenset({"core", "plug"})


def check(table: Table, *, tolerance: float) -> Answer:
    """One check for each core sample or plug. Logger's depths are compared with the runs shifted to the log."""
    samples = table.samples()[list(IDENTITY)]  # without the analytes, whose many columns make each row slow
    outcome = pd.Series(NOT_APPLICABLE, index=samples.index, dtype=object)
    findings: list[Finding] = []
    for well, cut in samples[samples["kind"].isin(CUT)].groupby("well", sort=True):
        runs = table.cores[table.cores["well"] == well].sort_values("top_m")
        for row in cut.index:
            outcome[row] = _outcome(cut.loc[row], runs, tolerance)
            if outcome[row] == FIRE:
                findings.append(_finding(cut.loc[row], int(row), runs, tolerance))
    return Answer(outcome, findings)


def _outcome(sample: pd.Series, runs: pd.DataFrame, tolerance: float) -> str:
    depth, kind = sample["top_m"], sample["depth_kind"]
    if runs.empty or pd.isna(depth) or kind == "TVD":
        return CANNOT_EVALUATE
    shifted = runs["shift_m"].astype(float)
    if kind == "logger" and shifted.isna().all():
        return CANNOT_EVALUATE
    inside = pd.Series(False, index=runs.index)
    if kind != "logger":
        inside |= depth_inside(depth, runs["top_m"], runs["base_m"], tolerance)
    if kind in {"logger", ""}:
        inside |= depth_inside(depth, runs["top_m"] + shifted, runs["base_m"] + shifted, tolerance)
    return PASS if inside.any() else FIRE


def depth_inside(depth: float, top: Any, base: Any, tolerance: float) -> Any:
    return (depth >= top - tolerance - 1e-9) & (depth <= base + tolerance + 1e-9)


def _finding(sample: pd.Series, row: int, runs: pd.DataFrame, tolerance: float) -> Finding:
    depth = float(sample["top_m"])
    away = pd.concat([(runs["top_m"] - depth).clip(lower=0), (depth - runs["base_m"]).clip(lower=0)], axis=1).max(
        axis=1
    )
    near = runs.iloc[int(np.argmin(away.to_numpy(dtype=float)))]
    text = f"{depth:.2f} m is in no core run; the nearest is core {near['number']:.0f}, {near['top_m']:.2f}-{near['base_m']:.2f} m."
    more = {
        "alternatives": ["depth shifted to the log", "run not recorded", "typing error"],
        "discriminating_test": "compare with the core log and its recorded shift",
    }
    return Finding(row, "", WARN, text, (), depth, [float(near["top_m"]), float(near["base_m"])], more=more)


RULE = Rule(
    id="outside_core",
    family="depth",
    title="Core samples lie in a core run",
    tests="A core sample or plug must come from a recorded core run, in the same kind of depth.",
    check=check,
    inputs=("top", "depth kind", "core runs"),
    flags="the sample",
    formula="depth outside every run ± 0.3 m; log = driller + shift",
    message="The depth is in no core run",
    source="our default, no publication",
    must_not_fire="On logger's depths where no shift is recorded (cannot be evaluated); on sidewall cores.",
    example="Core 2 cut 2500-2518, plug 2519.4 fires.",
)
