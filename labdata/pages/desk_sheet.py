"""What the mapping desk shows of a file: one sheet as a grid with its tables marked, and every table's columns."""

from collections.abc import Iterable
from dataclasses import dataclass, field
from functools import cache
from typing import Any

from django.utils.html import format_html_join
from django.utils.safestring import SafeString

from labdata.intake.corrections import FIELD, HEADER, LEAVE_OUT, UNIT, canonical_unit, unit_options
from labdata.intake.fields import IDENTITY, catalogue, field_types
from labdata.intake.findings import place_name
from labdata.intake.tables import MAX_HEADER_ROWS, looks_numeric
from labdata.intake.workbook import Sheet, Workbook, cell_text, letters
from labdata.pages.sheet_extract import corners_of

WINDOW = 100  # rows of the sheet that are shown at once, beside those that findings speak of
MOST_FINDINGS = 40
MOST_COLUMNS = 60
IDENTITY_WORDS = {
    "WELL": "well", "WELL_ALIAS": "other name of the well", "UWI": "well identifier", "SAMPLE": "sample", "TOP": "depth, or its top",
    "BASE": "base depth", "KIND": "sample type", "FORMATION": "formation", "REPLICATE": "replicate", "LAB_NO": "laboratory's number",
    "REMARK": "remark", "PREPARATION": "preparation", "DEPTH_UNIT": "unit of the depth", "LAB": "laboratory",
}  # fmt: skip


@dataclass(frozen=True)
class Cell:
    """One cell of the grid. ``mapping`` is the number of its column's row in the mapping, "" outside the header."""

    address: str
    text: str
    mark: str
    mapping: str = ""


@dataclass(frozen=True)
class Line:
    """One row of the grid; ``number`` 0 stands for rows left out, or for the line that says how columns are read."""

    number: int
    mark: str
    cells: list[Cell] = field(default_factory=list)


@dataclass(frozen=True)
class Grid:
    """The part of a sheet that is shown: rows ``first`` to ``last`` of ``total``, and rows of findings outside."""

    letters: list[str]
    lines: list[Line]
    first: int
    last: int
    total: int

    @property
    def before(self) -> int:
        return max(1, self.first - WINDOW) if self.first > 1 else 0

    @property
    def after(self) -> int:
        return self.last + 1 if self.last < self.total else 0


@dataclass(frozen=True)
class MappedColumn:
    """One column of a table: where its header stands, what it is read as, what a person has said."""

    number: str
    cell: str
    letter: str
    header: str
    field: str
    unit: str
    confidence: float | None
    reason: str
    field_name: str
    unit_name: str
    said_field: str
    said_unit: str
    units: list[str]

    @property
    def words(self) -> str:
        return field_words(self.field) if self.field else ""

    @property
    def said_words(self) -> str:
        return LEAVE_OUT if self.said_field == LEAVE_OUT else field_words(self.said_field)


@dataclass(frozen=True)
class MappedTable:
    """One recognised table. ``turned``: samples run along the columns; ``fixed``: read by its names alone, as records are."""

    sheet: str
    range: str
    kind: str
    turned: bool
    fixed: bool
    columns: list[MappedColumn]


@dataclass(frozen=True)
class SheetTab:
    """One sheet of the file and its header rows: as recognised, as a person says, and where they may be if neither."""

    number: int
    name: str
    current: bool
    recognised: str
    header_name: str
    said: str
    likely: str
    findings: int


def field_words(code: str) -> str:
    """``TOC, total organic carbon``."""
    entry = catalogue()["analytes"].get(code)
    words = entry["name"] if entry else IDENTITY_WORDS.get(code, code.replace("_", " ").lower())
    return f"{code}, {words}"


@cache
def field_choices() -> SafeString:
    """Every field as options of a list, grouped by method; rendered once, since each column of a file has the list."""
    groups = [("The sample", [code for code in IDENTITY if code in field_types()])]
    for method, entry in catalogue()["methods"].items():
        groups.append((entry["name"], [code for code, kind in field_types().items() if kind.method == method]))
    made = [
        (
            name.capitalize(),
            format_html_join("", '<option value="{}">{}</option>', ((c, field_words(c)) for c in codes)),
        )
        for name, codes in groups
    ]
    return format_html_join("", '<optgroup label="{}">{}</optgroup>', made)


