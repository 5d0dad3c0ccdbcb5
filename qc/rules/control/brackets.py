"""Which results a control stands for: those between its neighbours of the same material in the same table."""

from collections.abc import Iterator
from dataclasses import dataclass, field
from typing import Any

import numpy as np
import pandas as pd

from qc.rules.asking import of_sets
from qc.rules.panels import METHODS
from qc.rules.rule import FIRE, Answer, Finding
from qc.rules.table import Table

CHART = ["project", "laboratory", "method", "analyte", "material", "lot"]


@dataclass
class Brackets:
    """Controls of source tables at hand with the rows that they bracket, a well at a time."""

    table: Table
    _rows: dict[tuple[int, str], pd.DataFrame] = field(default_factory=dict)

    def __iter__(self) -> Iterator[tuple[int, list[tuple[int, ...]]]]:
        """(place in ``table.controls``, bracketed rows of each well)."""
        controls = self.table.controls
        near = controls[controls["table"] >= 0]
        if near.empty:
            return
        held = self.table.rows[self.table.rows["table"].isin(near["table"])]
        groups: Any = held.groupby(["table", "method"])
        self._rows = {(int(number), str(method)): group for (number, method), group in groups}
        for _, group in near.groupby(["table", *CHART, "role"], sort=True):
            lines = group["line"].to_numpy()
            for place, line in zip(group.index, lines, strict=True):
                before, after = lines[lines < line], lines[lines > line]
                low, high = before.max() if len(before) else -1, after.min() if len(after) else np.inf
                yield int(place), self._between(group.loc[place], low, high)

    def _between(self, control: pd.Series, low: float, high: float) -> list[tuple[int, ...]]:
        rows = self._rows.get((int(control["table"]), str(control["method"])))
        if rows is None:
            return []
        inside = rows[(rows["line"] > low) & (rows["line"] < high)]
        measured = inside[self._measured(inside, str(control["method"]), str(control["analyte"]))]
        return [tuple(int(row) for row in index) for index in measured.groupby("well", sort=True).groups.values()]

    def _measured(self, rows: pd.DataFrame, method: str, analyte: str) -> pd.Series:
        frame = self.table.panels.get(method) if method in METHODS else self.table.rows
        if frame is None or f"{analyte}_id" not in frame:
            return pd.Series(False, index=rows.index)
        return frame.loc[rows.index, f"{analyte}_row"] == rows.index


def each(table: Table, judge: Any) -> Answer:
    """One check a control and well whose results it brackets; ``judge(place)`` gives (outcome, tell) with ``tell(rows)``."""
    entries: list[Any] = []
    for place, wells in Brackets(table):
        if not wells:
            continue
        outcome, tell = judge(place)
        entries += [(rows[0], outcome, tell(rows) if outcome == FIRE else None) for rows in wells]
    return of_sets(entries)


def finding(
    control: Any, rows: tuple[int, ...], severity: str, text: str, *, computed: Any, limit: Any, **more: Any
) -> Finding:
    """A finding about results that a control brackets, the control's own cell with it."""
    analyte = str(control["analyte"])
    shown = {
        "material": control["material"], "lot": control["lot"], "value": float(control["value"]), "text": control["text"],
        "certified": float(control["certified"]), "report": control["report"], "date": control["date"],
        "line": int(control["line"]), "column": int(control["column"]), "file": control["file"], "sheet": control["sheet"],
    }  # fmt: skip
    name = f"{control['material']} {control['lot']}".strip()
    text = f"{name}, line {int(control['line'])}: {text} It stands for {len(rows)} results."
    more = {"control": shown, "discriminating_test": "repeat the control and the samples it brackets", **more}
    return Finding(None, analyte, severity, text, (analyte,), computed, limit, rows=rows, more=more)
