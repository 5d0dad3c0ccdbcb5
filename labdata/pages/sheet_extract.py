"""A cut-out of the laboratory's own sheet around one result, read again from the stored file."""

import re
from dataclasses import dataclass

from django.core.files.storage import default_storage

from labdata.intake.workbook import Sheet, cell_text, letters, read
from labdata.models import Result, SourceTable

AROUND = 4
HEADER_ROWS = 2


@dataclass(frozen=True)
class Cell:
    text: str
    mark: str


@dataclass(frozen=True)
class Line:
    """One row of the cut-out; ``number`` 0 stands for rows left out."""

    number: int
    mark: str
    cells: list[Cell]


@dataclass(frozen=True)
class Extract:
    """``letters`` of the columns shown, then the rows."""

    sheet: str
    letters: list[str]
    lines: list[Line]


def place(result: Result) -> tuple[int, int]:
    """Row and column of the result's cell, counted from 1."""
    across, down = result.column.line, result.analysis.line
    by_rows = result.column.table.orientation == SourceTable.Orientation.ROWS
    return (down, across) if by_rows else (across, down)


def address(result: Result) -> str:
    """The result's cell as a spreadsheet names it: ``F17``."""
    row, column = place(result)
    return f"{letters(column - 1)}{row}"


def extract(result: Result) -> Extract | None:
    """Four samples either side of the cell with every mapped column, and the head of the table.

    None when the sheet is not in the stored file. Raises UnreadableFile as reading the file does.
    """
    table, file = result.column.table, result.column.table.report.source_file
    with default_storage.open(file.stored_as) as stored:
        book = read(file.name, stored.read())
    sheet = next((one for one in book.sheets if one.name == table.sheet), None)
    return _cut(sheet, result, table) if sheet else None


def _cut(sheet: Sheet, result: Result, table: SourceTable) -> Extract:
    row, column = place(result)
    mapped = sorted(table.columns.values_list("line", flat=True))
    head_row, head_column = _corner(table)
    if table.orientation == SourceTable.Orientation.ROWS:
        rows, columns = _window(row, head_row, len(sheet.rows)), mapped
    else:
        width = max(map(len, sheet.rows), default=0)
        rows, columns = mapped, _window(column, head_column, width)
    lines, last = [], 0
    for number in rows:
        if last and number > last + 1:
            lines.append(Line(0, "gap-row", []))
        lines.append(_line(sheet, number, columns, (row, column), head_row))
        last = number
    return Extract(sheet.name, [letters(one - 1) for one in columns], lines)


def _line(sheet: Sheet, number: int, columns: list[int], this: tuple[int, int], head_row: int) -> Line:
    held = sheet.rows[number - 1] if number <= len(sheet.rows) else []
    cells = [Cell(cell_text(held[one - 1]) if one <= len(held) else "", _mark(number, one, this)) for one in columns]
    mark = "this-row" if number == this[0] else "head-row" if number < head_row + HEADER_ROWS else ""
    return Line(number, mark, cells)


def _mark(row: int, column: int, this: tuple[int, int]) -> str:
    if (row, column) == this:
        return "this-cell"
    return "this-col" if column == this[1] else ""


def _window(centre: int, head: int, end: int) -> list[int]:
    """The head and four either side of the centre, in order, within 1..end."""
    wanted = {*range(head, head + HEADER_ROWS), *range(max(head, centre - AROUND), centre + AROUND + 1)}
    return sorted(one for one in wanted if 1 <= one <= max(end, centre))


def _corner(table: SourceTable) -> tuple[int, int]:
    """Row and column, from 1, of the upper left cell of the table's range."""
    found = re.match(r"([A-Z]+)(\d+)", table.cell_range)
    if not found:
        return 1, 1
    column = 0
    for letter in found[1]:
        column = column * 26 + ord(letter) - 64
    return int(found[2]), column
