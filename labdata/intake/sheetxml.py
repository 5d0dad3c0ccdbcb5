"""What a fast reader leaves out of an .xlsx sheet: number formats, error cells and formulas without a stored result."""

import re
import zipfile
from typing import TYPE_CHECKING
from xml.etree import ElementTree

if TYPE_CHECKING:
    from labdata.intake.workbook import Sheet

_MAIN = "{http://schemas.openxmlformats.org/spreadsheetml/2006/main}"
_REL = "{http://schemas.openxmlformats.org/officeDocument/2006/relationships}"
_STYLED = re.compile(rb'<c r="([A-Z]+)\d+" s="(\d+)"(?! t="s")')
_STYLED_ROW = re.compile(rb'<c r="[A-Z]+(\d+)" s="(\d+)"(?! t="s")')
_CELL = re.compile(rb'<c r="([A-Z]+)(\d+)"([^>]*?)(?:/>|>(.*?)</c>)', re.S)
_STORED = re.compile(rb"<v>(.*?)</v>|<is>", re.S)
_BUILT_IN = {
    1: "0",
    2: "0.00",
    3: "#,##0",
    4: "#,##0.00",
    9: "0%",
    10: "0.00%",
    11: "0.00E+00",
    39: "#,##0.00",
    40: "#,##0.00",
}
_MAX_STYLES = 4096
ROWS_BY_ROW = 400  # sheets up to so many rows may hold a sample a column, so formats are told by row too


_FAR_COLUMN = re.compile(rb"""r=["'][A-Z]{3}\d""")
_FAR_ROW = re.compile(rb"""r=["'][A-Z]{0,3}\d{6}""")
_ADDRESS = re.compile(rb"""r=["']([A-Z]{0,3})(\d{1,7})["']""")


def extent(xml: bytes) -> tuple[int, int, int]:
    """(rows, columns, addresses) that a sheet's cells span; (0, 0, 0) for one that stays near its corner.

    The fast reader holds the whole rectangle, so one cell in the last corner of a sheet would be enough to fill any memory.
    """
    if not _FAR_COLUMN.search(xml) and not _FAR_ROW.search(xml):
        return 0, 0, 0
    found = _ADDRESS.findall(xml)
    rows = max(int(row) for _, row in found) if found else 0
    columns = max((_index(name) + 1 for name in {name for name, _ in found} if name), default=1)
    return rows, columns, len(found)


def add_formats(archive: zipfile.ZipFile, sheets: "list[Sheet]") -> None:
    """Fill ``formats``, ``percent`` and ``faults`` of the sheets from the workbook's XML."""
    styles = _number_formats(archive)
    paths = _sheet_paths(archive)
    for sheet in sheets:
        if path := paths.get(sheet.name):
            xml = archive.read(path)
            _formats(sheet, xml, styles)
            if len(sheet.rows) <= ROWS_BY_ROW:
                _row_formats(sheet, xml, styles)
            if b't="e"' in xml or b"<f" in xml:
                _faults(sheet, xml)


def _number_formats(archive: zipfile.ZipFile) -> list[str]:
    """Style index -> number format code."""
    if "xl/styles.xml" not in archive.namelist():
        return []
    root = ElementTree.fromstring(archive.read("xl/styles.xml"))
    own = {int(node.get("numFmtId", "0")): node.get("formatCode", "") for node in root.iter(f"{_MAIN}numFmt")}
    cells = root.find(f"{_MAIN}cellXfs")
    ids = [int(node.get("numFmtId", "0")) for node in cells] if cells is not None else []
    return [own.get(number, _BUILT_IN.get(number, "")) for number in ids[:_MAX_STYLES]]


def _sheet_paths(archive: zipfile.ZipFile) -> dict[str, str]:
    """Sheet name -> path of its XML in the archive."""
    rels = ElementTree.fromstring(archive.read("xl/_rels/workbook.xml.rels"))
    targets = {node.get("Id", ""): node.get("Target", "") for node in rels}
    book = ElementTree.fromstring(archive.read("xl/workbook.xml"))
    paths = {}
    for node in book.iter(f"{_MAIN}sheet"):
        target = targets.get(node.get(f"{_REL}id", ""), "")
        path = target.lstrip("/") if target.startswith("/") else f"xl/{target}"
        if path in archive.namelist():
            paths[node.get("name", "")] = path
    return paths


def _index(name: bytes) -> int:
    number = 0
    for letter in name:
        number = number * 26 + letter - 64
    return number - 1


def _formats(sheet: "Sheet", xml: bytes, styles: list[str]) -> None:
    for column, style in set(_STYLED.findall(xml)):
        _note_decimals(_index(column), _code(styles, style), sheet.formats)
    percent = [str(at) for at, code in enumerate(styles) if "%" in re.sub(r'"[^"]*"|\\.', "", code)]
    if percent:
        cells = rf'<c r="([A-Z]+)(\d+)" s="(?:{"|".join(percent)})"(?! t="s")'.encode()
        sheet.percent |= {(int(row) - 1, _index(column)) for column, row in re.findall(cells, xml)}


def _row_formats(sheet: "Sheet", xml: bytes, styles: list[str]) -> None:
    for row, style in set(_STYLED_ROW.findall(xml)):
        _note_decimals(int(row) - 1, _code(styles, style), sheet.row_formats)


def _code(styles: list[str], style: bytes) -> str:
    return styles[int(style)] if int(style) < len(styles) else ""


def _note_decimals(index: int, code: str, decimals: dict[int, int]) -> None:
    if shown := re.search(r"0\.(0+)", code):
        decimals[index] = max(decimals.get(index, 0), len(shown.group(1)))


def _faults(sheet: "Sheet", xml: bytes) -> None:
    for column, row, attributes, inside in _CELL.findall(xml):
        stored = _STORED.search(inside)
        text = stored.group(1) if stored else None
        if b't="e"' in attributes:
            sheet.faults[int(row) - 1, _index(column)] = (text or b"#error").decode()
        elif b"<f" in inside and not text and not (stored and b't="str"' in attributes):
            sheet.faults[int(row) - 1, _index(column)] = "formula without a stored result"
