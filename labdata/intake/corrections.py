"""What a person says of a file's columns and header rows. It stands above whatever was recognised.

A correction is an answer that no question asked for, so that it travels with the answers of an upload:

    field:Sheet1!C5   a field code, or "leave out"        (C5: the column's lowest header cell)
    in:Sheet1!C5      the unit of the column's numbers
    header:Sheet1     the rows of its header, "5" or "4-6"; "4-6, 31-32" for two tables in one sheet; or "leave out"
"""

import re
from collections.abc import Mapping as Pairs
from dataclasses import dataclass, field, replace

from labdata.intake import units
from labdata.intake.fields import field_types
from labdata.intake.findings import Findings, place_name
from labdata.intake.tables import MAX_HEADER_ROWS, Head, Table

LEAVE_OUT = "leave out"
FIELD, UNIT, HEADER = "field:", "in:", "header:"
DEPTH_FIELDS = ("TOP", "BASE")


@dataclass(frozen=True)
class Said:
    """What is said of one column: a field code or LEAVE_OUT, a unit; "" where nothing is. ``reason`` names who said it."""

    field: str = ""
    unit: str = ""
    reason: str = ""

    def over(self, other: "Said") -> "Said":
        """This, and where it says nothing the other."""
        return Said(self.field or other.field, self.unit or other.unit, self.reason or other.reason)


def is_correction(id: str) -> bool:
    """True for the id of an answer that corrects the mapping."""
    return id.startswith((FIELD, UNIT, HEADER))


def canonical_unit(code: str) -> str:
    """The unit that a field's numbers end up in, "" for a field without one."""
    return "m" if code in DEPTH_FIELDS else field_types()[code].unit if code in field_types() else ""


def unit_options(code: str) -> list[str]:
    """Units that a column of this field may be in."""
    canonical = canonical_unit(code)
    return units.convertible(canonical) if canonical else []


def header_cell(table: Table, index: int) -> str:
    """The address that names a column of the table: its lowest header cell."""
    return table.sheet.address(table.top + table.height - 1, index)


@dataclass
class Corrections:
    """All corrections of one file, by header cell and by sheet; what cannot be meant is an error finding."""

    columns: dict[str, Said] = field(default_factory=dict)
    headers: dict[str, list[tuple[int, int]]] = field(default_factory=dict)
    used: set[str] = field(default_factory=set)

    @classmethod
    def of(cls, answers: Pairs[str, str], said_by: Pairs[str, str], findings: Findings) -> "Corrections":
        """Those among the answers that are corrections. ``said_by``: answer id -> name of the person."""
        made = cls()
        for id_, text in answers.items():
            place, told = id_.partition(":")[2], text.strip()
            reason = f"set by {said_by.get(id_) or 'an answer'}"
            if id_.startswith(HEADER):
                made._header(id_, place, told, findings)
            elif id_.startswith(FIELD):
                if code := _code(id_, told, findings):
                    made._column(place, Said(field=code, reason=reason))
            elif id_.startswith(UNIT):
                made._column(place, Said(unit=units.parse(told) or told, reason=reason))
        return made

    def _column(self, place: str, said: Said) -> None:
        self.columns[place] = said.over(self.columns.get(place, Said()))

    def _header(self, id_: str, sheet: str, text: str, findings: Findings) -> None:
        rows = read_rows(text)
        if rows is None:
            findings.error(
                "correction_unreadable",
                f"«{text}» does not name header rows of sheet «{sheet}».",
                id=id_,
                sheet=sheet,
                value=text,
                remedy=f"Write a row such as 5, or rows such as 4-6, at most {MAX_HEADER_ROWS} of them.",
            )
        else:
            self.headers[sheet] = rows

    def of_table(self, table: Table) -> dict[int, Said]:
        """What is said of the table's columns, by their place."""
        places = {place_name(table.sheet.name, header_cell(table, index)): index for index in _reach(table)}
        found = {index: self.columns[place] for place, index in places.items() if place in self.columns}
        self.used |= places.keys() & self.columns.keys()
        return {index: _fitting(said) for index, said in found.items()}

    def report_unused(self, findings: Findings) -> None:
        """A correction of a column that no table has is named, so that it is not thought to work."""
        for place in sorted(self.columns.keys() - self.used):
            sheet, _, cell = place.rpartition("!")
            findings.warning(
                "correction_unused",
                f"Nothing could be set for {place}: no recognised table has its header there.",
                id=f"correction_unused:{place}",
                sheet=sheet,
                cell=cell,
                remedy="Look at the header rows of the sheet on the mapping desk.",
            )


def _code(id_: str, told: str, findings: Findings) -> str:
    if told.casefold() == LEAVE_OUT:
        return LEAVE_OUT
    code = told.upper()
    if code in field_types():
        return code
    sheet, _, cell = id_.removeprefix(FIELD).rpartition("!")
    findings.error(
        "correction_unreadable",
        f"«{told}» is no field, so {cell} cannot be read as it.",
        id=id_,
        sheet=sheet,
        cell=cell,
        value=told,
        remedy=f"Use a field code such as SAMPLE, TOP, TOC or S2, or «{LEAVE_OUT}».",
    )
    return ""


def _fitting(said: Said) -> Said:
    """A unit said of a field that has none is not meant."""
    if said.unit and said.field and said.field != LEAVE_OUT and not canonical_unit(said.field):
        return replace(said, unit="")
    return said


def _reach(table: Table) -> range:
    """The columns that belong to a table, and those right of it as far as its rows are filled without a header."""
    places = [head.index for head in table.heads]
    lines = [table.sheet.rows[row] for row in table.rows[:200]]
    last = max([max(places), *(len(line) - 1 for line in lines)])
    header = table.sheet.rows[table.top + table.height - 1]
    stop = max(places) + 1
    while stop <= last and (stop >= len(header) or header[stop] in {"", None}):
        stop += 1
    return range(min(places), stop)


def add_heads(table: Table, said: dict[int, Said]) -> None:
    """A column without a header text that is given a field joins the heads of its table."""
    known = {head.index for head in table.heads}
    new = [Head(index, "", None) for index, one in said.items() if index not in known and one.field]
    if new:
        table.heads = sorted([*table.heads, *new], key=lambda head: head.index)


def read_rows(text: str) -> list[tuple[int, int]] | None:
    """``"4-6, 31"`` as [(3, 5), (30, 30)], rows from 0; None when it names no rows, too many, or none in order."""
    found: list[tuple[int, int]] = []
    if text.casefold() == LEAVE_OUT:
        return found
    for part in re.split(r"[,;]", text):
        match = re.fullmatch(r"\s*(\d{1,7})\s*(?:[-–:]\s*(\d{1,7})\s*)?", part)
        if match is None:
            return None
        first, last = int(match[1]) - 1, int(match[2] or match[1]) - 1
        if first < 0 or not 0 <= last - first < MAX_HEADER_ROWS or (found and first <= found[-1][1]):
            return None
        found.append((first, last))
    return found
