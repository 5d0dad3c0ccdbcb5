"""Drawing a report as a spreadsheet the way laboratories do: title block, merged headers, units, notes.

Written with xlsxwriter and a fixed creation date, so that the same content gives the same bytes.
"""

import io
from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime

import pandas as pd
import xlsxwriter
from xlsxwriter.format import Format
from xlsxwriter.worksheet import Worksheet

CREATED = datetime(2026, 3, 2, 9, 0, 0)


@dataclass(frozen=True)
class Column:
    """One column of a report: where its cells come from, the header, the unit below it, decimals, the group above it."""

    source: str
    header: str
    unit: str = ""
    decimals: int | None = None
    group: str = ""


@dataclass(frozen=True)
class Sheet:
    """One sheet: title lines, the table, the notes under it. ``units_row`` puts units on a row of their own."""

    name: str
    title: Sequence[tuple[str, str]]
    columns: Sequence[Column]
    table: pd.DataFrame
    notes: Sequence[str] = ()
    units_row: bool = True


def workbook(sheets: Sequence[Sheet], author: str) -> bytes:
    """The bytes of an .xlsx file with these sheets."""
    stream = io.BytesIO()
    book = xlsxwriter.Workbook(stream, {"in_memory": True})
    book.set_properties({"author": author, "created": CREATED})
    for sheet in sheets:
        _draw(book, book.add_worksheet(sheet.name), sheet)
    book.close()
    return stream.getvalue()


def _draw(book: xlsxwriter.Workbook, page: Worksheet, sheet: Sheet) -> None:
    bold = book.add_format({"bold": True})
    last = len(sheet.columns) - 1
    page.merge_range(0, 0, 0, last, sheet.title[0][1], book.add_format({"bold": True, "font_size": 14}))
    for row, (label, text) in enumerate(sheet.title[1:], start=1):
        if label:
            page.write_string(row, 0, label, bold)
        page.write_string(row, 2 if label else 0, text)
    row = _header(book, page, sheet, len(sheet.title) + 1)
    _body(book, page, sheet, row)
    for position, note in enumerate(sheet.notes):
        page.write_string(row + len(sheet.table) + 1 + position, 0, note)
    page.set_column(0, last, 11)
    page.freeze_panes(row, 0)


def _header(book: xlsxwriter.Workbook, page: Worksheet, sheet: Sheet, row: int) -> int:
    """Draw groups, headers and units; returns the first row of the table's body."""
    style = book.add_format({"bold": True, "align": "center", "bottom": 1, "text_wrap": True})
    if any(column.group for column in sheet.columns):
        _groups(page, sheet, row, style)
        row += 1
    for position, column in enumerate(sheet.columns):
        unit = f" ({column.unit})" if column.unit and not sheet.units_row else ""
        page.write_string(row, position, column.header + unit, style)
    if sheet.units_row:
        row += 1
        italic = book.add_format({"italic": True, "align": "center"})
        for position, column in enumerate(sheet.columns):
            if column.unit:
                page.write_string(row, position, column.unit, italic)
    return row + 1


def _groups(page: Worksheet, sheet: Sheet, row: int, style: Format) -> None:
    """Write each group over its columns, merged where it has more than one."""
    names = [column.group for column in sheet.columns]
    start = 0
    while start < len(names):
        end = start
        while end + 1 < len(names) and names[end + 1] == names[start]:
            end += 1
        if names[start] and end > start:
            page.merge_range(row, start, row, end, names[start], style)
        elif names[start]:
            page.write_string(row, start, names[start], style)
        start = end + 1


def _body(book: xlsxwriter.Workbook, page: Worksheet, sheet: Sheet, first: int) -> None:
    styles = {d: book.add_format({"num_format": "0" + ("." + "0" * d if d else "")}) for d in range(4)}
    for position, column in enumerate(sheet.columns):
        style = None if column.decimals is None else styles[column.decimals]
        for offset, cell in enumerate(sheet.table[column.source]):
            if isinstance(cell, str):
                page.write_string(first + offset, position, cell)
            elif cell is not None:
                page.write_number(first + offset, position, float(cell), style)


def csv_text(lines: Sequence[str], columns: Sequence[Column], table: pd.DataFrame) -> bytes:
    """A comma-separated file: remark lines, one header row with units in brackets, then the cells as they print."""
    header = [column.header + (f" ({column.unit})" if column.unit else "") for column in columns]
    rows = [
        ",".join(_printed(cell, c.decimals) for cell, c in zip(cells, columns, strict=True))
        for cells in _rows(columns, table)
    ]
    return ("\r\n".join([*lines, ",".join(header), *rows]) + "\r\n").encode()


def _rows(columns: Sequence[Column], table: pd.DataFrame) -> list[tuple[object, ...]]:
    return list(table[[column.source for column in columns]].itertuples(index=False, name=None))


def _printed(cell: object, decimals: int | None) -> str:
    if cell is None:
        return ""
    if isinstance(cell, str):
        return f'"{cell}"' if "," in cell else cell
    return str(cell) if decimals is None else f"{float(str(cell)):.{decimals}f}"
