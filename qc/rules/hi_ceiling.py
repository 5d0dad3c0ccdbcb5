"""More hydrocarbon than the carbon allows."""

import numpy as np
import pandas as pd

from qc.rules.facts import made_or_reported, not_rock
from qc.rules.rule import INFO, REJECT, WARN, Answer, Finding, Rule, fired, judge, say
from qc.rules.spans import line, span
from qc.rules.table import Table


def check(table: Table, *, ceiling: float, warn_above: float, info_above: float) -> Answer:
    """One check a pyrolysis row: 100 (S1+S2)/TOC against the ceiling.

    Between ``info_above`` and ``warn_above`` alginite in the same sample is explanation enough. Beyond the ceiling
    it is a candidate for rejection only where rounding of the inputs cannot bring it back below.
    """
    rows = table.of("pyrolysis")
    total = (span(rows, "S1") + span(rows, "S2")).over(span(rows, "TOC"), 100)
    rounded = (span(rows, "S1", rounded=True) + span(rows, "S2", rounded=True)).over(
        span(rows, "TOC", rounded=True), 100
    )
    alginite = np.nan_to_num(rows["ALGINITE"].to_numpy()) > 0
    fires, known = total.above(np.where(alginite, warn_above, info_above))
    outcome = judge(rows.index, applies=~not_rock(rows), known=known, fires=fires)
    numbers = pd.DataFrame({"lo": rounded.lo, "hi": total.hi, "sure": total.lo}, index=rows.index)
    limits = (ceiling, warn_above, info_above)
    return Answer(outcome, [_finding(rows, line(numbers, row), row, limits) for row in fired(outcome)])


def _finding(rows: pd.DataFrame, number: pd.Series, row: int, limits: tuple[float, float, float]) -> Finding:
    ceiling, warn_above, info_above = limits
    value = float(number["sure"])
    severity, limit = INFO, info_above
    if value > warn_above:
        severity, limit = WARN, warn_above
    if value > ceiling and number["lo"] > ceiling:
        severity, limit = REJECT, ceiling
    text = f"HI + OSI is {say(value)} mg/g TOC; carbon allows {say(ceiling)}"
    if severity == INFO:
        text += f", and above {say(info_above)} one expects alginite, which was not reported"
    more = {
        "alternatives": [
            "TOC too low (slip, acid loss, another split)",
            "decimal slip in S1 or S2",
            "oil or bitumen, not rock",
        ],
        "discriminating_test": "repeat TOC and pyrolysis on one split; microscopy for alginite",
    }
    analyte = made_or_reported(rows, row, "HI", "S2")
    return Finding(
        row, analyte, severity, text + ".", ("S1", "S2", "TOC", "HI", "ALGINITE"), round(value, 3), limit, more=more
    )


RULE = Rule(
    id="hi_ceiling",
    family="arithmetic",
    title="Hydrocarbon yield stays below what carbon allows",
    tests="HI + OSI is compared with the yield of rock whose organic carbon turns into hydrocarbon completely.",
    check=check,
    inputs=("S1", "S2", "TOC", "HI", "ALGINITE"),
    flags="HI (S2 where HI is not reported)",
    formula="100 (S1+S2)/TOC > 1000/0.83 = 1204.8 mg/g TOC",
    message="The yield is more than the organic carbon allows",
    source=(
        "arithmetic on the 0.83 g C per g hydrocarbon of Espitalié et al. 1985 (from memory); lower tiers: our default, "
        "no publication"
    ),
    must_not_fire="On oils, extracts and isolates; between 900 and 1000 where alginite is reported.",
    example="TOC 0.50, S2 6.4: HI 1280, candidate for rejection.",
)
