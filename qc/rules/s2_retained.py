"""How much S2 the rock holds back, sample by sample."""

import numpy as np
import pandas as pd

from qc.rules.rule import FIRE, INFO, NOT_APPLICABLE, PASS, Answer, Finding, Rule, say
from qc.rules.s2_toc import Fit
from qc.rules.spans import num
from qc.rules.table import Table


def retained(toc: float, s2: float, slope: float) -> tuple[float, float]:
    """(retained S2 [mg/g], share of what the kerogen would give [%])."""
    full = slope * toc
    return full - s2, 100 * (1 - s2 / full)


def check(table: Table, *, retained_min: float) -> Answer:
    """One check for each sample of a unit: only where s2_toc_fit fired on a stable fit."""
    before = table.answers.get("s2_toc_fit")
    rows = table.of("pyrolysis")
    outcome = pd.Series(NOT_APPLICABLE, index=rows.index, dtype=object)
    findings: list[Finding] = []
    for first, fit in (before.sets if before else {}).items():
        if before is None or before.outcome[first] != FIRE:
            continue
        for row in fit.rows:
            amount, share = retained(num(rows, row, "TOC"), num(rows, row, "S2"), fit.line.slope)
            held = amount > retained_min
            outcome[row] = FIRE if held else PASS
            if held:
                findings.append(_finding(rows, row, fit, amount, share))
    return Answer(outcome, sorted(findings, key=lambda finding: finding.row or 0))


def _finding(rows: pd.DataFrame, row: int, fit: Fit, amount: float, share: float) -> Finding:
    text = (
        f"{say(amount)} mg/g of S2 ({share:.0f} %) is missing against a kerogen of HI {100 * fit.line.slope:.0f}: held back by the "
        f"rock, or the carbon is dead."
    )
    illite = num(rows, row, "ILLITE")
    more = {
        "fit": {"slope": round(fit.line.slope, 4), "intercept": round(fit.line.intercept, 4), "n": len(fit.x)},
        "retained_percent": round(share, 1),
        "illite_wt_pct": None if np.isnan(illite) else float(illite),
        "alternatives": ["S2 held back by clay: illite > smectite > kaolinite, chlorite > carbonate", "inert carbon"],
        "discriminating_test": "pyrolysis of the kerogen isolate; XRD of the clays",
    }
    full = round(float(fit.line.slope * num(rows, row, "TOC")), 4)
    return Finding(row, "S2", INFO, text, ("S2", "TOC"), round(float(amount), 4), full, more=more)


RULE = Rule(
    id="s2_retained",
    family="suppression",
    title="S2 held back in a sample",
    tests="Where the unit's S2-TOC line shows retention, the amount missing is listed sample by sample.",
    check=check,
    inputs=("S2", "TOC"),
    flags="S2, for information",
    formula="retained S2 = m TOC - S2; retained % = 100 (1 - S2/(m TOC))",
    message="S2 is missing against the kerogen of the unit",
    source=(
        "arithmetic on the line of s2_toc_fit; order of minerals from memory of Espitalié et al. 1980 and 1984; compare "
        "Lewan, Dolan & Curtis 2014, AAPG Bulletin"
    ),
    must_not_fire="Where s2_toc_fit did not fire or its fit is not stable.",
    example="m 4.2081: TOC 0.42, S2 0.78: 0.99 mg/g, 56 %. TOC 4.25, S2 16.95: 0.93 mg/g, 5 %.",
)