def tabs(book: Workbook, entry: dict[str, Any], answers: dict[str, str], current: int) -> list[SheetTab]:
    """A tab for each sheet of the file."""
    made = []
    for number, sheet in enumerate(book.sheets):
        tables = [table for table in entry["tables"] if table["sheet"] == sheet.name]
        rows = [table.get("header_rows") or [] for table in tables if table.get("orientation") != "columns"]
        made.append(SheetTab(
            number, sheet.name or "the file", number == current, ", ".join(_span(*pair) for pair in rows if pair),
            HEADER + sheet.name, answers.get(HEADER + sheet.name, ""), "" if tables else likely_header(sheet),
            sum(1 for one in entry["findings"] if one["sheet"] == sheet.name and one["level"] in {"error", "question"}),
        ))  # fmt: skip
    return made


def likely_header(sheet: Sheet) -> str:
    """The rows of text above the first two rows with several numbers, such as "4-5"; "" where there are none."""
    for row in range(1, min(len(sheet.rows) - 1, WINDOW)):
        if all(_numbers(sheet, at) >= 2 for at in (row, row + 1)):
            first = row
            while first > 0 and row - first < MAX_HEADER_ROWS and _words(sheet, first - 1) >= 2:
                first -= 1
            return _span(first + 1, row) if first < row else ""
    return ""


def _numbers(sheet: Sheet, row: int) -> int:
    return sum(1 for cell in sheet.rows[row] if cell_text(cell) and looks_numeric(cell))


def _words(sheet: Sheet, row: int) -> int:
    """How many cells of text a row of nothing else has."""
    texts = [cell for cell in sheet.rows[row] if cell_text(cell)]
    return 0 if any(looks_numeric(cell) for cell in texts) else len(texts)


def _span(first: int, last: int) -> str:
    return str(first) if first == last else f"{first}-{last}"


def mapped_tables(book: Workbook, entry: dict[str, Any], answers: dict[str, str]) -> list[MappedTable]:
    """Every table of the file with all columns of its range, mapped or not, in order."""
    sheets = {sheet.name: sheet for sheet in book.sheets}
    made = []
    for number, table in enumerate(entry["tables"]):
        corners, sheet = corners_of(table["range"]), sheets.get(table["sheet"])
        if corners is None or sheet is None:
            continue
        turned = table.get("orientation") == "columns"
        reader = _TableReader(number, table, sheet, corners, answers, turned)
        made.append(
            MappedTable(
                table["sheet"], table["range"], table["kind"], turned, not table.get("header_rows"), reader.columns()
            )
        )
    return made


@dataclass(frozen=True)
class _TableReader:
    """Lists the columns (rows of the file, where samples run along the columns) of one recognised table."""

    number: int
    table: dict[str, Any]
    sheet: Sheet
    corners: tuple[tuple[int, int], tuple[int, int]]
    answers: dict[str, str]
    turned: bool

    def columns(self) -> list[MappedColumn]:
        (top, left), (bottom, right) = self.corners
        first, last = (top, bottom) if self.turned else (left, right)
        known = {one["column"]: one for one in self.table["columns"]}
        found = []
        for line in range(first, last + 1 + (not self.turned) * self._headless(right)):
            column = self._column(line, known.get(str(line) if self.turned else letters(line - 1), {}))
            if column.header or column.field or self._filled(line):
                found.append(column)
        return found

    def _headless(self, right: int) -> int:
        """How many filled columns without a header stand right of the table."""
        extra = 0
        while right + extra < MOST_COLUMNS and self._filled(right + extra + 1) and not self._header(right + extra + 1):
            extra += 1
        return extra

    def _head_lines(self) -> tuple[int, int]:
        (top, left), _ = self.corners
        rows = self.table.get("header_rows") or []
        start = left if self.turned else top
        return (rows[0], rows[1]) if rows else (start, start)

    def _text(self, line: int, across: int) -> str:
        row, column = (line, across) if self.turned else (across, line)
        return text_at(self.sheet, row, column)

    def _header(self, line: int) -> str:
        first, last = self._head_lines()
        return " ".join(dict.fromkeys(text for at in range(first, last + 1) if (text := self._text(line, at))))

    def _filled(self, line: int) -> bool:
        (top, left), (bottom, right) = self.corners
        start, stop = (left, right) if self.turned else (top, bottom)
        return any(self._text(line, at) for at in range(start, min(stop, start + WINDOW) + 1))

    def _column(self, line: int, known: dict[str, Any]) -> MappedColumn:
        across = self._head_lines()[1]
        cell = f"{letters(across - 1)}{line}" if self.turned else f"{letters(line - 1)}{across}"
        place = place_name(self.table["sheet"], cell)
        said_field, said_unit = self.answers.get(FIELD + place, ""), self.answers.get(UNIT + place, "")
        code = known.get("field", "")
        return MappedColumn(
            f"{self.number}-{line}", cell, str(line) if self.turned else letters(line - 1),
            known.get("header") or self._header(line), code, known.get("unit", ""), known.get("confidence"),
            known.get("reason", ""), FIELD + place, UNIT + place, said_field, said_unit,
            unit_options(code) if canonical_unit(code) else [],
        )  # fmt: skip


