"""Where tables stand: title blocks, headers of several rows, units rows, several tables and sheets, every file kind."""

import io
import zipfile

import pytest
import xlwt
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from labdata.intake.findings import Findings
from labdata.intake.preparing import _take_table
from labdata.intake.tables import find_tables
from labdata.intake.titles import Facts, split_file_name
from labdata.intake.workbook import Sheet, read
from labdata.models import Analysis, ReferenceMaterial, Result, Sample
from tests.factories import ProjectFactory
from tests.intake.landing import cells_of, entry, findings_of, land, workbook

ROWS = [["Sample", "Depth (m)", "TOC (wt%)", "S2 (mg/g)"], ["A", 1000, 1.25, "<0.05"], ["B", 1010.5, 0.9, 3]]


def laboratory_report(book):
    """A report as laboratories send it: title, merged group headings, units row, n.d., a standard, notes."""
    sheet = book.active
    sheet.title = "Pyrolysis"
    for row in (
        ["Brackwater Geochemistry"], ["Report No.", "BG-24-017", "", "Date", "12 March 2024"], ["Well: Quill 7"],
        ["All depths in feet"], [],
        ["Sample", "Depth", "", "Type", "Carbon", "", "Pyrolysis", "", "", "", "Reflectance", "", ""],
        ["", "Top", "Base", "", "TOC", "Carb", "S1", "S2", "S3", "Tmax", "Mean", "SD", "N"],
        ["", "", "", "", "wt%", "wt%", "mg/g", "mg/g", "mg/g", "°C", "%", "%", ""],
        ["Q1", 10000, 10010, "DC", 1.25, 12, 0.1, 2.2, 0.4, 435, 0.55, 0.05, 25],
        ["Q2", 10010, 10020, "Ditch cuttings", 1.35, "<1", 0.1, 2.2, "n.d.", 436, None, None, None],
        [], ["QC Standard A", None, None, None, 2.5, None, 0.1, 10.1, 0.3, 420],
        ["n.d. = not determined"], ["Approved by: A. Person"],
    ):  # fmt: skip
        sheet.append(row)
    for cells in ("B6:C6", "E6:F6", "G6:J6", "K6:M6"):
        sheet.merge_cells(cells)
    elements = book.create_sheet("XRF")
    for row in (
        ["Well: Quill 7"],
        ["Depth (ft)", "SiO2 (%)", "Mo (ppm)", "V ppm"],
        [10000, 55.5, 12, 100],
        [10010, 51.5, "<1", 90],
    ):
        elements.append(row)
    book.create_sheet("Scratch").sheet_state = "hidden"


@pytest.mark.django_db
def test_a_whole_laboratory_report():
    landed = land(ProjectFactory(), workbook(laboratory_report), "report.xlsx", lab="")
    answer = landed.upload.answer
    assert (answer["report"], str(landed.report.reported_on)) == ("BG-24-017", "2024-03-12")
    assert [table["range"] for table in answer["tables"]] == ["A6:M12", "A2:D4"]
    fields = [column["field"] for column in answer["tables"][0]["columns"]]
    assert fields == ["SAMPLE", "TOP", "BASE", "KIND", "TOC", "CARB", "S1", "S2", "S3", "TMAX", "RO", "RO_SD", "RO_N"]
    stored = cells_of(landed.report)
    assert stored["Pyrolysis", "E9"]["value"] == 1.25
    assert ("Pyrolysis", "I10") not in stored  # n.d. stands for not determined, as the notes say
    assert (stored["XRF", "C4"]["qualifier"], stored["XRF", "C4"]["value"]) == ("<", 1.0)
    assert {finding["code"] for finding in answer["findings"]} == {"hidden_sheet", "not_determined"}


