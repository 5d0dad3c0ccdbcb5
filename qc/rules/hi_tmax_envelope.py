"""HI should fall with maturity."""

import numpy as np
import pandas as pd

from qc.rules.facts import hydrogen_index, made_or_reported, not_rock, valid_tmax
from qc.rules.rule import WARN, Answer, Finding, Rule, fired, judge, say
from qc.rules.spans import line, num, reported
from qc.rules.table import Table


def check(
    table: Table, *, tmax_1: float, hi_1: float, tmax_2: float, hi_2: float, tmax_3: float, hi_3: float, s2_min: float
) -> Answer:
    """One check for each reported Tmax: HI against the most that kerogen of this maturity still has."""
    rows = table.of("pyrolysis")
    tmax, hi = valid_tmax(rows, s2_min), hydrogen_index(rows)
    limit = np.full(len(rows), np.inf)
    for start, most in ((tmax_1, hi_1), (tmax_2, hi_2), (tmax_3, hi_3)):
        with np.errstate(invalid="ignore"):
            limit = np.where(tmax > start, most, limit)
    with np.errstate(invalid="ignore"):
        fires = hi > limit
    alginite = np.nan_to_num(rows["ALGINITE"].to_numpy()) > 0
    known = ~np.isnan(tmax) & ~np.isnan(hi)
    outcome = judge(rows.index, applies=reported(rows, "TMAX") & ~not_rock(rows) & ~alginite, known=known, fires=fires)
    facts = pd.DataFrame({"hi": hi, "limit": limit}, index=rows.index)
    return Answer(outcome, [_finding(rows, line(facts, row), row) for row in fired(outcome)])


def _finding(rows: pd.DataFrame, fact: pd.Series, row: int) -> Finding:
    text = f"HI {say(fact['hi'])} is above {say(fact['limit'])}, the most expected at Tmax {say(num(rows, row, 'TMAX'))} °C."
    more = {
        "alternatives": [
            "Type I kerogen",
            "oil retained in S2",
            "Tmax too high (small or distorted S2, polymer additive)",
        ],
        "discriminating_test": "extraction and re-run; microscopy; look at the S2 trace",
    }
    analyte = made_or_reported(rows, row, "HI", "TMAX")
    return Finding(
        row,
        analyte,
        WARN,
        text,
        ("HI", "TMAX", "S2", "TOC"),
        round(float(fact["hi"]), 2),
        float(fact["limit"]),
        more=more,
    )


RULE = Rule(
    id="hi_tmax_envelope",
    family="maturity",
    title="HI falls with maturity",
    tests="Kerogen loses hydrogen as it matures: a high HI with a high Tmax contradicts itself.",
    check=check,
    inputs=("TMAX", "S2", "TOC", "HI", "ALGINITE"),
    flags="HI (TMAX where HI is not reported)",
    formula="Tmax > 455 and HI > 300; > 465 and > 200; > 475 and > 100",
    message="HI is too high for Tmax",
    source="our default, no publication, from typical decline of Type II kerogen",
    must_not_fire="On Type I kerogen (alginite reported).",
    example="Tmax 472, HI 410 fires.",
)
