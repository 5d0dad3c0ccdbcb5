"""What is shown of a firing: numbers with their cells, limits with their sources, neighbours in depth."""

import hashlib
import json
from collections.abc import Mapping
from typing import Any

import numpy as np

from qc.rules.panels import cell as cell_of
from qc.rules.panels import unit_of
from qc.rules.rule import Finding, Rule
from qc.rules.table import UNITS, VALUE_DEFAULTS, Table
from qc.rules.thresholds import in_words

NEIGHBOURS = 3  # above and below
SAMPLES_LISTED = 20
ROWS_SHOWN = 3
LETTERS = 26


def cell_address(column: int, row: int) -> str:
    """``(6, 17)`` -> ``F17``."""
    letters = ""
    while column > 0:
        column, rest = divmod(column - 1, LETTERS)
        letters = chr(ord("A") + rest) + letters
    return f"{letters}{row}"


class Witness:
    """Writes evidence records for one table; keeps the order of depths of each well."""

    def __init__(self, table: Table) -> None:
        self.table = table
        self._columns = {name: table.rows[name].to_numpy() for name in table.rows.columns}
        self._found: dict[tuple[int, str], dict[str, Any] | None] = {}
        self._order: dict[tuple[int, str], list[int]] = {}
        self._place: dict[int, int] = {}
        deep = table.rows[table.rows["top_m"].notna()].sort_values(["well", "method", "top_m"], kind="stable")
        key: Any
        for key, group in deep.groupby(["well", "method"], sort=False):
            members = [int(row) for row in group.index]
            self._order[key] = members
            self._place.update({row: place for place, row in enumerate(members)})

    def record(self, rule: Rule, parameters: Mapping[str, Mapping[str, Any]], finding: Finding) -> dict[str, Any]:
        """The evidence of one finding, as plain JSON."""
        made: dict[str, Any] = {
            "rule": rule.id,
            "version": rule.version,
            "parameters": {name: _parameter(entry) for name, entry in parameters.items()},
            "inputs": self.inputs(finding),
            "computed": finding.computed,
            "limit": finding.limit,
            **finding.more,
        }
        others = [self.table.name(row) for row in finding.rows[:SAMPLES_LISTED]]
        if others:
            made["samples"], made["samples_count"] = others, len(finding.rows)
        if finding.row is None:
            made.setdefault("interval_m", self._interval(finding.rows))
        else:
            made["depth"] = self._depth(finding.row)
            made["neighbours"] = self.neighbours(finding)
        return plain(made)

    def inputs(self, finding: Finding) -> list[dict[str, Any]]:
        """Every input with its raw text and cell; of the sample itself and of the ones it is compared with."""
        if finding.row is None:
            return []
        rows = [finding.row, *finding.rows[: ROWS_SHOWN - 1]]
        return [
            self._input(row, name, tell=len(rows) > 1)
            for row in rows
            for name in finding.inputs
            if self._has(row, name)
        ]

    def _cell(self, row: int, analyte: str) -> dict[str, Any] | None:
        """Suffix -> value of an analyte of the row; None where it has none."""
        held = self._columns.get(f"{analyte}_id")
        if held is not None and held[row] >= 0:
            return {suffix: self._columns[f"{analyte}{suffix}"][row] for suffix in VALUE_DEFAULTS}
        if not self.table.panels:
            return None
        if (row, analyte) not in self._found:
            self._found[row, analyte] = cell_of(self.table, row, analyte)
        return self._found[row, analyte]

    def _has(self, row: int, analyte: str) -> bool:
        return self._cell(row, analyte) is not None

    def _input(self, row: int, analyte: str, tell: bool) -> dict[str, Any]:
        column, held = self._columns, self._cell(row, analyte) or {}
        holder, place = int(held["_row"]), int(held["_col"])
        line = int(column["line"][holder])
        cell = cell_address(line, place) if column["across"][holder] else cell_address(place, line)
        made = {
            "analyte": analyte, "value": held[""], "qualifier": held["_q"], "unit": UNITS.get(analyte) or unit_of(analyte),
            "decimals": held["_d"], "text": held["_text"],
            "file": column["file"][holder], "sheet": column["sheet"][holder], "cell": cell if place >= 0 else "",
            "result": held["_id"],
        }  # fmt: skip
        return {**made, "sample": self.table.name(row)} if tell else made

    def _interval(self, rows: tuple[int, ...]) -> list[float]:
        """From the shallowest top to the deepest end of the samples [m]."""
        depths = self.table.rows.loc[list(rows), ["top_m", "base_m"]]
        return [float(depths["top_m"].min()), float(depths.max(axis=1).max())]

    def _depth(self, row: int) -> dict[str, Any]:
        column = self._columns
        return {
            "top_m": column["top_m"][row], "base_m": column["base_m"][row], "top_reported": column["top_text"][row],
            "base_reported": column["base_text"][row], "unit_reported": column["depth_unit"][row],
            "file": column["file"][row], "sheet": column["sheet"][row], "line": column["line"][row],
        }  # fmt: skip

    def neighbours(self, finding: Finding) -> list[dict[str, Any]]:
        """The three analyses above and the three below in the well, with the values the rule read."""
        row = finding.row
        if row is None or row not in self._place:
            return []
        column = self._columns
        members = self._order[(column["well"][row], column["method"][row])]
        at = self._place[row]
        near = members[max(0, at - NEIGHBOURS) : at] + members[at + 1 : at + 1 + NEIGHBOURS]
        shown = finding.inputs[:3]
        return [
            {"sample": column["label"][other], "top_m": column["top_m"][other]}
            | {name: f"{held['_q']}{held['']:g}" for name in shown if (held := self._cell(other, name))}
            for other in near
        ]

    def fingerprint(self, rule: Rule, parameters: Mapping[str, Mapping[str, Any]], finding: Finding) -> str:
        """SHA-256 of rule, inputs and thresholds: the same in every run while these are the same."""
        rows = ([] if finding.row is None else [finding.row]) + list(finding.rows)
        said = [
            rule.id, rule.version, finding.analyte, finding.severity,
            sorted((name, entry["value"]) for name, entry in parameters.items()),
            [self._identity(row, finding) for row in rows],
            finding.limit if rule.family == "depth" else finding.more.get("control"),
        ]  # fmt: skip
        text = json.dumps(plain(said), sort_keys=True, separators=(",", ":"), ensure_ascii=False)
        return hashlib.sha256(text.encode()).hexdigest()

    def _identity(self, row: int, finding: Finding) -> list[Any]:
        column, well = self._columns, self.table.wells.loc[self._columns["well"][row]]
        values = [[name, held["_q"], held[""]] for name in finding.inputs if (held := self._cell(row, name))]
        sample = [
            column[name][row] for name in ("match_key", "label", "kind", "top_m", "base_m", "method", "replicate")
        ]
        return [str(well["name"]), str(well["uwi"]), *sample, values]


def _parameter(entry: Mapping[str, Any]) -> dict[str, Any]:
    return {
        "value": entry["value"], "unit": entry["unit"], "source": in_words(entry["mark"], entry["source"]),
        "mark": entry["mark"], "from": entry.get("from", "default"),
    }  # fmt: skip


def plain(value: Any) -> Any:
    """NumPy and NaN out, JSON in: NaN and infinities become null."""
    if isinstance(value, Mapping):
        return {str(key): plain(one) for key, one in value.items()}
    if isinstance(value, list | tuple):
        return [plain(one) for one in value]
    if isinstance(value, np.generic):
        value = value.item()
    if isinstance(value, float) and not np.isfinite(value):
        return None
    return value
