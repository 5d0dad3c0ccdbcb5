"""An empty workbook per method, for laboratories that ask what we would like to receive.

A filled-in one comes back through intake with nothing asked: every header and unit is one that the synonym table knows.
"""

import io
import re
from collections.abc import Sequence

from openpyxl import Workbook
from openpyxl.comments import Comment
from openpyxl.styles import Alignment, Border, Font, PatternFill, Side
from openpyxl.utils import get_column_letter
from openpyxl.worksheet.datavalidation import DataValidation
from openpyxl.worksheet.worksheet import Worksheet

from labdata.errors import NotFound
from labdata.intake import units
from labdata.intake.fields import catalogue, field_types
from labdata.models import SampleKind

TITLE = ("Laboratory", "Report number", "Report version", "Report date")
NOTES = (
    "One row a sample or repeat. Leave a cell empty where nothing was measured; write <0.05 where less than 0.05 was found.",
    "Units may be chosen in the row below the header; they hold for their whole column. Columns that are not needed may go.",
    "Reference materials, blanks and repeats are welcome in the same rows: say so as the sample type.",
)
#: (header, width) of the columns that say which sample a row is of; the depths have a unit.
IDENTITY = (
    ("Well", 16), ("Sample", 14), ("Top depth", 11), ("Base depth", 11), ("Sample type", 14), ("Formation", 16),
    ("Replicate", 10), ("Lab number", 12),
)  # fmt: skip
DEPTHS = ("Top depth", "Base depth")
#: Methods whose list of analytes is longer than a laboratory fills in: what is asked for unless more is wanted.
CHOSEN = {
    "elements": (
        "SIO2", "TIO2", "AL2O3", "FE2O3", "MNO", "MGO", "CAO", "NA2O", "K2O", "P2O5", "LOI", "AS", "BA", "CD", "CO", "CR",
        "CU", "MO", "NI", "PB", "RB", "SC", "SR", "TH", "U", "V", "Y", "ZN", "ZR",
    ),
    "minerals": (
        "QUARTZ", "K_FELDSPAR", "PLAGIOCLASE", "CALCITE", "DOLOMITE", "ANKERITE", "SIDERITE", "PYRITE", "MARCASITE", "GYPSUM",
        "ANHYDRITE", "BARITE", "HALITE", "APATITE", "ILLITE", "SMECTITE", "ILLITE_SMECTITE", "KAOLINITE", "CHLORITE", "MUSCOVITE",
    ),
}  # fmt: skip
ROLES = ("reference material", "blank", "duplicate")
LAST_ROW = 2000  # validation lists reach so far down
HEAD_ROW = len(TITLE) + len(NOTES) + 3
_BOLD, _SOFT = Font(bold=True), Font(color="4A5859")
_SHADE = PatternFill("solid", fgColor="E6ECE9")
_LINE = Border(bottom=Side(style="thin", color="74827F"))


def methods() -> list[tuple[str, str]]:
    """(code, name) of every method that has a template."""
    return [(code, entry["name"]) for code, entry in catalogue()["methods"].items()]


def analytes(method: str) -> list[str]:
    """Field codes of the method's template, in order; carbon stands beside the pyrolysis peaks."""
    if method in CHOSEN:
        return list(CHOSEN[method])
    codes = [code for code, kind in field_types().items() if kind.method == method]
    return ["TOC", *codes] if method == "pyrolysis" else codes


def build(method: str) -> bytes:
    """The bytes of the method's empty .xlsx. Raises NotFound, naming the methods there are."""
    names = dict(methods())
    if method not in names:
        raise NotFound(f"There is no method «{method}».", remedy=f"Methods: {', '.join(names)}.", method=method)
    book = Workbook()
    sheet = book.create_sheet("Results", 0)
    del book[book.sheetnames[1]]
    _title(sheet, names[method])
    codes = analytes(method)
    _head(sheet, codes)
    _lists(sheet, codes)
    sheet.freeze_panes = sheet.cell(HEAD_ROW + 2, 3)
    stream = io.BytesIO()
    book.save(stream)
    return stream.getvalue()


