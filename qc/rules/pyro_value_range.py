"""What no pyrolysis or TOC value can be."""

from typing import NamedTuple

import numpy as np
import pandas as pd

from qc.rules.rule import REJECT, WARN, Answer, Finding, Rule, fired, judge, merge, say
from qc.rules.spans import Bools, num, reported, span, word
from qc.rules.table import Table

PEAKS = ("S1", "S2", "S3")


class Range(NamedTuple):
    analyte: str
    low: float
    high: float


def check(table: Table, *, toc_max: float, hydrocarbon_max: float, tmax_min: float, tmax_max: float) -> Answer:
    """One check for each value present, and one a row for a line copied from the row above."""
    rows = table.of("pyrolysis", "carbon")
    own = pd.DataFrame(
        {name: reported(rows, name) & (rows[f"{name}_row"] == rows.index) for name in (*PEAKS, "TOC", "PI", "TMAX")}
    )
    ranges = [
        Range("S1", 0, hydrocarbon_max), Range("S2", 0, hydrocarbon_max), Range("S3", 0, np.inf),
        Range("TOC", 0, toc_max), Range("PI", 0, 1), Range("TMAX", tmax_min, tmax_max),
    ]  # fmt: skip
    answers = [_in_range(rows, one, own[one.analyte].to_numpy()) for one in ranges]
    return merge([*answers, _sum_in_range(rows, hydrocarbon_max), _copied(rows)])


def _in_range(rows: pd.DataFrame, limits: Range, present: Bools) -> Answer:
    values = span(rows, limits.analyte)
    low, low_known = values.below(limits.low)
    high, high_known = values.above(limits.high)
    zero = (rows[limits.analyte] == 0).to_numpy() & _limit_stated(rows, limits.analyte) & (limits.low == 0)
    outcome = judge(rows.index, applies=present, known=low_known & high_known, fires=low | high | zero)
    return Answer(outcome, [_finding(rows, row, limits) for row in fired(outcome)])


def _limit_stated(rows: pd.DataFrame, analyte: str) -> Bools:
    """Rows whose column holds values reported as below a limit: a plain 0 there should have been one of them."""
    column = pd.Series(list(zip(rows["table"], rows[f"{analyte}_col"], strict=True)), index=rows.index)
    limited = set(column[rows[f"{analyte}_q"] == "<"])
    return column.isin(limited).to_numpy() & (rows[f"{analyte}_q"] != "<").to_numpy()


def _finding(rows: pd.DataFrame, row: int, limits: Range) -> Finding:
    value = num(rows, row, limits.analyte)
    name = limits.analyte
    if value == 0 and limits.low == 0:
        text, severity = (
            f"{name} is exactly 0 in a column that states a reporting limit; it should be below that limit.",
            WARN,
        )
        other = ["below the reporting limit and entered as 0", "missing value entered as 0"]
    else:
        bounds = f"{say(limits.low)} to {say(limits.high)}" if np.isfinite(limits.high) else f"{say(limits.low)} and up"
        text, severity = (
            f"{name} {word(rows, row, f'{name}_text') or say(value)} is outside what is possible ({bounds}).",
            REJECT,
        )
        other = ["typing error", "value of another column", "missing-value code read as a number"]
    more = {"alternatives": other, "discriminating_test": "read the cell in the laboratory's own file"}
    limit = limits.low if value <= limits.low else limits.high
    return Finding(row, name, severity, text, (name,), value, float(limit), more=more)


def _sum_in_range(rows: pd.DataFrame, hydrocarbon_max: float) -> Answer:
    both = reported(rows, "S1") & reported(rows, "S2")
    fires, known = (span(rows, "S1") + span(rows, "S2")).above(hydrocarbon_max)
    alone = (rows[["S1", "S2"]] > hydrocarbon_max).any(axis=1).to_numpy()
    outcome = judge(rows.index, applies=both & ~alone, known=known, fires=fires)
    findings = [
        Finding(
            row, "S2", REJECT, f"S1 + S2 is {say(num(rows, row, 'S1') + num(rows, row, 'S2'))} mg/g, more than the rock itself.",
            ("S1", "S2"), float(num(rows, row, "S1") + num(rows, row, "S2")), hydrocarbon_max,
            more={"alternatives": ["unit slip"], "discriminating_test": "read the cells in the laboratory's own file"},
        )
        for row in fired(outcome)
    ]  # fmt: skip
    return Answer(outcome, findings)


def _copied(rows: pd.DataFrame) -> Answer:
    """S1, S2 and S3 of a line repeat those of the line above it in the laboratory's table."""
    peaks = [rows[f"{name}"].to_numpy() for name in PEAKS]
    measured = np.logical_and.reduce(
        [rows[f"{name}_q"].eq("").to_numpy() & (peak > 0) for name, peak in zip(PEAKS, peaks, strict=True)]
    )
    keyed = pd.DataFrame(
        {"table": rows["table"], "line": rows["line"], **dict(zip(PEAKS, peaks, strict=True))}, index=rows.index
    )
    order = keyed.sort_values(["table", "line"], kind="stable")
    above = order.shift(1)
    same = (order[["table", *PEAKS]] == above[["table", *PEAKS]]).all(axis=1).reindex(rows.index).to_numpy()
    before = pd.Series(order.index, index=order.index).shift(1).reindex(rows.index)
    stated = ~rows["role"].eq("duplicate").to_numpy()
    outcome = judge(rows.index, applies=measured & stated, known=True, fires=same)
    return Answer(outcome, [_copy_finding(rows, row, int(before[row])) for row in fired(outcome)])


def _copy_finding(rows: pd.DataFrame, row: int, other: int) -> Finding:
    text = "S1, S2 and S3 repeat the line above to the last decimal, as if the line was copied."
    more = {
        "alternatives": ["line copied", "duplicate measurement not flagged as one", "coincidence of small values"],
        "discriminating_test": "ask the laboratory for the two traces",
    }
    return Finding(row, "S2", WARN, text, PEAKS, num(rows, row, "S2"), None, rows=(other,), more=more)


RULE = Rule(
    id="pyro_value_range",
    family="validity",
    title="Values are physically possible",
    tests="Peaks, TOC, PI and Tmax are held against what is possible at all; zeros and copied lines are pointed out.",
    check=check,
    inputs=("S1", "S2", "S3", "TOC", "PI", "TMAX"),
    flags="the value",
    formula=(
        "S1, S2, S3, TOC < 0; TOC > 100; S1 + S2 > 1000; PI outside 0-1; Tmax outside 300-650. Warns on an exact 0 in a "
        "column with reporting limits, and where S1, S2 and S3 repeat the row above."
    ),
    message="The value is not possible",
    source="physical limits (our default, no publication)",
    must_not_fire="On 0 where the laboratory states no reporting limit.",
    example="S1 = -0.01 is a candidate for rejection.",
)
