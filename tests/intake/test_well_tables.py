"""Core runs, mud, casing, tops and well headers as tables: what is taken, what is asked, what is refused."""

import pytest

from labdata.models import CasingShoe, CoreRun, FormationTop, MudInterval, Result, SurveyStation, Well
from tests.factories import ProjectFactory, WellFactory
from tests.intake.landing import entry, findings_of, land, workbook

pytestmark = pytest.mark.django_db
FOOT = 0.3048


def test_core_runs():
    text = "Well: Quill 1\nCore no,Top (ft),Base (ft),Recovery (%),Shift to log (ft)\n1,100,130,90,1.5\n2,130,160.5,,\n"
    land(ProjectFactory(), text)
    rows = list(CoreRun.objects.values_list("number", "top_md_m", "base_md_m", "recovered_m", "shift_to_log_m"))
    assert rows[0] == (
        1,
        pytest.approx(100 * FOOT),
        pytest.approx(130 * FOOT),
        pytest.approx(27 * FOOT),
        pytest.approx(1.5 * FOOT),
    )
    assert rows[1] == (2, pytest.approx(130 * FOOT), pytest.approx(160.5 * FOOT), None, None)


def test_mud_and_casing_in_one_workbook_of_several_wells():
    def fill(book):
        mud = book.active
        mud.title = "Mud"
        for row in (["Well", "From (m)", "To (m)", "Mud type", "Additives"], ["Quill 1", 0, 800, "KCl polymer", "lignite"],
                    ["Quill 1", 800, 2500, "OBM", None], ["Quill 2", 0, 900, "Synthetic based mud", None]):  # fmt: skip
            mud.append(row)
        casing = book.create_sheet("Casing")
        for row in (
            ["Well", "Casing size (in)", "Shoe depth (m)"],
            ["Quill 1", 13.375, 790],
            ["Quill 2", 9.625, 850.5],
        ):
            casing.append(row)

    landed = land(ProjectFactory(), workbook(fill), "wells.xlsx")
    assert list(MudInterval.objects.order_by("well__name", "top_md_m").values_list("well__name", "top_md_m", "base_md_m", "kind")) == [
        ("Quill 1", 0, 800, "water"), ("Quill 1", 800, 2500, "oil"), ("Quill 2", 0, 900, "synthetic"),
    ]  # fmt: skip
    assert MudInterval.objects.get(kind="water").additives == "KCl polymer; lignite"
    assert set(CasingShoe.objects.values_list("well__name", "md_m", "diameter_in")) == {
        ("Quill 1", 790, 13.375),
        ("Quill 2", 850.5, 9.625),
    }
    assert landed.well_ids == sorted(Well.objects.values_list("pk", flat=True))


def test_a_mud_that_says_nothing_of_its_base_is_asked():
    text = "Well,From (m),To (m),Mud\nQuill 1,0,800,Dynaflow\n"
    (question,) = findings_of(entry(ProjectFactory(), text, well=""), "question")
    assert (question["id"], question["options"]) == ("mud:Dynaflow", ["oil", "synthetic", "water", "air"])
    land(ProjectFactory(), text, answers={"mud:Dynaflow": "oil"})
    assert MudInterval.objects.get().kind == "oil"


def test_tops_as_table_are_versions():
    project = ProjectFactory()
    land(project, "Formation,Top MD (m)\nUpper Sand,1200.5\nLower Shale,-999.25\n", "a.csv", well="Quill 1")
    land(project, "Formation,Top\nUpper Sand,1201\n", "b.csv", well="Quill 1", answers={"unit:B": "m"})
    assert list(FormationTop.objects.values_list("name", "top_md_m", "version")) == [
        ("Upper Sand", 1200.5, "1"),
        ("Upper Sand", 1201, "2"),
    ]


def test_well_headers_make_wells_and_fill_gaps():
    project = ProjectFactory()
    held = WellFactory(project=project, name="Quill 1", name_key="quill 1", operator="Ridge")
    text = "Well,UWI,Latitude,Longitude,KB (ft),TD (m),Operator\nQuill 1,,51.5,3.25,82,3000,Basalt\nQuill 2,100/01,52,3,80,,Basalt\n"
    landed = land(project, text)
    held.refresh_from_db()
    assert (held.latitude, held.longitude, held.td_md_m, held.operator) == (51.5, 3.25, 3000, "Ridge")
    assert held.datum_elevation_m == pytest.approx(82 * FOOT)
    assert [f["code"] for f in findings_of(landed.upload.answer, "warning")] == ["well_differs"]
    other = Well.objects.get(name="Quill 2")
    assert (other.uwi, other.operator, other.datum_kind) == ("100/01", "Basalt", "KB")


def test_results_and_a_survey_in_one_workbook():
    def fill(book):
        sheet = book.active
        for row in (["Sample", "Depth (m)", "TOC (wt%)"], ["A", 10, 1.5], ["B", 20, 2.5]):
            sheet.append(row)
        survey = book.create_sheet("Survey")
        for row in (["MD (m)", "Inc (deg)", "Azi (deg)"], [0, 0, 0], [100, 5, 90]):
            survey.append(row)

    landed = land(ProjectFactory(), workbook(fill), "both.xlsx", well="Quill 1")
    assert (SurveyStation.objects.count(), Result.objects.count()) == (2, 2)
    assert [table["kind"] for table in landed.upload.answer["tables"]] == ["carbon", "survey"]


BAD = {
    "inclination": ("MD (m),Inc,Azi\n10,200,0\n", "impossible_value", "B2"),
    "azimuth": ("MD (m),Inc,Azi\n10,20,720\n", "impossible_value", "C2"),
    "a depth twice": ("MD (m),Inc,Azi\n10,20,0\n10,21,0\n", "impossible_value", "A3"),
    "a station without inclination": ("MD (m),Inc,Azi\n10,,0\n", "row_incomplete", "B2"),
    "no number": ("MD (m),Inc,Azi\n10,x,0\n", "unreadable_value", "B2"),
    "core upside down": ("Core,Top (m),Base (m)\n1,100,90\n", "impossible_value", "C2"),
    "core number": ("Core,Top (m),Base (m)\nA,100,190\n", "impossible_value", "A2"),
    "subsea without datum": ("Formation,TVDSS (m)\nCody,900\n", "datum_unknown", "B2"),
}  # fmt: skip


@pytest.mark.parametrize(("text", "code", "cell"), BAD.values(), ids=BAD.keys())
def test_what_cannot_be_names_its_cell(text, code, cell):
    answer = entry(ProjectFactory(), text)
    assert answer["outcome"] == "refused"
    assert [(f["code"], f["cell"]) for f in findings_of(answer, "error")] == [(code, cell)]


def test_a_file_of_another_well_than_asked_says_so():
    project = ProjectFactory()
    WellFactory(project=project, name="Quill 2", name_key="quill 2")
    landed = land(project, "Well: Quill 2\nMD (m),Inc,Azi\n0,0,0\n10,1,0\n", well="Quill 1")
    assert SurveyStation.objects.first().well.name == "Quill 2"
    assert "well_option_unused" in {f["code"] for f in findings_of(landed.upload.answer, "warning")}
