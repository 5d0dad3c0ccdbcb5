"""The line between indigenous and other hydrocarbons on the S1-TOC plot."""

import pandas as pd

from qc.rules.facts import not_rock, sandstone
from qc.rules.rule import WARN, Answer, Finding, Rule, fired, judge, say
from qc.rules.spans import span
from qc.rules.table import Table


def check(table: Table, *, ratio_max: float) -> Answer:
    """One check a pyrolysis row: S1/TOC [mg/g per wt%] above the line."""
    rows = table.of("pyrolysis")
    ratio = span(rows, "S1").over(span(rows, "TOC"))
    fires, known = ratio.above(ratio_max)
    outcome = judge(rows.index, applies=~not_rock(rows) & ~sandstone(rows), known=known, fires=fires)
    lows = pd.Series(ratio.lo, index=rows.index)
    return Answer(outcome, [_finding(rows, row, float(lows[row]), ratio_max) for row in fired(outcome)])


def _finding(rows: pd.DataFrame, row: int, ratio: float, limit: float) -> Finding:
    text = f"S1/TOC is {say(ratio)} mg/g per wt%, above the line of {say(limit)} (OSI {say(100 * limit)})."
    more = {
        "lines": {"s1_toc_line": 100 * limit, "free_oil_crossover": "OSI 100, another published line"},
        "alternatives": [
            "migrated oil or natural bitumen",
            "producible oil in place",
            "oil-based drilling fluid or additive",
        ],
        "discriminating_test": "solvent extraction and re-run; gas chromatography of the extract",
    }
    return Finding(row, "S1", WARN, text, ("S1", "TOC"), round(ratio, 4), limit, more=more)


RULE = Rule(
    id="s1_toc_line",
    family="contamination",
    title="S1 above the indigenous line",
    tests="On the S1-TOC plot a line divides hydrocarbons that the rock made from those that came from elsewhere.",
    check=check,
    inputs=("S1", "TOC"),
    flags="S1",
    formula="S1/TOC > 1.5 mg/g per wt% (OSI > 150)",
    message="S1 is above the indigenous line",
    source="attributed to Hunt 1996 by secondary sources (from memory; check the book before citing)",
    must_not_fire="In reservoir sandstone.",
    example="S1 1.90, TOC 0.62: 3.06, fires.",
)