def header(code: str) -> str:
    """How the template heads a field: a symbol, a formula, a mineral's name, else the code."""
    entry = catalogue()["analytes"][code]
    if entry["method"] == "elements":
        return code if code == "LOI" else _formula(code)
    if entry["method"] in {"minerals", "macerals"}:
        return str(entry["name"]).capitalize()
    return code.replace("_", " ")


def _formula(code: str) -> str:
    """``AL2O3`` as ``Al2O3``, ``MO`` as ``Mo``: O follows the metal of an oxide, a lone symbol is an element."""
    oxide = re.fullmatch(r"([A-Z]{1,2}?)(\d?)(O)(\d?)", code)
    if oxide and oxide[1] and len(code) > 2:
        return oxide[1].capitalize() + oxide[2] + oxide[3] + oxide[4]
    return code.capitalize()


def _title(sheet: Worksheet, name: str) -> None:
    sheet.cell(1, 1, name.capitalize()).font = Font(bold=True, size=14)
    for row, text in enumerate(TITLE, start=2):
        sheet.cell(row, 1, text).font = _BOLD
        sheet.cell(row, 2).border = _LINE
    for row, text in enumerate(NOTES, start=2 + len(TITLE)):
        sheet.cell(row, 1, text).font = _SOFT


def _head(sheet: Worksheet, codes: Sequence[str]) -> None:
    """The header and the row of units below it."""
    for column, (text, width) in enumerate(IDENTITY, start=1):
        _head_cell(sheet, column, text, "m" if text in DEPTHS else "", width)
    for column, code in enumerate(codes, start=1 + len(IDENTITY)):
        kind, entry = field_types()[code], catalogue()["analytes"][code]
        _head_cell(sheet, column, header(code), kind.unit, max(9, len(header(code)) + 3))
        note = Comment(f"{code}: {entry['name']}, in {kind.unit} unless another unit is chosen below.", "Kerogate")
        sheet.cell(HEAD_ROW, column).comment = note
    _head_cell(sheet, 1 + len(IDENTITY) + len(codes), "Remarks", "", 28)


def _head_cell(sheet: Worksheet, column: int, text: str, unit: str, width: int) -> None:
    for row, said in ((HEAD_ROW, text), (HEAD_ROW + 1, unit)):
        cell = sheet.cell(row, column, said or None)
        cell.fill, cell.font = _SHADE, _BOLD if row == HEAD_ROW else _SOFT
        cell.alignment = Alignment(horizontal="center", vertical="center", wrap_text=True)
    sheet.cell(HEAD_ROW + 1, column).border = _LINE
    sheet.column_dimensions[get_column_letter(column)].width = width


def _lists(sheet: Worksheet, codes: Sequence[str]) -> None:
    """What may be chosen: units of each column, sample types."""
    kinds = [kind.label for kind in SampleKind if kind != SampleKind.UNKNOWN]
    place = [text for text, _ in IDENTITY].index("Sample type") + 1
    _list(sheet, [*kinds, *ROLES], f"{_at(HEAD_ROW + 2, place)}:{_at(LAST_ROW, place)}")
    for column, text in enumerate([text for text, _ in IDENTITY], start=1):
        if text in DEPTHS:
            _list(sheet, units.convertible("m"), _at(HEAD_ROW + 1, column))
    for column, code in enumerate(codes, start=1 + len(IDENTITY)):
        _list(sheet, units.convertible(field_types()[code].unit), _at(HEAD_ROW + 1, column))


def _list(sheet: Worksheet, options: Sequence[str], cells: str) -> None:
    rule = DataValidation(type="list", formula1=f'"{",".join(options)}"', allow_blank=True, showErrorMessage=True)
    rule.error, rule.errorTitle = f"Choose one of: {', '.join(options)}", "Not in the list"
    sheet.add_data_validation(rule)
    rule.add(cells)


def _at(row: int, column: int) -> str:
    return f"{get_column_letter(column)}{row}"
