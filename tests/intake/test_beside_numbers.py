"""What stands beside the numbers: marks in a column of their own, units that lead nowhere, standards among samples."""

import pytest

from tests.factories import ProjectFactory
from tests.intake.landing import entry, findings_of, land

pytestmark = pytest.mark.django_db

MARKS = b"Well,Depth (m),TOC (wt%),S1 qualifier,S1 (mg/g)\nQ 1,1000,1.5,<,0.01\nQ 1,1010,1.6,,0.3\n"
STANDARDS = b"""Well,Sample,Depth (m),TOC (wt%)
Q 1,A1,1000,2.1
Q 1,IFP 160000,,3.28
Q 1,SBC-1,,1.2
"""


@pytest.mark.parametrize("header", [b"S1 qualifier", b"Qual", b"+/-"])
def test_marks_apart_from_their_numbers_are_asked_about(header):
    answer = entry(ProjectFactory(), MARKS.replace(b"S1 qualifier", header))
    assert answer["outcome"] == "waiting"
    (question,) = findings_of(answer, "question")
    assert (question["code"], question["cell"], question["id"]) == ("marks_apart", "D1", "marks:D1")


def test_marks_are_left_out_only_when_a_person_says_so():
    answer = entry(ProjectFactory(), MARKS, answers={"marks:D1": "leave out"})
    assert answer["outcome"] == "imported_with_findings"
    assert [(note["code"], note["cell"]) for note in findings_of(answer, "note")] == [("unmapped_column", "D1")]


@pytest.mark.parametrize("unit", ["kJ", "kg"])
def test_a_unit_that_leads_nowhere_is_an_error(unit):
    answer = entry(ProjectFactory(), f"Well,Depth (m),TOC (wt%),S2 ({unit})\nQ 1,1000,2,5\n".encode())
    (error,) = findings_of(answer, "error")
    assert error["message"] == f"Column D «S2 ({unit})» is in {unit}, which does not convert to mg/g."


def test_reference_rocks_known_by_name_are_no_samples():
    landed = land(ProjectFactory(), STANDARDS)
    roles = landed.report.analyses.order_by("line").values_list("role", "reference_material__name")
    assert list(roles) == [("sample", None), ("reference", "IFP 160000"), ("reference", "SBC-1")]


def test_a_sample_without_depth_among_others_is_said():
    answer = entry(ProjectFactory(), STANDARDS.replace(b"SBC-1", b"Odd one"), well="")
    (warning,) = findings_of(answer, "warning")
    assert (warning["code"], warning["cell"]) == ("sample_without_depth", "C4")
    assert "«Odd one» (row 4)" in warning["message"]
