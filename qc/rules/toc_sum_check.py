"""TOC = PC + RC where a report gives all three."""

import numpy as np
import pandas as pd

from qc.rules.rule import WARN, Answer, Finding, Rule, fired, judge, say
from qc.rules.spans import exact, num, reported
from qc.rules.table import Table

PARTS = ("TOC", "PC", "RC")


def check(table: Table, *, slack: float) -> Answer:
    """One check a pyrolysis row that reports PC and RC: the sum holds within the half-units of the three."""
    rows = table.of("pyrolysis")
    combustion = rows["TOC_row"].to_numpy() != rows.index.to_numpy()
    applies = reported(rows, "PC") & reported(rows, "RC") & ~(combustion & reported(rows, "TOC"))
    residual = exact(rows, "TOC") - exact(rows, "PC") - exact(rows, "RC")
    limit = slack * np.sum([rows[f"{part}_h"].to_numpy() for part in PARTS], axis=0)
    with np.errstate(invalid="ignore"):
        fires = np.abs(residual) > limit + 1e-9
    outcome = judge(rows.index, applies=applies, known=~np.isnan(residual), fires=fires)
    sums = pd.DataFrame({"residual": residual, "limit": limit}, index=rows.index)
    return Answer(outcome, [_finding(rows, sums, row) for row in fired(outcome)])


def _finding(rows: pd.DataFrame, sums: pd.DataFrame, row: int) -> Finding:
    residual, limit = num(sums, row, "residual"), num(sums, row, "limit")
    text = (
        f"TOC {say(num(rows, row, 'TOC'))} is not PC {say(num(rows, row, 'PC'))} + RC {say(num(rows, row, 'RC'))}: "
        f"{say(residual)} wt% remain, rounding explains {say(limit)}."
    )
    more = {
        "alternatives": ["slip in one of the three", "TOC from another determination"],
        "discriminating_test": "ask the laboratory which determination TOC is from",
    }
    return Finding(row, "TOC", WARN, text, PARTS, round(residual, 6), round(limit, 6), more=more)


RULE = Rule(
    id="toc_sum_check",
    family="arithmetic",
    title="TOC is the sum of its parts",
    tests="Where TOC, pyrolysable carbon PC and residual carbon RC are all reported, TOC must be PC + RC.",
    check=check,
    inputs=PARTS,
    flags="TOC",
    formula="|TOC - PC - RC| > hTOC + hPC + hRC, h half a unit of the last decimal",
    message="TOC is not the sum of pyrolysable and residual carbon",
    source="definition of TOC in full-cycle pyrolysis, from memory of Behar, Beaumont & Penteado 2001, OGST 56:111",
    must_not_fire="When TOC is from a separate combustion analysis.",
    example="PC 0.77, RC 1.38: TOC 2.15 passes, TOC 2.18 leaves 0.03 > 0.015 and fires.",
)