@pytest.mark.django_db
def test_samples_of_two_sheets_meet_and_the_standard_is_none():
    land(ProjectFactory(), workbook(laboratory_report), "report.xlsx")
    assert list(Sample.objects.values_list("label", "kind", "depth_unit_reported")) == [
        ("Q1", "cuttings", "ft"),
        ("Q2", "cuttings", "ft"),
    ]
    assert ReferenceMaterial.objects.get().name == "QC Standard A"
    assert sorted(Analysis.objects.values_list("method__code", flat=True)) == [
        "elements",
        "elements",
        "pyrolysis",
        "pyrolysis",
        "pyrolysis",
        "reflectance",
    ]
    assert Analysis.objects.get(role="reference").sample is None


def as_xls(rows):
    book = xlwt.Workbook()
    sheet = book.add_sheet("Data")
    for r, row in enumerate(rows):
        for c, cell in enumerate(row):
            sheet.write(r, c, cell)
    stream = io.BytesIO()
    book.save(stream)
    return stream.getvalue()


def as_xlsx(rows):
    return workbook(lambda book: [book.active.append(row) for row in rows])


def as_ods(rows):
    def cell(value):
        if str(value).startswith("#"):
            return f'<table:table-cell office:value-type="string" office:string-value="" calcext:value-type="error"><text:p>{value}</text:p></table:table-cell>'
        if isinstance(value, str):
            return f'<table:table-cell office:value-type="string"><text:p>{value.replace("<", "&lt;")}</text:p></table:table-cell>'
        return f'<table:table-cell office:value-type="float" office:value="{value}"><text:p>{value}</text:p></table:table-cell>'

    names = "urn:oasis:names:tc:opendocument:xmlns"
    spaces = " ".join(f'xmlns:{name}="{names}:{name}:1.0"' for name in ("office", "table", "text"))
    spaces += ' xmlns:calcext="urn:org:documentfoundation:names:experimental:calc:xmlns:calcext:1.0"'
    body = "".join(f"<table:table-row>{''.join(map(cell, row))}</table:table-row>" for row in rows)
    content = f'<?xml version="1.0"?><office:document-content {spaces}><office:body><office:spreadsheet><table:table table:name="Data">{body}</table:table></office:spreadsheet></office:body></office:document-content>'
    stream = io.BytesIO()
    with zipfile.ZipFile(stream, "w") as out:
        out.writestr("mimetype", "application/vnd.oasis.opendocument.spreadsheet")
        out.writestr("content.xml", content)
        out.writestr(
            "META-INF/manifest.xml",
            '<?xml version="1.0"?><m:manifest xmlns:m="urn:oasis:names:tc:opendocument:xmlns:manifest:1.0"/>',
        )
    return stream.getvalue()


def as_text(delimiter, encoding="utf-8", ending="\n"):
    return lambda rows: ending.join(delimiter.join(str(cell) for cell in row) for row in rows).encode(encoding)


KINDS = {
    "xlsx": as_xlsx, "xls": as_xls, "ods": as_ods, "csv": as_text(","), "tab": as_text("\t"), "semicolon": as_text(";"),
    "pipe": as_text("|"), "carriage returns": as_text(",", ending="\r"), "dos": as_text(",", ending="\r\n"),
    "utf-16": as_text(",", "utf-16"), "byte order mark": as_text(",", "utf-8-sig"), "blanks": as_text("   "),
}  # fmt: skip


@pytest.mark.django_db
@pytest.mark.parametrize("write", KINDS.values(), ids=KINDS.keys())
def test_the_same_table_in_every_kind_of_file_whatever_its_name(write):
    landed = land(ProjectFactory(), write(ROWS), "table.dat", well="Quill 1")
    found = {
        address: (row["value_reported"], row["value"], row["qualifier"])
        for (_, address), row in cells_of(landed.report).items()
    }
    assert found == {"C2": ("1.25", 1.25, ""), "D2": ("<0.05", 0.05, "<"), "C3": ("0.9", 0.9, ""), "D3": ("3", 3.0, "")}
    assert list(Sample.objects.values_list("top_reported", flat=True)) == ["1000", "1010.5"]


