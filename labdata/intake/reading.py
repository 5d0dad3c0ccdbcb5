"""Reading whole columns: every cell becomes a number with its qualifier, a blank, or a finding that names the cell."""

from collections.abc import Iterable
from dataclasses import dataclass, field

from labdata.intake import units, values
from labdata.intake.columns import Column, Mapping
from labdata.intake.fields import field_types
from labdata.intake.findings import Findings, place_name
from labdata.intake.tables import Table
from labdata.intake.values import BLANK, EMPTY, Reading, comma_role, read_number, read_text
from labdata.intake.workbook import Cell, Sheet, cell_text

MAX_FINDINGS_A_COLUMN = 300
# Quantities that have no detection limit: "n.d." can only mean "not determined" there.
NO_LIMIT = frozenset({
    "TMAX", "TPEAK", "OICO", "HI", "OI", "PI", "OSI", "S2S3", "RO", "RO_SD", "RO_N", "RO_MIN", "RO_MAX", "D13C_ORG", "D13C_CARB", "D18O_CARB", "D34S",
    "PR_PH", "PR_NC17", "PH_NC18", "CPI", "OEP", "RHOG", "RHOB", "PHI", "KAIR", "KLINK", "SW", "SO", "SG", "GR",
})  # fmt: skip


@dataclass
class Cells:
    """One result column as read, one entry a data row; numbers as reported, before any factor."""

    readings: list[Reading]
    texts: list[str]
    stored_numbers: bool = False
    units_said: set[str] = field(default_factory=set)
    all_say_unit: bool = False

    @property
    def values(self) -> list[float | None]:
        return [reading.value for reading in self.readings]

    @property
    def largest(self) -> float | None:
        """The largest number that is no ">" limit; None for an empty column."""
        found = [r.value for r in self.readings if r.value is not None and r.qualifier != ">" and r.value == r.value]
        return max(found) if found else None

    def keep(self, rows: list[bool]) -> None:
        """Forget the readings of rows that are no samples."""
        self.readings = [reading if kept else EMPTY for reading, kept in zip(self.readings, rows, strict=True)]

    @property
    def decimals(self) -> int:
        return max((r.decimals for r in self.readings if r.value is not None), default=0)


def decimal_comma(table: Table, mapping: Mapping, findings: Findings) -> str:
    """What a comma before three digits is in this table; asked when such cells exist and no other cell tells."""
    texts = list(_doubtful(table, mapping))
    role = comma_role(texts)
    if role:
        return role
    for row, column in _three_digits(table, mapping):
        text = cell_text(table.sheet.rows[row][column.index])
        return findings.ask(
            f"comma:{place_name(table.sheet.name, table.sheet.address(table.top, table.heads[0].index))}",
            "comma_ambiguous",
            f"In «{text}» the comma may mark thousands or decimals, and no other cell of the table tells.",
            ["thousands", "decimal"],
            sheet=table.sheet.name, cell=table.sheet.address(row, column.index), value=text,
        ) or values.UNKNOWN  # fmt: skip
    return values.THOUSANDS


def _doubtful(table: Table, mapping: Mapping) -> Iterable[str]:
    """Texts of number columns that hold a comma, and enough of those with a point to tell by."""
    points = 0
    for column in mapping.columns:
        if column.is_result or column.field in {"TOP", "BASE", "DEPTH_CHECK", "ELEVATION", "LATITUDE", "LONGITUDE"}:
            for cell in table.cells(column.index):
                if isinstance(cell, str):
                    if "," in cell:
                        yield cell
                    elif "." in cell and points < 5000:
                        points += 1
                        yield cell


def _three_digits(table: Table, mapping: Mapping) -> Iterable[tuple[int, Column]]:
    for column in mapping.columns:
        if column.is_result or column.field in {"TOP", "BASE"}:
            for row, cell in zip(table.rows, table.cells(column.index), strict=True):
                if isinstance(cell, str) and "," in cell and read_text(cell.strip(), "").state == values.AMBIGUOUS:
                    yield row, column


