"""Combustion and pyrolysis give the same organic carbon."""

import numpy as np
import pandas as pd

from qc.rules.facts import not_rock
from qc.rules.rule import WARN, Answer, Finding, Rule, fired, judge, say
from qc.rules.spans import Floats, exact, num, reported, word
from qc.rules.table import Table

LOW = ("soluble organic matter lost in the acid", "incomplete oxidation within the combustion run")
HIGH = (
    "carbonate not removed before combustion (dolomite, siderite)",
    "refractory carbon not oxidised by the pyrolysis instrument",
    "too large an aliquot pyrolysed",
)


def check(table: Table, *, uncertainty: float, relative: float, coverage: float) -> Answer:
    """One check for each pyrolysis row with its own TOC whose sample has a separate TOC by combustion."""
    rows = table.of("pyrolysis")
    own = (rows["TOC_row"] == rows.index).to_numpy() & reported(rows, "TOC")
    pyrolysis, combustion = exact(rows, "TOC"), exact(rows, "TOC_CARBON")
    limit = coverage * np.hypot(*(spread(one, uncertainty, relative) for one in (pyrolysis, combustion)))
    away = combustion - pyrolysis
    with np.errstate(invalid="ignore"):
        fires = np.abs(away) > limit
    known = ~np.isnan(away)
    outcome = judge(
        rows.index, applies=own & reported(rows, "TOC_CARBON") & ~not_rock(rows), known=known, fires=fires & known
    )
    limits = pd.Series(limit, index=rows.index)
    return Answer(outcome, [_finding(rows, row, float(limits[row])) for row in fired(outcome)])


def spread(toc: Floats, uncertainty: float, relative: float) -> Floats:
    """Standard uncertainty of a TOC [wt%]."""
    return np.maximum(uncertainty, relative * toc)


def _finding(rows: pd.DataFrame, row: int, limit: float) -> Finding:
    pyrolysis, combustion = num(rows, row, "TOC"), num(rows, row, "TOC_CARBON")
    away = combustion - pyrolysis
    holder = int(num(rows, row, "TOC_CARBON_row"))
    labs = (word(rows, row, "lab_number"), word(rows, holder, "lab_number") if holder >= 0 else "")
    text = (
        f"TOC by combustion {say(combustion)} wt% is {'above' if away > 0 else 'below'} TOC by pyrolysis {say(pyrolysis)} wt% "
        f"by {say(abs(away))}, more than {say(limit)}."
    )
    if all(labs) and labs[0] != labs[1]:
        text += f" The two are of different splits ({labs[0]} and {labs[1]})."
    more = {
        "direction": "combustion high" if away > 0 else "combustion low",
        "lab_numbers": list(labs),
        "alternatives": list(HIGH if away > 0 else LOW),
        "discriminating_test": "repeat both on one split, pyrolysis with half the mass; carbonate left in the acid-washed split",
    }
    return Finding(row, "TOC", WARN, text, ("TOC", "TOC_CARBON", "S2"), round(away, 4), round(limit, 4), more=more)


RULE = Rule(
    id="toc_method_pair",
    family="validity",
    title="Two TOC methods agree",
    tests="TOC of the pyrolysis run is compared with TOC by combustion of the same sample.",
    check=check,
    inputs=("TOC", "TOC_CARBON"),
    flags="TOC",
    formula="|TOC combustion - TOC pyrolysis| > 2 sqrt(u1² + u2²), u = max(0.05 wt%, 5 %)",
    message="Two TOC methods disagree",
    source=(
        "our default, no publication; large aliquots: Hazra, Dutta & Kumar 2016, accepted manuscript, Int. J. Coal Geology "
        "(instrument TOC falls as sample mass rises)"
    ),
    must_not_fire="Where one method gave both values. Different splits are named as such.",
    example="3.00 by combustion, 2.40 by pyrolysis: 0.60 > 2 sqrt(0.15² + 0.12²) = 0.38, fires.",
)
