"""S2 left at zero TOC."""

import pandas as pd

from qc.rules.rule import CANNOT_EVALUATE, FIRE, INFO, NOT_APPLICABLE, PASS, WARN, Answer, Finding, Rule, say
from qc.rules.s2_toc import Fit, evidence
from qc.rules.table import Table


def check(table: Table, *, intercept_min: float, lower_min: float, toc_reach_max: float) -> Answer:
    """One check for each unit that s2_toc_fit could fit."""
    before = table.answers.get("s2_toc_fit")
    outcomes: dict[int, str] = {}
    findings: list[Finding] = []
    for first, fit in (before.sets if before else {}).items():
        outcomes[first] = _outcome(fit, intercept_min, lower_min, toc_reach_max)
        if outcomes[first] == FIRE:
            findings.append(_finding(fit, table, intercept_min))
    return Answer(pd.Series(outcomes, dtype=object), findings)


def _outcome(fit: Fit, intercept_min: float, lower_min: float, toc_reach_max: float) -> str:
    if not fit.usable:
        return CANNOT_EVALUATE if fit.missing else NOT_APPLICABLE
    if fit.x.min() > toc_reach_max:
        return NOT_APPLICABLE
    if fit.unstable:
        return CANNOT_EVALUATE
    sure = fit.ends is not None and fit.ends.intercept[0] > lower_min
    return FIRE if sure and fit.line.intercept > intercept_min else PASS


def _finding(fit: Fit, table: Table, intercept_min: float) -> Finding:
    text = (
        f"The S2-TOC line of {fit.unit or 'the well (formation not stated)'} leaves {say(fit.line.intercept)} mg/g of S2 at zero TOC "
        f"({len(fit.x)} samples): hydrocarbon in S2 that is not of the kerogen, or TOC lost in the acid step."
    )
    more = {
        **evidence(fit, table),
        "alternatives": ["oil or heavy additive in S2", "TOC lost in the acid step", "two kinds of kerogen"],
        "discriminating_test": "solvent extraction and re-run; TOC of the acid solution",
    }
    severity = WARN if fit.stated else INFO
    return Finding(
        None, "S2", severity, text, ("S2", "TOC"), round(fit.line.intercept, 4), intercept_min, rows=fit.rows, more=more
    )  # fmt: skip


RULE = Rule(
    id="s2_positive_intercept",
    family="suppression",
    title="S2 left at zero TOC",
    tests="The S2-TOC line of a unit should not leave S2 where there is no organic carbon.",
    check=check,
    inputs=("S2", "TOC", "TMAX"),
    flags="S2 of the unit",
    formula="intercept b > 0.2 mg/g with the lower bootstrap 95 % bound above 0",
    message="S2 is left at zero TOC",
    source="our default, no publication",
    must_not_fire="Where zero lies far below the lowest TOC (above 1 wt%).",
    example="m 3.1, b +0.9 (95 % 0.5-1.3): fires.",
)
