"""Reflectance and Tmax tell two maturities."""

import numpy as np
import pandas as pd

from qc.rules.facts import hydrogen_index, valid_tmax
from qc.rules.rule import WARN, Answer, Finding, Rule, fired, judge, say
from qc.rules.spans import Floats, exact, line, num, reported
from qc.rules.table import Table


def equivalents(tmax: Floats, schemes: dict[str, tuple[float, float]]) -> dict[str, Floats]:
    """Ro [%] that each scheme gives for Tmax: slope * Tmax + intercept."""
    return {name: slope * tmax + intercept for name, (slope, intercept) in schemes.items()}


def check(
    table: Table, *, jarvie2001_slope: float, jarvie2001_intercept: float, evenick2021_slope: float,
    evenick2021_intercept: float, tolerance: float, tmax_min: float, tmax_max: float, hi_min: float, s2_min: float,
) -> Answer:  # fmt: skip
    """One check for each pyrolysis row whose sample has a reflectance."""
    rows = table.of("pyrolysis")
    schemes = {
        "jarvie2001": (jarvie2001_slope, jarvie2001_intercept), "evenick2021": (evenick2021_slope, evenick2021_intercept)
    }  # fmt: skip
    tmax, ro, hi = valid_tmax(rows, s2_min), exact(rows, "RO"), hydrogen_index(rows)
    made = pd.DataFrame(equivalents(tmax, schemes), index=rows.index)
    with np.errstate(invalid="ignore"):
        outside_range = (tmax < tmax_min) | (tmax > tmax_max) | (hi <= hi_min)
        small = exact(rows, "S2") < s2_min
    facts = made.assign(ro=ro, low=made.min(axis=1) - tolerance, high=made.max(axis=1) + tolerance)
    fires = (facts["ro"] < facts["low"]) | (facts["ro"] > facts["high"])
    known = ~np.isnan(tmax) & ~np.isnan(ro) & ~np.isnan(hi)
    applies = reported(rows, "RO") & reported(rows, "TMAX") & ~outside_range & ~small
    outcome = judge(rows.index, applies=applies, known=known, fires=fires.to_numpy() & known)
    return Answer(outcome, [_finding(rows, line(facts, row), row, list(schemes)) for row in fired(outcome)])


def _finding(rows: pd.DataFrame, fact: pd.Series, row: int, schemes: list[str]) -> Finding:
    low = fact["ro"] < fact["low"]
    text = (
        f"Ro {say(fact['ro'])} % is {'below' if low else 'above'} what Tmax {say(num(rows, row, 'TMAX'))} °C gives "
        f"({', '.join(f'{name} {fact[name]:.3f}' for name in schemes)})."
    )
    causes = (
        ["solid bitumen measured as vitrinite", "hydrogen-rich (suppressed) vitrinite", "caved younger rock", "Tmax raised by the rock matrix or weathering"]
        if low
        else ["reworked vitrinite", "Tmax lowered by heavy bitumen or sulfur-rich kerogen", "caved younger kerogen in S2"]
    )  # fmt: skip
    more = {
        "schemes": {name: round(float(fact[name]), 4) for name in schemes},
        "alternatives": [*causes, "Type I or II-S kerogen, to which the schemes do not apply"],
        "discriminating_test": "microscopy of the population measured; extraction and re-run for Tmax",
    }
    limit = [round(float(fact["low"]), 4), round(float(fact["high"]), 4)]
    return Finding(
        row, "RO", WARN, text, ("RO", "RO_N", "TMAX", "S2", "TOC"), round(float(fact["ro"]), 4), limit, more=more
    )


RULE = Rule(
    id="ro_tmax_disagreement",
    family="maturity",
    title="Reflectance and Tmax agree",
    tests="Measured reflectance is compared with what the enabled conversions give for Tmax of the same sample.",
    check=check,
    inputs=("RO", "TMAX", "S2", "TOC"),
    flags="RO",
    formula="Ro outside [min, max] of 0.0180 Tmax - 7.16 (jarvie2001) and 0.013 Tmax - 5.0 (evenick2021) by more than 0.25 %",
    message="Reflectance and Tmax tell two maturities",
    source=(
        "Jarvie et al. 2001 (from memory); abstract of Evenick 2021, J. Nat. Gas Sci. Eng. 91:103946; tolerance: our default, "
        "no publication"
    ),
    must_not_fire="On Type I and II-S kerogen, S2 below 0.5, HI of 50 and less, Tmax outside 420-480.",
    example="Ro 0.45, Tmax 450: 0.85-0.94 expected, low by 0.40, fires.",
)
