"""S2 against TOC: a positive TOC intercept means retained S2 or dead carbon."""

from typing import Any

import pandas as pd

from qc.rules.rule import CANNOT_EVALUATE, FIRE, INFO, NOT_APPLICABLE, PASS, WARN, Answer, Finding, Rule, say
from qc.rules.s2_toc import Fit, evidence, fit_units
from qc.rules.table import Table


def check(table: Table, **limits: float) -> Answer:
    """One check for each well, formation and sample kind. ``limits`` as in thresholds.toml.

    The answer carries the fits (``sets``: first row of the unit -> Fit) on to the rules that build upon them.
    """
    outcomes: dict[int, str] = {}
    findings: list[Finding] = []
    sets: dict[int, Fit] = {}
    for fit in fit_units(table, limits):
        first = min((*fit.judged, *fit.excluded))
        sets[first] = fit
        outcomes[first] = _outcome(fit, limits)
        if outcomes[first] == FIRE:
            findings.append(_finding(fit, table, limits))
    return Answer(pd.Series(outcomes, dtype=object), findings, sets)


def _outcome(fit: Fit, limits: dict[str, float]) -> str:
    if not fit.usable:
        return CANNOT_EVALUATE if fit.missing else NOT_APPLICABLE
    if fit.unstable:
        return CANNOT_EVALUATE
    sure = fit.ends is not None and fit.ends.crossing[0] > limits["toc0_lower_min"]
    fires = sure and fit.toc0 >= limits["toc0_min"]
    return FIRE if fires else PASS


def _finding(fit: Fit, table: Table, limits: dict[str, float]) -> Finding:
    lowest = int(fit.x.argmin())
    apparent = 100 * fit.y[lowest] / fit.x[lowest]
    firm = fit.stated and len(fit.x) >= limits["samples_min"]
    where = fit.unit or "the well (formation not stated)"
    text = (
        f"S2 of {where} reaches zero at {say(fit.toc0)} wt% TOC: HI of the kerogen is about {100 * fit.line.slope:.0f}, not the "
        f"{apparent:.0f} that the leanest sample shows. Either S2 is held back by the rock or {say(fit.toc0)} wt% of TOC is dead "
        f"carbon ({len(fit.x)} samples)."
    )
    more: dict[str, Any] = {
        **evidence(fit, table),
        "alternatives": [
            "S2 held back by clay (matrix retention)",
            "inert carbon that yields nothing",
            "TOC read too high in lean rock",
        ],
        "discriminating_test": "pyrolysis of the kerogen isolate or of a decarbonated, extracted split; inertinite by microscopy",
    }
    computed = {"toc0": round(fit.toc0, 4), "hi_star": round(100 * fit.line.slope, 1)}
    severity = WARN if firm else INFO
    return Finding(None, "HI", severity, text, ("S2", "TOC"), computed, limits["toc0_min"], rows=fit.rows, more=more)


RULE = Rule(
    id="s2_toc_fit",
    family="suppression",
    title="S2-TOC line of a unit",
    tests=(
        "Over one uniform unit S2 rises in a line with TOC. The slope gives the HI of the kerogen; a line that meets S2 = 0 at "
        "a positive TOC shows S2 held back by the rock, or dead carbon."
    ),
    check=check,
    inputs=("S2", "TOC", "TMAX"),
    flags="HI of the unit",
    formula=(
        "Theil-Sen slope m of S2 on TOC, intercept b = median(S2 - m TOC), TOC0 = -b/m, HI* = 100 m. Fires when TOC0 >= 0.10 "
        "and the lower bootstrap 95 % bound is above 0.05. Siegel and Deming slopes must agree within 10 %."
    ),
    message="S2 reaches zero at a positive TOC",
    source=(
        "our default, no publication, after Langford & Blanc-Valleron 1990, AAPG Bulletin 74:799; Espitalié, Madec & Tissot "
        "1980, AAPG Bulletin 64:59; dead carbon: Cornford, Gardner & Burgess 1998, Dahl et al. 2004 (all from memory)"
    ),
    must_not_fire=(
        "On mixed kerogen, coal, a maturity gradient inside the set, unresolved contamination, fewer than 10 samples (8-9: "
        "information), TOC spanning less than a factor of 3."
    ),
    example="The worked set of 12: m 4.2081, b -0.9620, TOC0 0.2286, HI* 421 where least squares gives 370. Fires.",
)
