"""A Tmax that its neighbours or its reflectance do not explain, with the causes in the order in which to look."""

from typing import Any

import numpy as np
import pandas as pd

from qc.rules.facts import not_rock, valid_tmax
from qc.rules.neighbours import around
from qc.rules.rule import WARN, Answer, Finding, Rule, fired, judge, say
from qc.rules.spans import exact, line, num, reported, span
from qc.rules.table import Table

LOW = (
    "heavy bitumen in S2 (extract and re-run; S2 trace)",
    "high-sulfur kerogen (organic S/C above 0.04 atomic)",
    "lignite or lost-circulation additive (mud record; hand-pick)",
    "reworked or caved rock (reflectance population)",
    "resinite (microscopy)",
)
HIGH = (
    "weathering or oxidation (OI; outcrop or slabbed core)",
    "radiation damage by uranium (U above 100 ug/g)",
    "reworked inert carbon (HI; microscopy)",
    "matrix retention in lean clay rock (S2-TOC line)",
    "Type I plateau (alginite; HI)",
)


def check(
    table: Table, *, shift_min: float, neighbours_min: int, ro_slope: float, ro_intercept: float, ro_slope_2: float,
    ro_intercept_2: float, uranium_min: float, s2_min: float,
) -> Answer:  # fmt: skip
    """One check for each Tmax: against the median of its neighbours, else against what reflectance of the sample gives."""
    rows = table.of("pyrolysis")
    tmax = valid_tmax(rows, s2_min)
    near = around(rows, tmax, neighbours_min)
    ro = exact(rows, "RO")
    by_ro = np.stack([(ro - ro_intercept) / ro_slope, (ro - ro_intercept_2) / ro_slope_2])
    few = near["median"].isna().to_numpy()
    low = np.where(few, by_ro.min(axis=0), near["median"])
    high = np.where(few, by_ro.max(axis=0), near["median"])
    with np.errstate(invalid="ignore"):
        fires = (tmax < low - shift_min) | (tmax > high + shift_min)
    small, decided = span(rows, "S2").below(s2_min)
    known = ~np.isnan(tmax) & ~np.isnan(low)
    comparable = ~few | reported(rows, "RO")
    applies = reported(rows, "TMAX") & ~not_rock(rows) & ~(decided & small) & (comparable | np.isnan(tmax))
    outcome = judge(rows.index, applies=applies, known=known, fires=fires & known)
    facts = near.assign(tmax=tmax, low=low, high=high, few=few)
    uranium = _uranium(table)
    return Answer(
        outcome, [_finding(table, line(facts, row), row, shift_min, (uranium, uranium_min)) for row in fired(outcome)]
    )


def _uranium(table: Table) -> dict[Any, float]:
    """Sample -> uranium [ug/g], where elements were measured."""
    rows = table.panel("elements", "U")
    return {} if rows.empty else dict(zip(rows["sample"], exact(rows, "U"), strict=True))


def _finding(table: Table, fact: pd.Series, row: int, limit: float, uranium: tuple[dict[Any, float], float]) -> Finding:
    expected = float(fact["low"] if fact["tmax"] < fact["low"] else fact["high"])
    away = float(fact["tmax"]) - expected
    against = (
        "what reflectance of the sample gives" if fact["few"] else f"the median of {int(fact['count'])} neighbours"
    )
    text = f"Tmax {say(fact['tmax'])} °C is {say(abs(away))} °C {'below' if away < 0 else 'above'} {against}, {say(expected)} °C."
    more: dict[str, Any] = {
        "against": against,
        "alternatives": list(LOW if away < 0 else HIGH),
        "discriminating_test": "extraction and re-run with the S2 trace"
        if away < 0
        else "uranium and OI of the sample; microscopy",
    }
    measured = uranium[0].get(num(table.rows, row, "sample"), float("nan"))
    if away > 0 and measured > uranium[1]:
        more["uranium"] = measured
        text += f" Uranium is {say(measured)} ug/g, enough for radiation damage."
    inputs = ("TMAX", "S2", "TOC", "RO", "U") if "uranium" in more else ("TMAX", "S2", "TOC", "RO")
    return Finding(row, "TMAX", WARN, text, inputs, round(away, 2), limit, more=more)


RULE = Rule(
    id="tmax_shift_suspect",
    family="suppression",
    title="Tmax shifted against its neighbours",
    tests="Tmax is compared with neighbours of the same unit, or with reflectance of the sample where there are too few.",
    check=check,
    inputs=("TMAX", "S2", "RO", "U"),
    flags="TMAX",
    formula="|Tmax - median of at least 5 neighbours| > 10 °C; else outside what Ro gives by more than 10 °C",
    message="Tmax is shifted; the causes are listed in the order in which to look",
    source=(
        "our default, no publication; causes from memory of Orr 1986 (sulfur) and Lewan & Buchardt 1989 (uranium); AAPG Wiki "
        "«Tmax» excludes Type I and sulfur-rich kerogen"
    ),
    must_not_fire="Where S2 is too small for a Tmax. Tmax is never corrected by it.",
    example="Sample 422, median of 9 neighbours 440: -18 °C, fires with the low-side list.",
)