def read_column(sheet: Sheet, column: Column, rows: list[int], cells: list[Cell], *, comma: str) -> Cells:
    """Read every cell of a column. Nothing is reported yet: see ``settle_column``."""
    readings: list[Reading] = []
    texts: list[str] = []
    numbers = False
    for cell in cells:
        kind = type(cell)
        if kind is float or kind is int:
            readings.append(read_number(cell))
            texts.append("")
            numbers = True
        elif kind is str:
            text = cell.strip()
            readings.append(read_text(text, comma) if text else EMPTY)
            texts.append(text)
        else:
            readings.append(Reading(values.UNREADABLE, note=_no_number(cell)))
            texts.append(cell_text(cell))
    if sheet.faults:
        _put_faults(sheet, column, rows, readings, texts)
    said = [reading.unit for reading in readings if reading.state == values.VALUE and reading.value is not None]
    return Cells(readings, texts, numbers, {unit for unit in said if unit}, bool(said) and all(said))


def _no_number(cell: Cell) -> str:
    return (
        "is true or false, not a number"
        if isinstance(cell, bool)
        else "is a date, which spreadsheets make of numbers like 1-2"
    )


def _put_faults(sheet: Sheet, column: Column, rows: list[int], readings: list[Reading], texts: list[str]) -> None:
    for at, row in enumerate(rows):
        fault = sheet.faults.get((row, column.index))
        if fault:
            texts[at] = fault
            readings[at] = Reading(
                values.UNREADABLE,
                note="is a spreadsheet error" if fault.startswith("#") else "is a formula without a stored result",
            )


@dataclass
class Settled:
    """A column ready to store: canonical values and, per row, "value", "blank" or "finding"."""

    states: list[str]
    values: list[float | None]
    qualifiers: list[str]
    texts: list[str]
    decimals: list[int]