@pytest.mark.django_db
def test_old_encodings_keep_their_letters():
    text = "Bohrung;Probe;Teufe (m);TOC (Gew.%);Bemerkung\nSüd 1;A;1.234,5;0,45;größer als üblich\n"
    landed = land(ProjectFactory(), text.encode("cp1252"), well="")
    analysis = Analysis.objects.get()
    assert (analysis.remark, analysis.sample.well.name, analysis.sample.top_md_m) == (
        "größer als üblich",
        "Süd 1",
        1234.5,
    )
    assert Result.objects.get(analysis__report=landed.report).value == 0.45


@pytest.mark.django_db
def test_cells_shown_as_percent_hold_fractions():
    def fill(book):
        sheet = book.active
        for row in (["Sample", "Depth (m)", "TOC (%)", "Al (%)"], ["A", 10, 0.0125, 4.5], ["B", 11, 0.009, 4.25]):
            sheet.append(row)
        for row in (2, 3):
            sheet.cell(row, 3).number_format = "0.00%"
            sheet.cell(row, 4).number_format = "0.00"

    landed = land(ProjectFactory(), workbook(fill), "x.xlsx", well="Quill 1")
    values = {(row["analyte__code"], row["value"]) for row in cells_of(landed.report).values()}
    assert values == {("TOC", 1.25), ("TOC", 0.9), ("AL", 45000.0), ("AL", 42500.0)}
    decimals = {column.field: column.decimals for column in landed.report.tables.get().columns.all()}
    assert decimals["AL"] == 2  # the format shows 4.50, the file holds 4.5


@pytest.mark.django_db
def test_error_cells_and_unstored_formulas_of_a_workbook_are_named():
    def fill(book):
        sheet = book.active
        for row in (["Sample", "Depth (m)", "TOC (wt%)", "HI"], ["A", 10, 1, "#DIV/0!"], ["B", 11, "=1/2", 100]):
            sheet.append(row)
        sheet["D2"].data_type = "e"

    answer = entry(ProjectFactory(), workbook(fill), "x.xlsx")
    assert {(f["cell"], f["message"]) for f in findings_of(answer, "error")} == {
        ("C3", "TOC in cell C3 cannot be read: it is a formula without a stored result."),
        ("D2", "HI in cell D2 cannot be read: «#DIV/0!» is a spreadsheet error."),
    }


@pytest.mark.django_db
@pytest.mark.parametrize("rows", [2, 400])  # a small workbook lies in short sectors, a large one in whole ones
def test_error_cells_of_an_old_workbook_are_named(rows):
    book = xlwt.Workbook()
    sheet = book.add_sheet("Überblick")
    for column, text in enumerate(["Sample", "Depth (m)", "TOC (wt%)", "HI"]):
        sheet.write(0, column, text)
    for row in range(1, rows + 1):
        for column, value in enumerate([f"S{row}", 10.5 + row, 1.25, 300]):
            sheet.write(row, column, value)
    sheet.row(rows + 1).write(0, "last")
    sheet.row(rows + 1).write(1, 5000)
    sheet.row(rows + 1).set_cell_error(2, 0x2A)
    sheet.row(rows + 1).set_cell_error(3, "#DIV/0!")
    stream = io.BytesIO()
    book.save(stream)
    answer = entry(ProjectFactory(), stream.getvalue(), "x.xls")
    assert [(f["cell"], f["value"]) for f in answer["findings"]] == [
        (f"C{rows + 2}", "#N/A"),
        (f"D{rows + 2}", "#DIV/0!"),
    ]


@pytest.mark.django_db
def test_error_cells_of_an_open_document_are_named():
    answer = entry(
        ProjectFactory(), as_ods([["Sample", "Depth (m)", "TOC (wt%)"], ["A", 10, 1], ["B", 11, "#REF!"]]), "x.ods"
    )
    assert [(f["cell"], f["value"]) for f in findings_of(answer, "error")] == [("C3", "#REF!")]


