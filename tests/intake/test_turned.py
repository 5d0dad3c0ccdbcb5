"""Tables whose samples run along the columns."""

import pytest

from labdata.models import Sample, SourceColumn, SourceTable
from labdata.pages.sheet_extract import address
from labdata.release.columns import cell_address
from tests.factories import ProjectFactory
from tests.intake.landing import entry, findings_of, land, workbook

pytestmark = pytest.mark.django_db

TURNED = (
    "Laboratory,Basalt House\n"
    "Report no,BH-7\n"
    "\n"
    "Sample,,Q-1,Q-2,Q-3\n"
    "Depth,m,1010,1020.5,1030\n"
    "TOC,wt%,1.25,<0.05,3.1\n"
    "S2,mg/g,4.5,,12.75\n"
    "Tmax,°C,431,,440\n"
    "\n"
    "n.d. = not determined\n"
)


def results(landed):
    return {
        address(result): (result.analyte.code, result.value, result.qualifier, result.value_reported)
        for analysis in landed.report.analyses.all()
        for result in analysis.results.select_related("column__table", "analysis", "analyte")
    }


def test_every_value_keeps_the_cell_it_stands_in():
    landed = land(ProjectFactory(), TURNED, well="Quill 1")
    assert results(landed) == {
        "C6": ("TOC", 1.25, "", "1.25"), "D6": ("TOC", 0.05, "<", "<0.05"), "E6": ("TOC", 3.1, "", "3.1"),
        "C7": ("S2", 4.5, "", "4.5"), "E7": ("S2", 12.75, "", "12.75"), "C8": ("TMAX", 431, "", "431"), "E8": ("TMAX", 440, "", "440"),
    }  # fmt: skip
    table = SourceTable.objects.get()
    assert (table.orientation, table.cell_range, landed.report.number) == ("columns", "A4:E8", "BH-7")
    assert set(SourceColumn.objects.values_list("field", "line")) == {
        ("SAMPLE", 4), ("TOP", 5), ("TOC", 6), ("S2", 7), ("TMAX", 8),
    }  # fmt: skip
    analysis = Sample.objects.get(label="Q-2").analyses.get()
    assert analysis.line == 4
    assert cell_address(6, analysis.line, table.orientation) == "D6"


def test_findings_name_cells_and_rows_of_the_file():
    text = TURNED.replace("12.75", "abc").replace("wt%", "").replace("1.25,<0.05,3.1", "0.6,0.5,0.9")
    answer = entry(ProjectFactory(), text)
    assert [f["cell"] for f in findings_of(answer, "error")] == ["E7"]
    question = findings_of(answer, "question")[0]
    assert (question["id"], question["cell"]) == ("unit:6", "A6")
    assert question["message"].startswith("Row 6 «TOC»")


def test_an_answered_question_brings_the_table_in():
    text = TURNED.replace("wt%", "").replace("1.25,<0.05,3.1", "0.6,0.5,0.9")
    landed = land(ProjectFactory(), text, well="Quill 1", answers={"unit:6": "wt%"})
    assert results(landed)["C6"][1] == 0.6


def test_cells_shown_as_percent_hold_fractions():
    def fill(book):
        sheet = book.active
        for line in (["Sample", "A", "B"], ["Depth (m)", 10, 20], ["TOC (%)", 0.0125, 0.03], ["S1 (mg/g)", 1.0, 2.0]):
            sheet.append(line)
        for cell in (sheet["B3"], sheet["C3"]):
            cell.number_format = "0.00%"

    landed = land(ProjectFactory(), workbook(fill), "turned.xlsx", well="Quill 1")
    assert results(landed)["B3"][1] == pytest.approx(1.25)
    assert results(landed)["C4"][1] == 2.0


def test_two_tables_one_below_the_other():
    text = (
        "Sample,A,B\nDepth (m),10,20\nTOC (wt%),1,2\n\n"
        "Sample,A,B,C\nDepth (m),10,20,30\nRo (%),0.5,0.6,0.7\nReadings,20,22,30\n"
    )
    landed = land(ProjectFactory(), text, well="Quill 1")
    assert results(landed)["D7"] == ("RO", 0.7, "", "0.7")
    assert SourceTable.objects.count() == 2
    assert Sample.objects.count() == 3


def test_spreadsheet_errors_are_named_where_they_stand():
    def fill(book):
        for line in (
            ["Sample", "A", "B"],
            ["Depth (m)", 10, 20],
            ["TOC (wt%)", 1.0, "#DIV/0!"],
            ["S1 (mg/g)", 1.0, 2.0],
        ):
            book.active.append(line)

    answer = entry(ProjectFactory(), workbook(fill), "turned.xlsx")
    assert [f["cell"] for f in findings_of(answer, "error")] == ["C3"]
