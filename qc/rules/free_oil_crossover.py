"""More free oil than the organic matter holds: OSI."""

import numpy as np
import pandas as pd

from qc.rules.facts import core, not_rock, valid_tmax
from qc.rules.mud import under_oil_based
from qc.rules.rule import INFO, WARN, Answer, Finding, Rule, fired, judge, say
from qc.rules.spans import Bools, exact, line, num, span
from qc.rules.table import Table


def check(
    table: Table, *, osi_max: float, tmax_mature: float, tmax_oil_end: float, toc_lean: float, s2_min: float
) -> Answer:
    """One check a pyrolysis row. In mature core it is pay (info); in immature or lean rock migrated oil or contamination."""
    rows = table.of("pyrolysis")
    osi = span(rows, "S1").over(span(rows, "TOC"), 100)
    fires, known = osi.above(osi_max)
    outcome = judge(rows.index, applies=~not_rock(rows), known=known, fires=fires)
    tmax = valid_tmax(rows, s2_min)
    oily = under_oil_based(table, rows)
    with np.errstate(invalid="ignore"):
        mature = (tmax >= tmax_mature) & (tmax <= tmax_oil_end)
        lean = exact(rows, "TOC") < toc_lean
    expected = _expected(rows, mature, lean, oily)
    facts = pd.DataFrame(
        {"osi": osi.lo, "tmax": tmax, "lean": lean, "oily": oily, "expected": expected}, index=rows.index
    )
    return Answer(outcome, [_finding(rows, line(facts, row), row, osi_max) for row in fired(outcome)])


def _expected(rows: pd.DataFrame, mature: Bools, lean: Bools, oily: Bools) -> Bools:
    """Where free oil is what one expects: mature, not lean, and no oil-based fluid that could have brought it."""
    return mature & ~lean & (core(rows) | ~oily)


def _finding(rows: pd.DataFrame, fact: pd.Series, row: int, osi_max: float) -> Finding:
    text = f"OSI {say(fact['osi'])} mg/g TOC is above {say(osi_max)}: free oil beyond what the organic matter holds"
    if fact["expected"]:
        text += f", as producible oil in mature rock (Tmax {say(fact['tmax'])} °C) would give"
    elif fact["oily"]:
        text += ", under an oil-based drilling fluid"
    elif fact["lean"]:
        text += f", in rock of only {say(num(rows, row, 'TOC'))} wt% TOC"
    elif np.isnan(fact["tmax"]):
        text += "; no valid Tmax says whether the rock could have made it"
    else:
        text += f", at Tmax {say(fact['tmax'])} °C"
    more = {
        "alternatives": [
            "producible oil in place",
            "migrated oil or natural bitumen",
            "oil-based drilling fluid or additive",
        ],
        "discriminating_test": "solvent extraction and re-run; gas chromatography of the extract against the drilling fluid",
        "note": "S1 loses light ends after sampling, so OSI is a minimum",
    }
    severity = INFO if fact["expected"] else WARN
    return Finding(
        row,
        "S1",
        severity,
        text + ".",
        ("S1", "TOC", "TMAX", "S2", "OSI"),
        round(float(fact["osi"]), 2),
        osi_max,
        more=more,
    )


RULE = Rule(
    id="free_oil_crossover",
    family="contamination",
    title="Free oil crossover",
    tests="S1 is compared with TOC: more than 100 mg of free oil per gram of organic carbon is not held by sorption.",
    check=check,
    inputs=("S1", "TOC", "TMAX", "S2"),
    flags="S1",
    formula="OSI = 100 S1/TOC > 100 mg/g TOC",
    message="Free oil beyond what the organic matter holds",
    source="Jarvie 2012, AAPG Memoir 97:89-119 (from memory)",
    must_not_fire="As a warning on mature oil-window core: there it is pay, for information only.",
    example="S1 1.90, S2 2.40, TOC 0.62, Tmax 428: OSI 306, warning.",
)
