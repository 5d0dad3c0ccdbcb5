"""Tmax outside the range of common kerogen."""

import numpy as np
import pandas as pd

from qc.rules.rule import REJECT, WARN, Answer, Finding, Rule, fired, judge, say
from qc.rules.spans import Bools, exact, num, reported, span
from qc.rules.table import Table


def check(
    table: Table, *, warn_below: float, warn_above: float, reject_below: float, reject_above: float,
    overmature_max: float, overmature_ro: float, overmature_neighbours: float, neighbours_min: int, coal_toc: float,
) -> Answer:  # fmt: skip
    """One check for each reported Tmax. High values are believed of rock shown to be overmature, low ones of peat."""
    rows = table.of("pyrolysis")
    low, low_known = span(rows, "TMAX").below(warn_below)
    high, high_known = span(rows, "TMAX").above(warn_above)
    peat = np.nan_to_num(rows["TOC"].to_numpy()) > coal_toc
    excused_low = peat & (rows["TMAX"] >= reject_below).to_numpy()
    overmature = _overmature(rows, overmature_ro, overmature_neighbours, neighbours_min)
    excused_high = overmature & (rows["TMAX"] <= overmature_max).to_numpy() & (rows["S2"] > 0.2).to_numpy()
    fires = (low & ~excused_low) | (high & ~excused_high)
    outcome = judge(rows.index, applies=reported(rows, "TMAX"), known=low_known & high_known, fires=fires)
    return Answer(
        outcome, [_finding(rows, row, (warn_below, warn_above, reject_below, reject_above)) for row in fired(outcome)]
    )


def _overmature(rows: pd.DataFrame, ro_min: float, median_min: float, neighbours_min: int) -> Bools:
    """Reflectance says so, or the median Tmax of the other samples of the unit does."""
    by_ro = np.nan_to_num(exact(rows, "RO")) >= ro_min
    tmax = pd.Series(exact(rows, "TMAX"), index=rows.index)
    of_unit = tmax.groupby([rows["well"], rows["unit"]])
    enough = of_unit.transform("count") > neighbours_min
    return by_ro | (enough & (of_unit.transform("median") >= median_min)).to_numpy(dtype=bool)


def _finding(rows: pd.DataFrame, row: int, limits: tuple[float, float, float, float]) -> Finding:
    warn_below, warn_above, reject_below, reject_above = limits
    tmax = num(rows, row, "TMAX")
    reject = tmax < reject_below or tmax > reject_above
    low = tmax < warn_below
    limit = (reject_below if reject else warn_below) if low else (reject_above if reject else warn_above)
    text = f"Tmax {say(tmax)} °C is {'below' if low else 'above'} {say(limit)} °C."
    causes = (
        ["very immature peat or lignite (390-415)", "sulfur-rich kerogen", "cellulose or lost-circulation material", "migrated bitumen in S2"]
        if low
        else ["overmature rock", "S2 peak too small or flat", "polymer additive", "reworked inert carbon"]
    )  # fmt: skip
    more = {
        "alternatives": causes,
        "discriminating_test": "look at the S2 trace; solvent extraction and re-run; microscopy",
    }
    return Finding(row, "TMAX", REJECT if reject else WARN, text, ("TMAX", "S2", "TOC", "RO"), tmax, limit, more=more)


RULE = Rule(
    id="tmax_range",
    family="validity",
    title="Tmax is that of kerogen",
    tests="Tmax of common kerogen lies between 400 and 510 °C.",
    check=check,
    inputs=("TMAX", "S2", "TOC", "RO"),
    flags="TMAX",
    formula="Tmax < 400 or > 510: warning; < 380 or > 560: candidate for rejection",
    message="Tmax is outside the range of kerogen",
    source=(
        "our default, no publication; for context AAPG Wiki «Tmax»: immature below 435, oil 435-455 (Type II) or 435-465 "
        "(Type III), gas above"
    ),
    must_not_fire="Overmature rock with S2 above 0.2 up to about 600 °C; peat and lignite at 390-415.",
    example="Tmax 352, S2 3.1: candidate for rejection (cellulose, lost-circulation material, migrated bitumen).",
)
