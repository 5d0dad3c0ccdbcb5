"""More hydrocarbons released than the detector can follow."""

import pandas as pd

from qc.rules.rule import WARN, Answer, Finding, Rule, fired, judge, say
from qc.rules.spans import num, reported, span
from qc.rules.table import Table


def check(table: Table, *, hydrocarbon_max: float) -> Answer:
    """One check for each row with S2: S2 [mg/g] times the mass pyrolysed [mg] above the linear limit [mg HC]."""
    rows = table.of("pyrolysis")
    peak, mass = span(rows, "S2"), span(rows, "ALIQUOT")
    released = type(peak)(peak.lo * mass.lo / 1000, peak.hi * mass.hi / 1000)
    fires, decided = released.above(hydrocarbon_max)
    outcome = judge(rows.index, applies=reported(rows, "S2"), known=decided, fires=fires)
    return Answer(outcome, [_finding(rows, row, hydrocarbon_max) for row in fired(outcome)])


def _finding(rows: pd.DataFrame, row: int, limit: float) -> Finding:
    s2, mass = num(rows, row, "S2"), num(rows, row, "ALIQUOT")
    released = s2 * mass / 1000
    text = f"S2 {say(s2)} mg/g of {say(mass)} mg released {say(released)} mg of hydrocarbons, above {say(limit)} mg."
    more = {
        "alternatives": ["the laboratory's detector is linear beyond the shipped limit", "the mass is not in milligrams"],
        "discriminating_test": "repeat with a smaller aliquot: S2 and TOC rise if the detector or the oxidation was overloaded",
    }  # fmt: skip
    return Finding(row, "S2", WARN, text, ("S2", "ALIQUOT"), round(released, 4), limit, more=more)


RULE = Rule(
    id="aliquot_overload",
    family="validity",
    title="The aliquot is not too large",
    tests="The mass of hydrocarbons released by the aliquot is compared with the detector's linear limit.",
    check=check,
    inputs=("S2", "ALIQUOT"),
    flags="S2",
    formula="S2 (mg/g) x aliquot (g) > 10 mg HC",
    message="The aliquot overloads the detector",
    source=(
        "our default, no publication, to be replaced by the laboratory's own figure; usual aliquot 50-100 mg: International "
        "Ocean Discovery Program user guide for source-rock pyrolysis"
    ),
    must_not_fire="Where the mass is not reported (cannot be evaluated).",
    example="S2 180 mg/g of 70 mg: 12.6 mg, fires.",
)
