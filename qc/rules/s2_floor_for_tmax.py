"""Tmax needs a real S2 peak, and PI something to divide."""

import pandas as pd

from qc.rules.rule import REJECT, WARN, Answer, Finding, Rule, fired, judge, merge, say
from qc.rules.spans import num, reported, span, word
from qc.rules.table import Table


def check(table: Table, *, s2_min: float, s2_warn: float, hydrocarbon_min: float) -> Answer:
    """One check for each reported Tmax, one for each reported PI. Never on S2 or TOC."""
    rows = table.of("pyrolysis")
    small, known = span(rows, "S2").below(s2_warn)
    outcome = judge(rows.index, applies=reported(rows, "TMAX"), known=known, fires=small)
    too_small, _ = span(rows, "S2").below(s2_min)
    certain = pd.Series(too_small, index=rows.index)
    tmax = Answer(outcome, [_tmax(rows, row, bool(certain[row]), s2_min, s2_warn) for row in fired(outcome)])
    little, known = (span(rows, "S1") + span(rows, "S2")).below(hydrocarbon_min)
    outcome = judge(rows.index, applies=reported(rows, "PI"), known=known, fires=little)
    return merge([tmax, Answer(outcome, [_pi(rows, row, hydrocarbon_min) for row in fired(outcome)])])


def _tmax(rows: pd.DataFrame, row: int, certain: bool, s2_min: float, s2_warn: float) -> Finding:
    limit = s2_min if certain else s2_warn
    text = (
        f"Tmax {say(num(rows, row, 'TMAX'))} °C was read from an S2 of {word(rows, row, 'S2_q')}{say(num(rows, row, 'S2'))} mg/g, "
        f"below {say(limit)}."
    )
    more = {
        "alternatives": ["post-mature rock has a tiny S2 of its own: Tmax is unusable, TOC is fine", "lean rock"],
        "discriminating_test": "look at the S2 trace; vitrinite reflectance",
    }
    return Finding(
        row, "TMAX", REJECT if certain else WARN, text, ("TMAX", "S2"), num(rows, row, "S2"), limit, more=more
    )


def _pi(rows: pd.DataFrame, row: int, limit: float) -> Finding:
    total = num(rows, row, "S1") + num(rows, row, "S2")
    text = f"PI {say(num(rows, row, 'PI'))} is made of S1 + S2 = {say(total)} mg/g, below {say(limit)}."
    more = {"alternatives": ["lean or post-mature rock"], "discriminating_test": "duplicate pyrolysis"}
    return Finding(row, "PI", WARN, text, ("PI", "S1", "S2"), round(float(total), 4), limit, more=more)


RULE = Rule(
    id="s2_floor_for_tmax",
    family="validity",
    title="Tmax is read from a real S2 peak",
    tests="Tmax is the temperature of the S2 maximum; where S2 is next to nothing there is no maximum to read.",
    check=check,
    inputs=("TMAX", "S2", "S1", "PI"),
    flags="TMAX (PI where S1+S2 is too small)",
    formula="S2 < 0.2 mg/g: candidate for rejection; 0.2-0.5: warning. S1+S2 < 0.2: warning on PI.",
    message="Tmax was read from too small an S2 peak",
    source="Peters 1986, AAPG Bulletin 70:318 (from memory); the margin up to 0.5: our default, no publication",
    must_not_fire="Never on S2 or TOC: post-mature rock legitimately has a tiny S2.",
    example="S2 0.14, Tmax 358: candidate for rejection on Tmax, TOC unaffected.",
)
