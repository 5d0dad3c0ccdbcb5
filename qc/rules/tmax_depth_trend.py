"""Tmax against true vertical depth: what departs from the line of its well."""

import numpy as np
import pandas as pd

from qc.rules import trends
from qc.rules.facts import not_rock, valid_tmax
from qc.rules.rule import CANNOT_EVALUATE, FIRE, NOT_APPLICABLE, PASS, WARN, Answer, Finding, Rule, say
from qc.rules.spans import exact, reported
from qc.rules.table import Table
from qc.rules.trends import Trend


def check(
    table: Table, *, z_max: float, tmax_away_min: float, samples_min: int, span_min: float, s2_min: float
) -> Answer:
    """One check for each Tmax with a real S2 peak, against the line of its well."""
    rows = table.of("pyrolysis")
    rows = rows[reported(rows, "TMAX") & ~not_rock(rows)]
    tmax = valid_tmax(rows, s2_min)
    unknown = np.isnan(exact(rows, "TMAX")) | np.isnan(exact(rows, "S2"))
    outcome = pd.Series(np.where(unknown, CANNOT_EVALUATE, NOT_APPLICABLE), index=rows.index, dtype=object)
    made = trends.of_wells(table, rows, tmax, samples_min=samples_min, span_min=span_min)
    findings: list[Finding] = []
    for trend in made:
        if trend.reason:
            continue
        hit = (np.abs(trend.scores) > z_max) & (np.abs(trend.away) > tmax_away_min)
        outcome[list(trend.rows)] = np.where(hit, FIRE, PASS)
        findings += [_finding(trend, int(at), (z_max, tmax_away_min)) for at in np.flatnonzero(hit)]
    return Answer(outcome, findings, {trend.well: trend for trend in made})


def _finding(trend: Trend, at: int, limit: tuple[float, float]) -> Finding:
    tmax, expected, away = float(trend.y[at]), float(trend.predicted[at]), float(trend.away[at])
    text = (
        f"Tmax {say(tmax)} °C lies {say(abs(away))} °C {'below' if away < 0 else 'above'} the trend of the well, {expected:.0f} °C "
        f"at {trend.z[at]:.0f} m below ground ({len(trend.z)} values, modified z {trend.scores[at]:.1f})."
    )
    causes = (
        ["heavy bitumen in S2", "caved younger rock", "additive", "sulfur-rich kerogen"]
        if away < 0
        else [
            "reworked or oxidised carbon",
            "matrix retention in lean clay rock",
            "Type I kerogen",
            "heat of an intrusion",
        ]
    )
    more = {
        "fit": trend.plot(), "residual": round(away, 2), "modified_z": round(float(trend.scores[at]), 2), "alternatives": causes,
        "discriminating_test": "the S2 trace; extraction and re-run; reflectance of the same sample",
    }  # fmt: skip
    others = tuple(row for row in trend.rows if row != trend.rows[at])[:2]
    return Finding(trend.rows[at], "TMAX", WARN, text, ("TMAX", "S2", "TOC"), tmax, list(limit), rows=others, more=more)


RULE = Rule(
    id="tmax_depth_trend",
    family="maturity",
    title="Tmax rises along one line",
    tests="Valid Tmax is fitted against true vertical depth below ground (Theil-Sen); single values that depart from it fire.",
    check=check,
    inputs=("TMAX", "S2", "top", "base", "deviation survey"),
    flags="TMAX",
    formula="|modified z| > 3.5 and |Tmax - trend| > 6 °C; at least 6 values over 500 m",
    message="Tmax departs from the trend of its well",
    source="our default, no publication; Tmax of a real S2 peak only: from memory of Peters 1986, AAPG Bulletin 70:318",
    must_not_fire="On Tmax of S2 below 0.2; on fewer than 6 values or less than 500 m; across an unconformity, fault or intrusion.",
    example="Trend 438 °C at 2600 m, sample 426, MAD 2: -12 °C, z -4.05, fires.",
)
