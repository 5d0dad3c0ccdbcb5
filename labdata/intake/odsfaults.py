"""What a fast reader leaves out of an OpenDocument spreadsheet: error cells, and which cells show percent."""

import re
import zipfile
from typing import TYPE_CHECKING
from xml.etree import ElementTree

if TYPE_CHECKING:
    from labdata.intake.workbook import Sheet

_TABLE = "{urn:oasis:names:tc:opendocument:xmlns:table:1.0}"
_TEXT = "{urn:oasis:names:tc:opendocument:xmlns:text:1.0}"
_OFFICE = "{urn:oasis:names:tc:opendocument:xmlns:office:1.0}"
_MOST = 1000  # repeated cells beyond are no results
_CALC = "{urn:org:documentfoundation:names:experimental:calc:xmlns:calcext:1.0}"


_REPEATED = re.compile(rb'-repeated="\d{4,}"')


def extent(xml: bytes) -> tuple[int, int, int]:
    """(rows, columns, cells written) of the widest sheet; (0, 0, 0) where nothing is repeated often."""
    if not _REPEATED.search(xml):
        return 0, 0, 0
    widest = (0, 0, 0)
    for table in ElementTree.fromstring(xml).iter(f"{_TABLE}table"):
        row = rows = columns = written = 0
        for line in table.iter(f"{_TABLE}table-row"):
            row += int(line.get(f"{_TABLE}number-rows-repeated", "1"))
            column = 0
            for cell in line:
                column += int(cell.get(f"{_TABLE}number-columns-repeated", "1"))
                if cell.get(f"{_OFFICE}value-type") or len(cell):
                    rows, columns, written = max(rows, row), max(columns, column), written + 1
        widest = max(widest, (rows, columns, written))
    return widest


def add_faults(archive: zipfile.ZipFile, sheets: "list[Sheet]") -> None:
    """Fill ``faults`` and ``percent`` of the sheets from the document's XML."""
    xml = archive.read("content.xml")
    if b'value-type="error"' not in xml and b'value-type="percentage"' not in xml:
        return
    by_name = {sheet.name: sheet for sheet in sheets}
    for table in ElementTree.fromstring(xml).iter(f"{_TABLE}table"):
        sheet = by_name.get(table.get(f"{_TABLE}name", ""))
        if sheet is not None:
            _table_faults(table, sheet)


def _table_faults(table: ElementTree.Element, sheet: "Sheet") -> None:
    row = 0
    for line in table.iter(f"{_TABLE}table-row"):
        column = 0
        for cell in line:
            if cell.get(f"{_CALC}value-type") == "error":
                paragraph = cell.find(f"{_TEXT}p")
                sheet.faults[row, column] = (paragraph.text if paragraph is not None else "") or "#error"
            across = int(cell.get(f"{_TABLE}number-columns-repeated", "1"))
            if cell.get(f"{_OFFICE}value-type") == "percentage":
                down = int(line.get(f"{_TABLE}number-rows-repeated", "1"))
                sheet.percent |= {
                    (row + r, column + c) for r in range(min(down, _MOST)) for c in range(min(across, _MOST))
                }
            column += int(cell.get(f"{_TABLE}number-columns-repeated", "1"))
        row += int(line.get(f"{_TABLE}number-rows-repeated", "1"))