@pytest.mark.django_db
def test_tables_below_and_beside_each_other():
    def fill(book):
        sheet = book.active
        for row in (
            ["Table 1", "", "", "", "", "Table 2"],
            ["Sample", "Depth (m)", "TOC (wt%)", "", "", "Sample", "Depth (m)", "Quartz (wt%)", "Calcite (wt%)"],
            ["A", 10, 1, "", "", "K", 50, 40, 30], ["B", 11, 2, "", "", "", "", "", ""], [], ["Table 3"],
            ["Sample", "Depth (m)", "Ro (%)", "Std Dev"], ["A", 10, 0.5, 0.05],
        ):  # fmt: skip
            sheet.append(row)

    landed = land(ProjectFactory(), workbook(fill), "x.xlsx", well="Quill 1")
    assert [table["range"] for table in landed.upload.answer["tables"]] == ["A2:C4", "F2:I3", "A7:D8"]
    of = {row["analyte__code"]: row["analysis__sample_id"] for row in cells_of(landed.report).values()}
    labels = dict(Sample.objects.values_list("pk", "label"))
    assert (labels[of["QUARTZ"]], labels[of["RO"]]) == ("K", "A")
    assert Sample.objects.count() == 3


@pytest.mark.django_db
def test_roles_of_rows():
    text = "Sample,Depth (m),TOC (wt%)\nA,10,1.0\nA dup,10,1.1\nStandard XR-7,,2.1\nProcedural blank,,<0.02\nMean,,1\nA,10,1.2\n"
    landed = land(ProjectFactory(), text, well="Quill 1")
    rows = Analysis.objects.order_by("line").values_list(
        "line", "role", "replicate", "sample__label", "reference_material__name"
    )
    assert list(rows) == [
        (2, "sample", 1, "A", None), (3, "duplicate", 2, "A", None), (4, "reference", 1, None, "XR-7"),
        (5, "blank", 1, None, None), (7, "sample", 3, "A", None),
    ]  # fmt: skip
    assert [f["message"] for f in findings_of(landed.upload.answer, "note")] == [
        "Row 6 was left out: «Mean» is a summary, not a sample."
    ]


@pytest.mark.django_db
def test_toc_by_two_methods_makes_two_analyses():
    text = "Sample,Depth (m),TOC pyrolysis (wt%),TOC combustion (wt%),S2 (mg/g)\nA,10,1.5,1.6,3\n"
    landed = land(ProjectFactory(), text, well="Quill 1")
    found = {
        (row["analysis__method__code"], row["analyte__code"]): row["value"] for row in cells_of(landed.report).values()
    }
    assert found == {("pyrolysis", "TOC"): 1.5, ("carbon", "TOC"): 1.6, ("pyrolysis", "S2"): 3.0}


@pytest.mark.django_db
def test_a_unit_column_and_wells_continued_from_above():
    text = "Well,Depth,Depth unit,TOC (wt%)\nQuill 1,1000,m,1\n,1010,m,2\nQuill 2,5000,ft,3\n"
    landed = land(ProjectFactory(), text)
    depths = list(
        Sample.objects.order_by("well__name", "top_md_m").values_list("well__name", "top_md_m", "depth_unit_reported")
    )
    assert depths == [("Quill 1", 1000.0, "m"), ("Quill 1", 1010.0, "m"), ("Quill 2", 5000 * 0.3048, "ft")]
    assert [f["code"] for f in landed.upload.answer["findings"]] == ["well_from_above"]


@pytest.mark.django_db
def test_toc_in_percent_or_fraction_is_told_by_hi():
    rows = "".join(
        f"S{at},{at},{toc},2,{hi}\n" for at, toc, hi in ((10, 0.01, 200), (11, 0.008, 250), (12, 0.005, 400))
    )
    answer = entry(ProjectFactory(), "Sample,Depth (m),TOC,S2,HI\n" + rows)
    units = {column["field"]: column["unit"] for column in answer["tables"][0]["columns"]}
    assert (answer["outcome"], units["TOC"]) == ("imported", "fraction")