def grid(sheet: Sheet, tables: Iterable[MappedTable], entry: dict[str, Any], first: int) -> Grid:
    """Rows from ``first`` on, with recognised tables, columns and findings marked."""
    total = len(sheet.rows)
    first = min(max(1, first), max(1, total))
    last = min(total, first + WINDOW - 1)
    own = [table for table in tables if table.sheet == sheet.name]
    marks = _finding_marks(sheet.name, entry["findings"])
    near = {row for row, _ in list(marks)[:MOST_FINDINGS] if row <= total}
    rows = sorted({*range(first, last + 1), *near} if total else set())
    width = min(MOST_COLUMNS, max((len(sheet.rows[row - 1]) for row in rows), default=0))
    marker = _Marker(own, marks, {(t["sheet"], t["range"]): t.get("header_rows") or [] for t in entry["tables"]})
    lines: list[Line] = []
    for row in rows:
        if lines and row > lines[-1].number + 1:
            lines.append(Line(0, "gap-row"))
        lines += marker.read_as(row, width)
        lines.append(Line(row, "", [marker.cell(sheet, row, column) for column in range(1, width + 1)]))
    return Grid([letters(column) for column in range(width)], lines, first, last, total)


@dataclass(frozen=True)
class _Marker:
    tables: list[MappedTable]
    findings: dict[tuple[int, int], str]
    header_rows: dict[tuple[str, str], list[int]]

    def read_as(self, row: int, width: int) -> list[Line]:
        """The line above a table's header that says what each column is read as."""
        for table in self.tables:
            corners = corners_of(table.range)
            if table.turned or corners is None or corners[0][0] != row:
                continue
            said = {column.letter: column for column in self._beside(table, row)}
            cells = [Cell("", *_said(said.get(letters(column)))) for column in range(width)]
            return [Line(0, "read-as", cells)]
        return []

    def _beside(self, table: MappedTable, row: int) -> list[MappedColumn]:
        """Columns of this table and of those that begin in the same row."""
        return [
            column for one in self.tables for column in one.columns
            if one is table or ((c := corners_of(one.range)) and c[0][0] == row and not one.turned)
        ]  # fmt: skip

    def cell(self, sheet: Sheet, row: int, column: int) -> Cell:
        name = f"{letters(column - 1)}{row}"
        marks = [self.findings.get((row, column), "")]
        mapping = ""
        for table in self.tables:
            corners = corners_of(table.range)
            if corners is None or not _inside(row, column, corners):
                continue
            line, across = (row, column) if table.turned else (column, row)
            rows = self.header_rows.get((table.sheet, table.range)) or [0, 0]
            own = next((one for one in table.columns if one.number.endswith(f"-{line}")), None)
            in_head = rows[0] <= across <= rows[1]
            marks.append("in-head" if in_head else "in-table")
            marks.append("is-left" if own is None or not own.field else "")
            mapping = own.number if in_head and own else ""
        return Cell(name, text_at(sheet, row, column), " ".join(mark for mark in marks if mark), mapping)


def _said(column: MappedColumn | None) -> tuple[str, str, str]:
    """(text, mark, mapping row) of a column's place in the line that says what it is read as."""
    if column is None:
        return "", "", ""
    if not column.field:
        return "left out", "not-read", column.number
    return f"{column.field} {column.unit}".strip(), "is-said" if column.said_field else "", column.number


def _finding_marks(sheet: str, findings: list[dict[str, Any]]) -> dict[tuple[int, int], str]:
    """Cell -> the mark of the gravest finding about it."""
    marks: dict[tuple[int, int], str] = {}
    for one in findings:
        corner = corners_of(one["cell"]) if one["cell"] and one["sheet"] == sheet else None
        if corner:
            marks.setdefault(corner[0], f"found-{one['level']}")
    return marks


def _inside(row: int, column: int, corners: tuple[tuple[int, int], tuple[int, int]]) -> bool:
    (top, left), (bottom, right) = corners
    return top <= row <= bottom and left <= column <= right


def text_at(sheet: Sheet, row: int, column: int) -> str:
    """The text of a cell, row and column counted from 1; "" outside the sheet."""
    held = sheet.rows[row - 1] if 0 < row <= len(sheet.rows) else []
    return cell_text(held[column - 1]) if 0 < column <= len(held) else ""
