"""Cuttings less mature than the trend of the well that look like open rock above: cavings."""

from typing import Any

import numpy as np
import pandas as pd

from qc.rules import trends
from qc.rules.facts import valid_tmax
from qc.rules.robust import madn
from qc.rules.rule import CANNOT_EVALUATE, FIRE, NOT_APPLICABLE, PASS, WARN, Answer, Finding, Rule, merge, say
from qc.rules.spans import exact
from qc.rules.table import Table
from qc.rules.trends import Trend

CUTTINGS = frozenset({"cuttings", "composite"})


def check(
    table: Table, *, tmax_below: float, ro_below: float, scores: float, samples_min: int, span_min: float,
    tmax_scale_min: float, ro_scale_min: float, unit_samples_min: int, s2_min: float,
) -> Answer:  # fmt: skip
    """One check for each Tmax and each reflectance of cuttings, against the trend of the well and open units above."""
    pyrolysis, petrography = table.of("pyrolysis"), table.of("reflectance")
    ro = exact(petrography, "RO")
    with np.errstate(invalid="ignore", divide="ignore"):
        logs = np.where(ro > 0, np.log10(ro), np.nan)
    limits = {"scores": scores, "samples_min": samples_min, "span_min": span_min, "unit_samples_min": unit_samples_min}
    return merge([
        _quantity(table, "TMAX", (pyrolysis, valid_tmax(pyrolysis, s2_min)), limits, (tmax_below, tmax_scale_min)),
        _quantity(table, "RO", (petrography, logs), limits, (ro_below, ro_scale_min)),
    ])  # fmt: skip


def _quantity(
    table: Table, name: str, of: tuple[pd.DataFrame, Any], limits: dict[str, Any], own: tuple[float, float]
) -> Answer:
    rows, values = of
    cuttings = rows[rows["kind"].isin(CUTTINGS) & (rows[f"{name}_id"] >= 0)]
    outcome = pd.Series(
        np.where(cuttings[name].isna(), CANNOT_EVALUATE, NOT_APPLICABLE), index=cuttings.index, dtype=object
    )
    findings: list[Finding] = []
    made = trends.of_wells(table, rows, values, samples_min=limits["samples_min"], span_min=limits["span_min"])
    for trend in made:
        if not trend.reason:
            outcomes, found = _well(table, rows, trend, name, limits=limits, own=own)
            for row, one in outcomes.items():
                if row in outcome.index:
                    outcome[row] = one
            findings += found
    return Answer(outcome, findings)


def _well(
    table: Table, rows: pd.DataFrame, trend: Trend, name: str, *, limits: dict[str, Any], own: tuple[float, float]
) -> tuple[dict[int, str], list[Finding]]:  # fmt: skip
    """Outcomes of the cuttings of one well."""
    members = rows.loc[list(trend.rows)]
    value, expected = (10**trend.y, 10**trend.predicted) if name == "RO" else (trend.y, trend.predicted)
    away = value - expected
    limit = max(own[0], limits["scores"] * madn(away))
    shoes = np.sort(table.shoes.loc[table.shoes["well"] == trend.well, "md_m"].to_numpy(dtype=float))
    outcomes: dict[int, str] = {}
    findings: list[Finding] = []
    for at in np.flatnonzero(members["kind"].isin(CUTTINGS).to_numpy()):
        row = trend.rows[at]
        outcomes[row] = PASS
        if away[at] >= -limit:
            continue
        if not len(shoes):
            outcomes[row] = CANNOT_EVALUATE
            continue
        unit = _shallower(members, value, int(at), shoes, scale_min=own[1], samples_min=limits["unit_samples_min"])
        if unit:
            outcomes[row] = FIRE
            facts = {"value": value[at], "expected": expected[at], "limit": limit, **unit}
            findings.append(_finding(table, trend, int(at), name, facts=facts))
    return outcomes, findings


def _shallower(
    members: pd.DataFrame, value: np.ndarray, at: int, shoes: np.ndarray, *, scale_min: float, samples_min: int
) -> dict[str, Any] | None:
    """The open unit above whose median the value is nearest to and within one MADN of; None where there is none."""
    depth = members["top_m"].to_numpy(dtype=float)
    above = shoes[shoes <= depth[at]]
    open_from = float(above[-1]) if len(above) else 0.0
    unit = members["unit"].to_numpy(dtype=object)
    if depth[at] <= open_from:
        return None
    found = []
    for name in dict.fromkeys(unit):
        own = (unit == name) & (depth >= open_from) & (depth < depth[at])
        if name and name != unit[at] and own.sum() >= samples_min:
            median, scale = float(np.median(value[own])), max(madn(value[own]), scale_min)
            if abs(value[at] - median) <= scale:
                found.append((abs(value[at] - median), {"unit": str(name), "median": median, "open_from": open_from}))
    return min(found, key=lambda one: one[0])[1] if found else None


def _finding(table: Table, trend: Trend, at: int, name: str, *, facts: dict[str, Any]) -> Finding:
    what, unit = ("Ro", "%") if name == "RO" else ("Tmax", "°C")
    text = (
        f"{what} {say(facts['value'])} {unit} lies below the trend of the well, {say(facts['expected'])} {unit}, and is like "
        f"{facts['unit']} above ({say(facts['median'])} {unit}), which stands open below the casing shoe at {facts['open_from']:.0f} m."
    )
    more = {
        "fit": trend.plot(), "unit": facts["unit"], "unit_median": round(float(facts["median"]), 4),
        "casing_shoes_m": sorted(float(one) for one in table.shoes.loc[table.shoes["well"] == trend.well, "md_m"]),
        "alternatives": ["cavings of the shallower unit", "heavy bitumen or additive (Tmax), suppressed vitrinite (Ro)", "a bed of other kerogen"],
        "discriminating_test": "size and shape of the chips: cavings are large, splintery and curved (drillingmanual.com «Unrepresentative drilling cuttings»); hand-pick",
    }  # fmt: skip
    inputs = ("RO", "RO_N") if name == "RO" else ("TMAX", "S2", "TOC")
    computed, limit = round(float(facts["value"] - facts["expected"]), 4), round(-float(facts["limit"]), 4)
    return Finding(trend.rows[at], name, WARN, text, inputs, computed, limit, more=more)


RULE = Rule(
    id="caving_trend_outlier",
    family="contamination",
    title="Cuttings that look like open rock above",
    tests="Tmax or reflectance of cuttings below the depth trend of the well, and like a shallower unit that no casing covers.",
    check=check,
    inputs=("TMAX", "RO", "sample kind", "formation", "casing shoes", "deviation survey"),
    flags="TMAX or RO",
    formula="below the trend by more than max(6 °C or 0.10 %, 3 MADN), and within 1 MADN of the median of an open unit above",
    message="The cuttings may be cavings",
    source="our default, no publication; look of cavings: drillingmanual.com «Unrepresentative drilling cuttings»",
    must_not_fire="In core, on units behind casing, in the uppermost open unit; without casing records it cannot be evaluated.",
    example="Rock of 3.0 % TOC with 20 % of cavings of 0.6 %: 2.52 % is measured. Tmax 12 °C below the trend and like the open unit above fires.",
)
