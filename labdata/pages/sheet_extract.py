"""Cut-outs of the laboratory's own sheet, read again from the stored file: around a result, or of a whole table."""

import re
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

from django.core.files.storage import default_storage

from labdata.intake.workbook import Sheet, cell_text, letters, read
from labdata.models import Result, SourceFile, SourceTable

AROUND = 4
HEADER_ROWS = 2
FIRST_ROWS = 6
MOST_COLUMNS = 80
MOST_FINDINGS = 12


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
    """``letters`` of the columns shown, what each was read as (when that is asked for), then the rows."""

    sheet: str
    letters: list[str]
    lines: list[Line]
    fields: tuple[str, ...] = ()


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
    table = result.column.table
    sheet = _sheet(table.report.source_file, table.sheet)
    return _cut(sheet, result, table) if sheet else None


def preview(file: SourceFile, table: dict[str, Any], findings: list[dict[str, Any]]) -> Extract | None:
    """The head and first rows of a recognised table, and the rows of its findings, with what each column was read as.

    ``table`` and ``findings`` as the outside contract has them. None when there is no such sheet or range.
    """
    corners = corners_of(table["range"])
    sheet = _sheet(file, table["sheet"])
    if corners is None or sheet is None:
        return None
    (top, left), (bottom, right) = corners
    columns = list(range(left, min(right, left + MOST_COLUMNS - 1) + 1))
    marks = _finding_marks(table["sheet"], findings)
    near = {row + step for row, _ in list(marks)[:MOST_FINDINGS] for step in (-1, 0, 1)}
    rows = sorted(row for row in {*range(top, top + HEADER_ROWS + FIRST_ROWS), *near} if top <= row <= bottom)
    fields = {one["column"]: f"{one['field']} {one['unit']}".strip() for one in table["columns"]}
    names = [letters(one - 1) for one in columns]
    lines = _lines(sheet, rows, columns, top, lambda row, column: marks.get((row, column), ""))
    return Extract(sheet.name, names, lines, tuple(fields.get(name, "") for name in names))


def _sheet(file: SourceFile, name: str) -> Sheet | None:
    with default_storage.open(file.stored_as) as stored:
        book = read(file.name, stored.read())
    return next((one for one in book.sheets if one.name == name), None)


def _finding_marks(sheet: str, findings: list[dict[str, Any]]) -> dict[tuple[int, int], str]:
    """Cell -> the mark of the gravest finding about it."""
    marks: dict[tuple[int, int], str] = {}
    for one in findings:
        corner = corners_of(one["cell"]) if one["cell"] and one["sheet"] in {"", sheet} else None
        if corner:
            marks.setdefault(corner[0], f"found-{one['level']}")
    return marks


def _cut(sheet: Sheet, result: Result, table: SourceTable) -> Extract:
    row, column = place(result)
    mapped = sorted(table.columns.values_list("line", flat=True))
    head_row, head_column = _corner(table)
    if table.orientation == SourceTable.Orientation.ROWS:
        rows, columns = _window(row, head_row, len(sheet.rows)), mapped
    else:
        width = max(map(len, sheet.rows), default=0)
        rows, columns = mapped, _window(column, head_column, width)
    lines = _lines(sheet, rows, columns, head_row, lambda at, across: _mark(at, across, (row, column)))
    marked = [Line(one.number, "this-row" if one.number == row else one.mark, one.cells) for one in lines]
    return Extract(sheet.name, [letters(one - 1) for one in columns], marked)


def _lines(
    sheet: Sheet, rows: list[int], columns: list[int], head_row: int, mark: Callable[[int, int], str]
) -> list[Line]:
    """The cells of these rows and columns, with a line of its own wherever rows are left out."""
    lines: list[Line] = []
    for number in rows:
        if lines and number > lines[-1].number + 1:
            lines.append(Line(0, "gap-row", []))
        held = sheet.rows[number - 1] if number <= len(sheet.rows) else []
        cells = [Cell(cell_text(held[one - 1]) if one <= len(held) else "", mark(number, one)) for one in columns]
        is_head = number < head_row + HEADER_ROWS and not any(_is_number(cell.text) for cell in cells)
        lines.append(Line(number, "head-row" if is_head else "", cells))
    return lines


def _is_number(text: str) -> bool:
    """True for a reported number, with or without a qualifier."""
    return re.fullmatch(r"[<>~]?\s*[+-]?(\d+([.,]\d*)*|[.,]\d+)", text) is not None


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
    corners = corners_of(table.cell_range)
    return corners[0] if corners else (1, 1)


def corners_of(cell_range: str) -> tuple[tuple[int, int], tuple[int, int]] | None:
    """``B5:C9`` as ((5, 2), (9, 3)), a single cell as itself twice; None for what is no range."""
    found = re.fullmatch(r"([A-Z]{1,3})(\d{1,7})(?::([A-Z]{1,3})(\d{1,7}))?", cell_range)
    if not found:
        return None
    first = (int(found[2]), _column(found[1]))
    return first, (int(found[4]), _column(found[3])) if found[3] else first


def _column(name: str) -> int:
    """Column number, from 1, of its letters."""
    number = 0
    for letter in name:
        number = number * 26 + ord(letter) - 64
    return number
