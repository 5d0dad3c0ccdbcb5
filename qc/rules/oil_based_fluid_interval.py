"""An interval in which an oil-based drilling fluid shows in the samples."""

from typing import Any

import numpy as np
import pandas as pd

from qc.rules.facts import not_rock, says
from qc.rules.mud import OILY, inside
from qc.rules.rule import CANNOT_EVALUATE, FIRE, NOT_APPLICABLE, PASS, WARN, Answer, Finding, Rule, say
from qc.rules.spans import exact
from qc.rules.table import Table


def check(table: Table, *, osi_max: float, share_min: float, samples_min: int, step_samples: int) -> Answer:
    """One check for each oil- or synthetic-based interval of each well; one ``cannot_evaluate`` a well without record."""
    rows = table.of("pyrolysis")
    rows = rows[~not_rock(rows) & rows["kind"].ne("outcrop") & ~says(rows, r"\bwashed\b|\bextracted\b")]
    osi = pd.Series(100 * exact(rows, "S1") / np.where(rows["TOC"] > 0, exact(rows, "TOC"), np.nan), index=rows.index)
    high = (osi > osi_max) | pd.Series(rows.index.isin(_pi_high(table)), index=rows.index)
    outcomes: dict[int, list[str]] = {}
    findings: list[Finding] = []
    for well, members in rows[osi.notna() & rows["top_m"].notna()].groupby("well", sort=True):
        muds = table.muds[table.muds["well"] == well]
        first = int(members.index[0])
        if muds.empty:
            outcomes[first] = [CANNOT_EVALUATE]
            continue
        oily = muds[muds["kind"].isin(OILY)]
        seen = members.assign(high=high[members.index], osi=osi[members.index]).sort_values("top_m", kind="stable")
        limits = (share_min, samples_min, step_samples)
        judged = [_interval(seen, mud, limits) for mud in oily.itertuples()]
        outcomes[first] = [outcome for outcome, _ in judged] or [NOT_APPLICABLE]
        findings += [finding for _, finding in judged if finding]
    index = [row for row, made in outcomes.items() for _ in made]
    return Answer(pd.Series([one for made in outcomes.values() for one in made], index=index, dtype=object), findings)


def _pi_high(table: Table) -> set[int]:
    """Rows above the PI of their maturity stage, by the rule that ran before."""
    before = table.answers.get("pi_high_for_maturity")
    return {finding.row for finding in before.findings if finding.row is not None} if before else set()


def _interval(seen: pd.DataFrame, mud: Any, limits: tuple[float, int, int]) -> tuple[str, Finding | None]:
    """Outcome of one interval: enough of its samples are high, and the step stands at the change of fluid.

    ``seen``: samples of the well from the top down, with ``high`` and ``osi``.
    """
    share_min, samples_min, step_samples = limits
    within = seen[inside(seen, mud.well, mud.top_m, mud.base_m)]
    above = seen[seen["top_m"] < mud.top_m]
    if len(within) < samples_min:
        return NOT_APPLICABLE, None
    if float(within["high"].mean()) < share_min:
        return PASS, None
    if above.empty:
        return CANNOT_EVALUATE, None
    settled = above.iloc[: max(len(above) - int(step_samples), 1)].tail(9)
    if float(settled["high"].mean()) > 1 - share_min:
        return PASS, None
    return FIRE, _finding(within, above, mud)


def _finding(within: pd.DataFrame, above: pd.DataFrame, mud: Any) -> Finding:
    text = (
        f"Below the change to {mud.kind}-based fluid at {mud.top_m:.1f} m {int(within['high'].sum())} of {len(within)} samples "
        f"show free oil (OSI {say(float(within['osi'].min()))}-{say(float(within['osi'].max()))}); above it "
        f"{int(above['high'].sum())} of {len(above)} do."
    )
    more = {
        "interval_m": [float(mud.top_m), float(mud.base_m)],
        "fluid": str(mud.kind),
        "additives": str(mud.additives or ""),
        "affected": "S1, PI and OSI, extract and its chromatogram; S2 and TOC to a lesser degree; not reflectance or XRD",
        "alternatives": ["a true tight-oil interval that starts at the same depth"],
        "discriminating_test": "gas chromatography of extract against a sample of the fluid; solvent-washed split",
    }
    shares = {
        "share_below": round(float(within["high"].mean()), 3),
        "share_above": round(float(above["high"].mean()), 3),
    }
    rows = tuple(int(row) for row in within.index)
    return Finding(None, "S1", WARN, text, ("S1", "TOC"), shares, None, rows=rows, more=more)


RULE = Rule(
    id="oil_based_fluid_interval",
    family="contamination",
    title="Oil-based fluid shows in the samples",
    tests="Where the drilling fluid changes to oil or synthetic base, free oil that starts at the same depth is the fluid's.",
    check=check,
    inputs=("S1", "S2", "TOC", "PI", "drilling fluid by depth"),
    flags="S1 of the interval",
    formula="at least 80 % of at least 5 samples with OSI > 100 or a high PI, and the step within 1 sample of the change",
    message="An oil-based fluid shows in the samples of an interval",
    source="our default, no publication; OSI: Jarvie 2012, AAPG Memoir 97 (from memory)",
    must_not_fire="Where the fluid is not recorded (cannot be evaluated), or samples were solvent-washed.",
    example=(
        "Fluid changes to diesel base at 2450 m; below it 11 of 12 samples have OSI 140-420, above it 0 of 9 exceed 60: "
        "fires for 2450 m to total depth."
    ),
)