@pytest.mark.django_db
def test_a_sheet_a_well_is_asked_sheet_by_sheet():
    def fill(book):
        for name in ("Quill 1", "Quill 2"):
            sheet = book.create_sheet(name)
            for row in (["Sample", "Depth (m)", "TOC (wt%)"], ["A", 10, 1]):
                sheet.append(row)

    project, content = ProjectFactory(), workbook(fill)
    asked = {f["id"]: f["options"] for f in findings_of(entry(project, content, "x.xlsx", well=""), "question")}
    assert asked == {"well:Quill 1": ["Quill 1"], "well:Quill 2": ["Quill 2"]}
    landed = land(project, content, "x.xlsx", answers={name: options[0] for name, options in asked.items()})
    assert sorted(Sample.objects.values_list("well__name", flat=True)) == ["Quill 1", "Quill 2"]
    assert landed.upload.answer["counts"]["wells_new"] == 2


@pytest.mark.django_db
def test_a_header_repeated_on_every_page_and_an_n_beside_reflectance():
    text = (
        "Sample,Depth (m),Ro (%),SD,N\nA,10,0.5,0.05,30\nPage 1 of 2\nSample,Depth (m),Ro (%),SD,N\nB,11,0.6,0.06,25\n"
    )
    answer = entry(ProjectFactory(), text)
    fields = [column["field"] for column in answer["tables"][0]["columns"]]
    assert (len(answer["tables"]), fields, answer["counts"]["rows"]) == (1, ["SAMPLE", "TOP", "RO", "RO_SD", "RO_N"], 2)


@pytest.mark.django_db
def test_rows_of_numbers_outside_every_table_are_named():
    answer = entry(ProjectFactory(), "1,2,3\nSample,Depth (m),TOC (wt%)\nA,10,1\n")
    assert [f["message"] for f in findings_of(answer, "warning")] == [
        "Rows 1 hold numbers but belong to no table, and were not read."
    ]


@pytest.mark.parametrize(("name", "parts"), [
    ("KG-17.xlsx", ("KG-17", None, False)),
    ("KG-17_rev2.xlsx", ("KG-17", 2, False)),
    ("KG-17 v3.csv", ("KG-17", 3, False)),
    ("KG-17_amended.xls", ("KG-17", None, True)),
    ("results 2024.txt", ("results 2024", None, False)),
    ("Survey.data.csv", ("Survey.data", None, False)),
])  # fmt: skip
def test_report_number_and_version_from_the_file_name(name, parts):
    assert split_file_name(name) == parts


CELLS = st.one_of(
    st.sampled_from(
        ["", "-", "n.d.", "<0.05", "0.5", "abc", "12,5", "1,620", "BDL", "3*", "#N/A", "450 ppm", "-999.25", "1 - 2"]
    ),
    st.decimals(min_value=0, max_value=99, places=2).map(str),
    st.floats(0, 50).map(lambda value: round(value, 3)),
)


@settings(max_examples=60, deadline=None, suppress_health_check=[HealthCheck.too_slow])
@given(st.lists(st.lists(CELLS, min_size=3, max_size=3), min_size=1, max_size=12))
def test_every_cell_is_a_result_a_blank_or_named_in_a_finding(cells):
    """Contract: rows x mapped columns = results + blanks + findings that name the cell."""
    rows = [["Sample", "Depth (m)", "TOC (wt%)", "S1 (mg/g)", "S2 (mg/g)"]]
    rows += [[f"S{at}", 100.5 + at, *line] for at, line in enumerate(cells)]
    findings = Findings({"comma:A1": "thousands"})
    (table,) = find_tables(Sheet("", rows)).tables
    prepared, _ = _take_table(table, Facts(), findings)
    tally = prepared.tally()
    assert tally["cells"] == 3 * len(cells) == tally["results"] + tally["blank"] + tally["named"]
    named = {finding.cell for finding in findings.found if finding.code == "unreadable_value"}
    assert len(named) == tally["named"]


def test_a_sheet_of_text_has_no_table():
    assert find_tables(Sheet("", [["Dear all"], ["see below"], [1, 2, 3]])).tables == []
    assert read("x", b"a,b\n1,2\n").kind == "text"
