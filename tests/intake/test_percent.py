"""Cells that hold a fraction and show percent, in every kind of workbook, cell by cell."""

import io
import zipfile

import pytest
import xlwt

from labdata.models import Result
from tests.factories import ProjectFactory
from tests.intake.landing import cells_of, findings_of, land, workbook

pytestmark = pytest.mark.django_db
ROWS = [["Sample", "Depth (m)", "TOC (%)"], ["A", 10, 0.0125], ["B", 20, 0.0375], ["C", 30, 2.5]]
PERCENT = {(1, 2), (2, 2)}


def as_xlsx():
    def fill(book):
        for row in ROWS:
            book.active.append(row)
        for row, column in PERCENT:
            book.active.cell(row + 1, column + 1).number_format = "0.00%"

    return workbook(fill)


def as_xls():
    book = xlwt.Workbook()
    sheet = book.add_sheet("Sheet")
    shown = xlwt.easyxf(num_format_str="0.00%")
    for r, row in enumerate(ROWS):
        for c, value in enumerate(row):
            sheet.write(r, c, value, shown) if (r, c) in PERCENT else sheet.write(r, c, value)
    stream = io.BytesIO()
    book.save(stream)
    return stream.getvalue()


def as_ods():
    lines = []
    for r, row in enumerate(ROWS):
        cells = []
        for c, value in enumerate(row):
            if isinstance(value, str):
                cells.append(
                    f'<table:table-cell office:value-type="string"><text:p>{value}</text:p></table:table-cell>'
                )
            else:
                kind = "percentage" if (r, c) in PERCENT else "float"
                cells.append(
                    f'<table:table-cell office:value-type="{kind}" office:value="{value}"><text:p>{value}</text:p></table:table-cell>'
                )
        lines.append(f"<table:table-row>{''.join(cells)}</table:table-row>")
    spaces = " ".join(
        f'xmlns:{name}="urn:oasis:names:tc:opendocument:xmlns:{name}:1.0"' for name in ("office", "table", "text")
    )
    content = (
        f"<office:document-content {spaces}><office:body><office:spreadsheet>"
        f'<table:table table:name="Sheet">{"".join(lines)}</table:table></office:spreadsheet></office:body></office:document-content>'
    )
    stream = io.BytesIO()
    with zipfile.ZipFile(stream, "w") as archive:
        archive.writestr("mimetype", "application/vnd.oasis.opendocument.spreadsheet")
        archive.writestr("META-INF/manifest.xml", "<manifest/>")
        archive.writestr("content.xml", '<?xml version="1.0" encoding="UTF-8"?>' + content)
    return stream.getvalue()


@pytest.mark.parametrize("make", [as_xlsx, as_xls, as_ods])
def test_only_the_cells_that_show_percent_are_fractions(make):
    landed = land(ProjectFactory(), make(), "percent", well="Quill 1")
    values = {address: row["value"] for (_, address), row in cells_of(landed.report).items()}
    assert values == {"C2": pytest.approx(1.25), "C3": pytest.approx(3.75), "C4": 2.5}
    (warning,) = findings_of(landed.upload.answer, "warning")
    assert (warning["code"], warning["cells"]) == ("unit_in_cell", ["C2", "C3"])


def test_two_tables_of_one_column_may_differ():
    def fill(book):
        for row in (
            [*ROWS[0][:2], "TOC (%)"],
            ["A", 10, 0.0125],
            [],
            ["Sample", "Depth (m)", "Total sulfur (%)"],
            ["A", 10, 1.5],
        ):
            book.active.append(row)
        book.active["C2"].number_format = "0.00%"

    landed = land(ProjectFactory(), workbook(fill), "two.xlsx", well="Quill 1")
    found = dict(Result.objects.filter(analysis__report=landed.report).values_list("analyte__code", "value"))
    assert found == {"TOC": pytest.approx(1.25), "TS": 1.5}
