"""Reflectance below what Tmax gives in hydrogen-rich rock: misidentified bitumen first, suppression second."""

import numpy as np
import pandas as pd

from qc.rules.facts import hydrogen_index, says, valid_tmax
from qc.rules.ro_tmax_disagreement import equivalents
from qc.rules.rule import WARN, Answer, Finding, Rule, fired, judge, say
from qc.rules.spans import Bools, Floats, exact, line, num, reported
from qc.rules.table import Table

OLD = r"\b(?:pre-?cambrian|cambrian|ordovician|silurian|proterozoic)\b"


def check(
    table: Table, *, jarvie2001_slope: float, jarvie2001_intercept: float, evenick2021_slope: float,
    evenick2021_intercept: float, below_min: float, hi_min: float, n_min: int, s2_min: float,
) -> Answer:  # fmt: skip
    """One check for each pyrolysis row whose sample has a reflectance of enough readings and a high HI."""
    rows = table.of("pyrolysis")
    schemes = {
        "jarvie2001": (jarvie2001_slope, jarvie2001_intercept), "evenick2021": (evenick2021_slope, evenick2021_intercept)
    }  # fmt: skip
    ro, n, hi, tmax = exact(rows, "RO"), exact(rows, "RO_N"), hydrogen_index(rows), valid_tmax(rows, s2_min)
    made = pd.DataFrame(equivalents(tmax, schemes), index=rows.index)
    facts = made.assign(ro=ro, lowest=made.min(axis=1), away=_trend_residuals(table, rows))
    with np.errstate(invalid="ignore"):
        too_poor, too_few = hi <= hi_min, n < n_min
        above_trend = (facts["away"] >= 0).to_numpy()
        fires = ro < facts["lowest"].to_numpy() - below_min
    known = ~np.isnan(ro) & ~np.isnan(n) & ~np.isnan(hi) & ~np.isnan(tmax)
    applies = reported(rows, "RO") & reported(rows, "TMAX") & ~too_poor & ~too_few & ~_too_old(rows)
    outcome = judge(rows.index, applies=applies, known=known, fires=fires & known & ~above_trend)
    return Answer(outcome, [_finding(rows, line(facts, row), row, below_min) for row in fired(outcome)])


def _trend_residuals(table: Table, rows: pd.DataFrame) -> Floats:
    """Departure of the sample's reflectance from its well's depth trend [log10 %]; NaN where there is none."""
    before = table.answers.get("ro_depth_trend")
    held: dict[int, float] = {}
    for trend in before.sets.values() if before else ():
        if not trend.reason:
            held |= dict(zip(trend.rows, (float(one) for one in trend.away), strict=True))
    return np.array([held.get(int(row), np.nan) for row in rows["RO_row"]], dtype=float)


def _too_old(rows: pd.DataFrame) -> Bools:
    """Rock older than land plants, by what remark or formation says: it has no vitrinite."""
    named = rows["unit"].astype(str).str.contains(OLD, case=False, regex=True).to_numpy(dtype=bool)
    return says(rows, OLD) | named


def _finding(rows: pd.DataFrame, fact: pd.Series, row: int, below_min: float) -> Finding:
    trend = "no depth trend to compare with" if np.isnan(fact["away"]) else "below the depth trend of the well as well"
    text = (
        f"Ro {say(fact['ro'])} % of {say(num(rows, row, 'RO_N'))} readings is more than {say(below_min)} % below {fact['lowest']:.3f} %, "
        f"the lowest that Tmax {say(num(rows, row, 'TMAX'))} °C gives: solid bitumen measured as vitrinite, or suppressed vitrinite ({trend})."
    )
    more = {
        "schemes": {name: round(float(fact[name]), 4) for name in ("jarvie2001", "evenick2021")},
        "trend_residual_log10": None if np.isnan(fact["away"]) else round(float(fact["away"]), 4),
        "alternatives": [
            "solid bitumen misidentified as vitrinite (Hackley & Lewan 2018, AAPG Bulletin 102:1119, abstract: bitumen matures more slowly)",
            "suppression of hydrogen-rich vitrinite (Price & Barker 1985; a correction by HI is Lo 1993: annotation only)",
            "caved younger rock",
            "impregnation with bitumen, usually negligible (Barker et al. 2007, abstract: -0.014 % on average)",
        ],
        "discriminating_test": "photographs and fluorescence of the population measured; bitumen and vitrinite counted apart",
    }
    limit = round(float(fact["lowest"]) - below_min, 4)
    return Finding(
        row, "RO", WARN, text, ("RO", "RO_N", "RO_SD", "TMAX", "S2", "TOC"), float(fact["ro"]), limit, more=more
    )


RULE = Rule(
    id="vr_low_suspect",
    family="suppression",
    title="Reflectance low in hydrogen-rich rock",
    tests="In rock of high HI a reflectance well below what Tmax gives is bitumen taken for vitrinite, or suppressed vitrinite.",
    check=check,
    inputs=("RO", "RO_N", "TMAX", "S2", "TOC"),
    flags="RO",
    formula="Ro < lowest enabled equivalent of Tmax - 0.20 %, HI > 300, n >= 20, not above the depth trend where there is one",
    message="Reflectance is low for its Tmax in hydrogen-rich rock",
    source=(
        "our default, no publication; misidentified bitumen: abstracts of Hackley & Lewan 2018 and Barker et al. 2007; "
        "suppression from memory of Price & Barker 1985 and Lo 1993"
    ),
    must_not_fire="On rock older than Devonian, fewer than 20 readings, HI of 300 and less.",
    example="Ro 0.48, n 25, HI 420, Tmax 445: lowest equivalent 0.785 - 0.20 = 0.585 > 0.48, fires.",
)