class Teller:
    """Judges the readings of one column and reports what a person should know."""

    def __init__(self, table: Table, column: Column, findings: Findings, nd: str) -> None:
        self.sheet, self.column, self.findings = table.sheet.name, column, findings
        self.rows = table.rows
        self.address = table.sheet.address
        self.shown_decimals = table.sheet.formats.get(column.index, 0)
        self.canonical = field_types()[column.field].unit
        self.nd_blank = column.field in NO_LIMIT or self._nd_answer(nd)
        self.told = 0
        self.seen: dict[str, list[str]] = {}

    def settle(self, read: Cells, cells: list[Cell], rows_kept: list[bool]) -> Settled:
        """Turn readings into canonical values; every cell that gives no result is a blank or is named in a finding.

        Rows that are not kept are not reported on.
        """
        done = Settled([], [], [], [], [])
        for at, reading in enumerate(read.readings):
            text = read.texts[at]
            state, value = self.judge(self.rows[at], reading, text) if rows_kept[at] else (BLANK, None)
            valued = state == values.VALUE
            done.states.append(state)
            done.values.append(value)
            done.qualifiers.append(reading.qualifier if valued else "")
            done.texts.append(text if text or not valued else cell_text(cells[at]))
            done.decimals.append(min(reading.decimals, 12))
        self.column.decimals = min(max(read.decimals, self.shown_decimals), 12)
        self.close()
        return done

    def _nd_answer(self, nd: str) -> bool:
        given = str(self.findings.answers.get(f"nd:{place_name(self.sheet, self.column.letter)}", nd))
        return "determin" in given or "bestimm" in given or "anal" in given

    def judge(self, row: int, reading: Reading, text: str) -> tuple[str, float | None]:
        """("value", canonical number or None), ("blank", None) or ("finding", None)."""
        if reading.state == values.VALUE:
            return self._value(row, reading, text)
        if reading.state == BLANK:
            if reading.note:
                self._remember("null code", row)
            return BLANK, None
        if reading.state == values.AMBIGUOUS:
            return "finding", None  # the question about commas names the table's first such cell and stops the file
        self._unreadable(row, text, reading.note)
        return "finding", None

    def _value(self, row: int, reading: Reading, text: str) -> tuple[str, float | None]:
        if reading.value is None:
            if reading.note == "nd":
                self._remember("nd", row)
                return (BLANK, None) if self.nd_blank else (values.VALUE, None)
            self._remember("limit", row)
            return values.VALUE, None
        factor = self.column.factor
        if reading.unit:
            said = units.parse(reading.unit)
            own = units.factor(said, self.canonical) if said else None
            if own is None:
                self._unreadable(
                    row,
                    text,
                    f"carries «{reading.unit}», which is no unit of {self.column.field}",
                )
                return "finding", None
            if own != factor:
                self._remember(f"unit {said}", row)
            factor = own
        if reading.note in {"mark", "uncertainty"}:
            self._remember(reading.note, row)
        return values.VALUE, reading.value if factor == 1 else float(f"{reading.value * factor:.15g}")

    def _unreadable(self, row: int, text: str, note: str) -> None:
        cell = self.address(row, self.column.index)
        id_ = f"cell:{place_name(self.sheet, cell)}"
        if str(self.findings.answers.get(id_, "")).strip().casefold() in {"blank", "leave out"}:
            self.findings.warning(
                "left_out",
                f"Cell {cell} «{text}» was left out as answered.",
                id=id_,
                sheet=self.sheet,
                cell=cell,
                value=text,
            )
            return
        self.told += 1
        if self.told <= MAX_FINDINGS_A_COLUMN:
            self.findings.error(
                "unreadable_value",
                f"{self.column.field} in cell {cell} cannot be read: {_quoted(text)} {note}.",
                id=id_, sheet=self.sheet, cell=cell, value=text,
                remedy=f"Correct the cell, or answer «{id_}» with «blank» to leave it out.",
            )  # fmt: skip
        else:
            self._remember("unreadable", row)

    def _remember(self, what: str, row: int) -> None:
        self.seen.setdefault(what, []).append(self.address(row, self.column.index))

    def close(self) -> None:
        """Report, once a column, what was read in a way that a person may want to know."""
        for what, cells in self.seen.items():
            level, code, message, remedy = self._words(what, len(cells))
            place = {"sheet": self.sheet, "cell": cells[0], "cells": tuple(cells), "remedy": remedy}
            getattr(self.findings, level)(code, f"{self.column.field} in {_some(cells)}: {message}", **place)

    def _words(self, what: str, count: int) -> tuple[str, str, str, str]:
        place = place_name(self.sheet, self.column.letter)
        if what == "nd" and self.nd_blank:
            return "note", "not_determined", "«n.d.» is read as not determined.", ""
        if what == "nd":
            return ("note", "not_detected", "«n.d.» is read as not detected, below an unknown limit.",
                    f"If it means not determined, answer «nd:{place}» with «not determined» and send the file again.")  # fmt: skip
        if what == "limit":
            return (
                "note",
                "unknown_limit",
                "below a limit that is not given; kept without a number.",
                "Ask the laboratory for its reporting limit.",
            )
        if what == "null code":
            return "note", "null_code", "the number stands for «no value» and is read as blank.", ""
        if what == "mark":
            return (
                "warning",
                "marked_value",
                "the number carries a mark whose meaning stands in the notes.",
                "Read the notes before accepting it.",
            )
        if what == "uncertainty":
            return "note", "uncertainty", "the uncertainty is kept with the text as reported.", ""
        if what == "unreadable":
            return "error", "unreadable_value", f"{count} more cells cannot be read.", "Correct the column."
        return (
            "warning",
            "unit_in_cell",
            f"the cell gives its own unit {what[5:]}; it was converted.",
            "Check the column's unit.",
        )


def _quoted(text: str) -> str:
    return "it" if text.startswith("formula ") else f"«{text}»"


def _some(cells: list[str]) -> str:
    return ", ".join(cells[:3]) + (f" and {len(cells) - 3} more" if len(cells) > 3 else "")
