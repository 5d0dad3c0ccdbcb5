"""A project's own analytes in headers, and the further peaks of extended pyrolysis."""

import pytest

from labdata.models import Analyte, Method, Result
from tests.factories import ProjectFactory
from tests.intake.landing import entry, findings_of, land

pytestmark = pytest.mark.django_db


def own(project, code="FTIR_A", name="Aliphatic factor", unit="a.u."):
    return Analyte.objects.create(
        project=project, code=code, name=name, unit=unit, method=Method.objects.get(code="gc")
    )


def stored():
    return dict(Result.objects.values_list("analyte__code", "value"))


@pytest.mark.parametrize(
    "header", ["FTIR_A (a.u.)", "FTIR A [a.u.]", "Aliphatic factor (a.u.)", "ALIPHATIC FACTOR (A.U.)"]
)
def test_an_analyte_of_the_project_is_found_by_code_and_name(header):
    project = ProjectFactory()
    analyte = own(project)
    land(project, f"Sample,Depth (m),{header}\nA,10,0.25\n", well="Quill 1")
    assert stored() == {"FTIR_A": 0.25}
    assert Result.objects.get().analyte == analyte


def test_without_a_unit_it_is_asked_unless_there_is_no_choice():
    project = ProjectFactory()
    own(project, unit="ug/g")
    own(project, "GLOSS", "Gloss index", "")
    own(project, "SHEEN", "Sheen", "a.u.")
    text = "Sample,Depth (m),Aliphatic factor,Gloss index,Sheen\nA,10,0.25,3,7\n"
    assert [f["id"] for f in findings_of(entry(project, text), "question")] == ["unit:C"]
    land(project, text, well="Quill 1", answers={"unit:C": "mg/g"})
    assert stored() == {"FTIR_A": 250, "GLOSS": 3, "SHEEN": 7}


def test_another_project_does_not_know_it():
    own(ProjectFactory())
    answer = entry(ProjectFactory(), "Sample,Depth (m),TOC (wt%),Aliphatic factor (a.u.)\nA,10,1,0.25\n")
    assert answer["tables"][0]["unmapped"] == ["Aliphatic factor (a.u.)"]


def test_extended_pyrolysis_peaks():
    heads = [
        "S1",
        "S2",
        "S3",
        "S3'",
        "S3CO",
        "S3'CO",
        "S4CO",
        "S4CO2",
        "S5",
        "Tmax",
        "TpkS2",
        "PC",
        "RC",
        "MINC (wt%)",
        "OICO",
    ]
    text = (
        "Sample,Depth (m),"
        + ",".join(heads).replace("PC,RC", "PC (wt%),RC (wt%)")
        + "\nA,10,"
        + ",".join(str(at + 1) for at in range(15))
        + "\n"
    )
    land(ProjectFactory(), text, well="Quill 1")
    codes = [
        "S1",
        "S2",
        "S3",
        "S3P",
        "S3CO",
        "S3COP",
        "S4CO",
        "S4CO2",
        "S5",
        "TMAX",
        "TPEAK",
        "PC",
        "RC",
        "MINC",
        "OICO",
    ]
    assert stored() == {code: at + 1 for at, code in enumerate(codes)}
    assert set(Result.objects.values_list("analysis__method__code", flat=True)) == {"pyrolysis"}
