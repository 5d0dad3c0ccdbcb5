"""Reflectance against true vertical depth: a log-linear rise, and what departs from it."""

import numpy as np
import pandas as pd

from qc.rules import trends
from qc.rules.rule import CANNOT_EVALUATE, FIRE, INFO, NOT_APPLICABLE, PASS, WARN, Answer, Finding, Rule, merge, say
from qc.rules.spans import exact, reported
from qc.rules.table import Table
from qc.rules.trends import Trend


def check(
    table: Table, *, z_max: float, ro_away_min: float, samples_min: int, span_min: float, surface_min: float,
    surface_max: float, ro_max: float,
) -> Answer:  # fmt: skip
    """One check for each reflectance against the line of its well, and one for each line: slope, then surface intercept."""
    rows = table.of("reflectance")
    rows = rows[reported(rows, "RO")]
    ro = exact(rows, "RO")
    with np.errstate(invalid="ignore", divide="ignore"):
        logs = np.where((ro > 0) & (ro <= ro_max), np.log10(ro), np.nan)
    made = trends.of_wells(table, rows, logs, samples_min=samples_min, span_min=span_min)
    outcome = pd.Series(np.where(np.isnan(ro), CANNOT_EVALUATE, NOT_APPLICABLE), index=rows.index, dtype=object)
    findings: list[Finding] = []
    lines: list[Answer] = []
    for trend in made:
        if trend.reason:
            continue
        expected = 10**trend.predicted
        away = 10**trend.y - expected
        hit = (np.abs(trend.scores) > z_max) & (np.abs(away) > ro_away_min)
        outcome[list(trend.rows)] = np.where(hit, FIRE, PASS)
        findings += [_finding(trend, int(at), float(expected[at]), (z_max, ro_away_min)) for at in np.flatnonzero(hit)]
        lines.append(_line(trend, surface_min, surface_max))
    answer = merge([Answer(outcome, findings), *lines])
    return Answer(answer.outcome, answer.findings, {trend.well: trend for trend in made})


def _finding(trend: Trend, at: int, expected: float, limit: tuple[float, float]) -> Finding:
    ro, score = float(10 ** trend.y[at]), float(trend.scores[at])
    side = "below" if ro < expected else "above"
    text = (
        f"Ro {say(ro)} % lies {side} the trend of the well, {expected:.3f} % at {trend.z[at]:.0f} m below ground "
        f"({len(trend.z)} values, modified z {score:.1f})."
    )
    causes = (
        ["caved younger rock", "solid bitumen or suppressed vitrinite measured", "unconformity or fault in the section"]
        if ro < expected
        else ["reworked vitrinite or inertinite", "heat of an intrusion", "unconformity or fault in the section"]
    )
    more = {
        "fit": trend.plot(), "residual_log10": round(float(trend.away[at]), 4), "modified_z": round(score, 2),
        "alternatives": causes,
        "discriminating_test": "histogram of the readings; fit on either side of a known break; another sample of the interval",
    }  # fmt: skip
    others = tuple(row for row in trend.rows if row != trend.rows[at])[:2]
    inputs = ("RO", "RO_N", "RO_SD")
    return Finding(trend.rows[at], "RO", WARN, text, inputs, round(ro, 4), list(limit), rows=others, more=more)


def _line(trend: Trend, surface_min: float, surface_max: float) -> Answer:
    """The line as a whole: it must rise, and reach the surface at the reflectance of fresh sediment."""
    surface = float(10**trend.line.intercept)
    first = trend.rows[0]
    if trend.line.slope <= 0:
        text = f"Reflectance does not rise with depth in {len(trend.z)} values."
        causes = ["caved or reworked populations throughout", "depths of two reports mixed", "repeated section"]
        return Answer(
            pd.Series([FIRE], index=[first], dtype=object),
            [_whole(trend, WARN, text, trend.line.slope, limit=0.0, causes=causes)],
        )
    if surface_min <= surface <= surface_max:
        return Answer(pd.Series([PASS], index=[first], dtype=object))
    text = f"The trend reaches the surface at Ro {surface:.3f} %, outside {say(surface_min)}-{say(surface_max)} %."
    causes = [
        "section eroded (above the range)",
        "depths from another datum",
        "a change of gradient within the section",
    ]
    return Answer(
        pd.Series([FIRE], index=[first], dtype=object),
        [_whole(trend, INFO, text, round(surface, 4), limit=[surface_min, surface_max], causes=causes)],
    )


def _whole(trend: Trend, severity: str, text: str, computed: float, *, limit: object, causes: list[str]) -> Finding:
    more = {
        "fit": trend.plot(),
        "alternatives": causes,
        "discriminating_test": "sonic or vitrinite trend of a neighbouring well",
    }
    return Finding(None, "RO", severity, text, ("RO",), computed, limit, rows=trend.rows, more=more)


RULE = Rule(
    id="ro_depth_trend",
    family="maturity",
    title="Reflectance rises along one line",
    tests="log10 of reflectance is fitted against true vertical depth below ground (Theil-Sen); single values that depart from it fire.",
    check=check,
    inputs=("RO", "top", "base", "deviation survey"),
    flags="RO (the well's reflectances where the line as a whole is odd)",
    formula=(
        "log10 Ro = a + b z; |modified z| > 3.5 and |Ro - Ro trend| > 0.07 %; b <= 0: warning; surface Ro outside 0.15-0.30 %: "
        "information; at least 6 values over 500 m"
    ),
    message="The reflectance departs from the trend of its well",
    source="log-linear practice: from memory of Dow 1977, J. Geochem. Explor. 7:79; limits: our default, no publication",
    must_not_fire="On fewer than 6 values or less than 500 m; above Ro 2 %; across a known unconformity, fault or intrusion.",
    example=(
        "1000-3400 m every 400 m: .38 .44 .50 .58 .45 .77 .89: b 1.5335e-4 per m, 0.669 expected at 2600 m, residual -0.172: "
        "only 2600 m fires."
    ),
)
