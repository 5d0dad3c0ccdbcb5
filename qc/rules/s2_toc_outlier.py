"""Samples off the S2-TOC line of their unit."""

import numpy as np
import pandas as pd

from qc.rules.robust import madn
from qc.rules.rule import NOT_APPLICABLE, WARN, Answer, Finding, Rule, fired, judge, say
from qc.rules.s2_toc import Fit, evidence
from qc.rules.spans import line, num
from qc.rules.table import Table


def check(table: Table, *, z_max: float, samples_min: int, residual_min: float, residual_relative_min: float) -> Answer:
    """One check for each sample of a fitted unit of at least ``samples_min``.

    Beside the score the residual must matter in itself: a tight set has a tiny scale.
    """
    before = table.answers.get("s2_toc_fit")
    rows = table.of("pyrolysis")
    outcome = pd.Series(NOT_APPLICABLE, index=rows.index, dtype=object)
    findings: list[Finding] = []
    for fit in (before.sets if before else {}).values():
        if not fit.usable or len(fit.x) < samples_min:
            continue
        residuals = _residuals(rows, fit)
        matters = np.maximum(residual_min, residual_relative_min * np.abs(residuals["predicted"]))
        fires = (residuals["z"].abs() > z_max) & (residuals["residual"].abs() > matters)
        judged = judge(residuals.index, applies=True, known=residuals["z"].notna(), fires=fires)
        outcome[judged.index] = judged
        findings += [_finding(table, fit, line(residuals, row), row, z_max) for row in fired(judged)]
    return Answer(outcome, sorted(findings, key=lambda finding: finding.row or 0))


def _residuals(rows: pd.DataFrame, fit: Fit) -> pd.DataFrame:
    """Residual from the line and its modified z, whose centre and scale are those of the samples drawn through."""
    judged = rows.loc[list(fit.judged)]
    predicted = fit.line.slope * judged["TOC"] + fit.line.intercept
    residual = judged["S2"] - predicted
    inside = fit.y - (fit.line.slope * fit.x + fit.line.intercept)
    scale = madn(inside)
    z = (residual - np.median(inside)) / scale if scale > 0 else residual * np.nan
    return pd.DataFrame({"predicted": predicted, "residual": residual, "z": z})


def _finding(table: Table, fit: Fit, one: pd.Series, row: int, z_max: float) -> Finding:
    rows = table.rows
    low = one["residual"] < 0
    text = (
        f"S2 of {say(num(rows, row, 'S2'))} mg/g lies {say(abs(one['residual']))} {'below' if low else 'above'} the S2-TOC line of its unit "
        f"({say(one['predicted'])} expected at TOC {say(num(rows, row, 'TOC'))}; z {one['z']:.1f})."
    )
    low_causes = ["inert or oxidised carbon", "TOC of another sample", "slip in S2 or TOC"]
    drawn = evidence(fit, table)
    more = {
        "fit": {name: drawn["fit"][name] for name in ("slope", "intercept", "n", "intercept_convention")},
        "predicted": round(float(one["predicted"]), 4),
        "z": round(float(one["z"]), 2),
        "unit": drawn["unit"],
        "alternatives": low_causes
        if low
        else ["oil or additive in S2", "TOC lost in the acid step", "slip in S2 or TOC"],
        "discriminating_test": "repeat TOC and pyrolysis on one split",
    }
    return Finding(
        row, "S2", WARN, text, ("S2", "TOC", "S1", "TMAX"), round(float(one["residual"]), 4), z_max, more=more
    )


RULE = Rule(
    id="s2_toc_outlier",
    family="outlier",
    title="Sample off the S2-TOC line",
    tests="The residual of each sample from the robust S2-TOC line of its unit.",
    check=check,
    inputs=("S2", "TOC"),
    flags="S2",
    formula="|z| > 3.5, z = 0.6745 (r - median r)/MAD, and the residual above 0.2 mg/g and 15 % of the line",
    message="S2 is off the line of its unit",
    source="Iglewicz & Hoaglin limit as given on a secondary page; the smallest residual: our default, no publication",
    must_not_fire="With fewer than 10 samples.",
    example="The point at TOC 3.60 of the worked set: residual -5.09, z -93, fires; all others |z| < 2.",
)
