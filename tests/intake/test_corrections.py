"""What a person says of columns and header rows stands above what was recognised, and is remembered for the layout."""

import io

import pytest
from openpyxl import Workbook

from labdata.access import NotAllowed
from labdata.errors import Conflict
from labdata.intake import desk, layouts, services
from labdata.intake.corrections import read_rows
from labdata.models import AuditEntry, Job, JobState, RememberedLayout, Report, Result, Role, SourceColumn, Upload
from tests.factories import MembershipFactory, ProjectFactory, WellFactory
from tests.intake.landing import carry, cells_of, entry, findings_of

pytestmark = pytest.mark.django_db

ODD = """Well,Probe no,Lvl,Kero-C,Peak two,Junk
Quill 1,A-1,2000.5,1.50,4.1,7
Quill 1,A-2,2010.5,2.25,8.3,8
"""
FIXES = {
    "field:B1": "SAMPLE", "field:C1": "TOP", "in:C1": "m", "field:D1": "TOC", "in:D1": "wt%", "field:E1": "s2",
    "field:F1": "leave out", "header:": "1",
}  # fmt: skip


@pytest.fixture
def project():
    made = ProjectFactory()
    WellFactory(project=made, name="Quill 1", name_key="quill 1")
    return made


@pytest.fixture
def analyst(project):
    return MembershipFactory(project=project, role=Role.ANALYST).user


def settled(upload):
    """The upload as it stands once its job has ended with what the pipeline would write."""
    carry(upload)
    Job.objects.filter(pk=upload.job_id).update(state=JobState.SUCCEEDED)
    upload.refresh_from_db()
    return upload


def received(project, user, content=ODD, name="odd.csv", **options):
    content = content.encode() if isinstance(content, str) else content
    return settled(services.receive(project=project, name=name, content=content, user=user, **options))


def columns(answer):
    return {one["column"]: one for table in answer["tables"] for one in table["columns"]}


@pytest.mark.parametrize(
    ("text", "rows"),
    [("5", [(4, 4)]), ("4-6", [(3, 5)]), (" 4 – 5 , 31", [(3, 4), (30, 30)]), ("leave out", []), ("6-4", None),
     ("1-9", None), ("0", None), ("5, 5", None), ("the first", None)],
)  # fmt: skip
def test_header_rows_as_people_write_them(text, rows):
    assert read_rows(text) == rows


def test_a_layout_that_nobody_knows_is_read_as_told(project, analyst):
    assert entry(project, ODD, create_wells=False)["outcome"] == "refused"
    upload = received(project, analyst, answers=FIXES)
    assert upload.outcome == "imported_with_findings"  # the column left out is noted
    read = columns(upload.answer)
    assert {letter: (one["field"], one["unit"]) for letter, one in read.items()} == {
        "A": ("WELL", ""), "B": ("SAMPLE", ""), "C": ("TOP", "m"), "D": ("TOC", "wt%"), "E": ("S2", "mg/g")}  # fmt: skip
    assert {read[letter]["confidence"] for letter in "BCDE"} == {1.0}
    assert read["D"]["reason"] == f"set by {analyst.username}"
    values = {place[1]: row["value"] for place, row in cells_of(upload.report).items()}
    assert values == {"D2": 1.5, "D3": 2.25, "E2": 4.1, "E3": 8.3}
    (left,) = findings_of(upload.answer, "note")
    assert (left["code"], left["cell"]) == ("unmapped_column", "F1")
    assert f"set by {analyst.username}" in left["message"]


def test_a_recognised_column_is_overruled_and_the_other_claim_gives_way(project):
    content = "Well,Sample,TOC (wt%),Corg new (wt%),S2 (mg/g)\nQuill 1,A,1.5,1.7,4\nQuill 1,B,1.6,1.9,5\n"
    answer = entry(project, content, well="", answers={"field:D1": "TOC"})
    assert columns(answer)["D"]["field"] == "TOC"
    assert "C" not in columns(answer)
    assert any("D is taken for TOC" in one["message"] for one in answer["findings"])


def test_several_headers_that_only_say_name_leave_the_rest_as_it_is(project):
    content = "Name,ID,Code,Depth (m),TOC (wt%)\nQuill 1,A,x,5,2\nQuill 1,B,x,6,3\nQuill 1,C,x,7,3\n"
    read = columns(entry(project, content, well="", answers={"field:E1": "TC"}))
    assert {letter: one["field"] for letter, one in read.items()} == {"A": "WELL", "B": "SAMPLE", "D": "TOP", "E": "TC"}


def test_a_unit_is_overruled_alone(project):
    content = "Well,Depth (m),Mo (ppm)\nQuill 1,6561.68,2\n"
    answer = entry(project, content, well="", answers={"in:B1": "ft", "in:C1": "wt%"})
    assert columns(answer)["B"]["unit"] == "ft"
    assert (columns(answer)["C"]["unit"], columns(answer)["C"]["field"]) == ("wt%", "MO")
    assert "unit set by an answer" in columns(answer)["C"]["reason"]


def test_a_unit_that_leads_nowhere_is_an_error(project):
    answer = entry(project, "Well,Depth (m),TOC (wt%)\nQuill 1,5,2\n", well="", answers={"in:C1": "degC"})
    assert answer["outcome"] == "refused"
    assert "does not convert to wt%" in answer["findings"][0]["message"]


def test_a_column_without_a_header_is_given_a_field(project):
    answer = entry(project, "Well,Depth (m),TOC (wt%),\nQuill 1,5,2,7.5\n", well="", answers={"field:D1": "S2"})
    assert (columns(answer)["D"]["field"], answer["counts"]["results"]) == ("S2", 2)


def test_samples_along_the_columns_are_corrected_by_their_rows(project):
    content = "Sample,A,B,C\nDepth (m),5,6,7\nFlame,3,4,5\nTOC (wt%),1,2,3\n"
    answer = entry(project, content, answers={"field:A3": "S2"})
    read = {one["column"]: one["field"] for one in answer["tables"][0]["columns"]}
    assert (answer["tables"][0]["orientation"], read["3"], answer["counts"]["results"]) == ("columns", "S2", 6)


def test_what_cannot_be_meant_is_named(project):
    answers = {"field:C1": "CARBONISH", "header:": "top one", "in:Z9": "m"}
    answer = entry(project, "Well,Depth (m),TOC (wt%)\nQuill 1,5,2\n", well="", answers=answers)
    assert [(one["level"], one["code"]) for one in answer["findings"]] == [
        ("error", "correction_unreadable"), ("error", "correction_unreadable"), ("warning", "correction_unused")]  # fmt: skip


def two_tables() -> bytes:
    book = Workbook()
    sheet = book.active
    sheet.title = "All"
    for row in (
        ["Report"], ["kind of", "", "heavy"], ["spot", "level", "carbon"], ["A", 100, 1.5], ["B", 110, 2.5], [],
        ["spot", "level", "glow"], ["A", 100, 0.55], ["B", 110, 0.61],
    ):  # fmt: skip
        sheet.append(row)
    book.create_sheet("Scratch").append(["Depth (m)", "TOC (wt%)", "S2 (mg/g)"])
    book["Scratch"].append([1, 2, 3])
    out = io.BytesIO()
    book.save(out)
    return out.getvalue()


def test_header_rows_named_by_a_person_make_tables(project):
    answers = {
        "header:All": "2-3, 7", "header:Scratch": "leave out", "field:All!A3": "SAMPLE", "field:All!B3": "TOP", "in:All!B3": "m",
        "field:All!C3": "TOC", "in:All!C3": "wt%", "field:All!A7": "SAMPLE", "field:All!B7": "TOP", "in:All!B7": "m",
        "field:All!C7": "RO",
    }  # fmt: skip
    answer = entry(project, two_tables(), name="odd.xlsx", answers=answers)
    assert [(one["sheet"], one["range"], one["kind"], one["header_rows"]) for one in answer["tables"]] == [
        ("All", "A2:C5", "carbon", [2, 3]), ("All", "A7:C9", "reflectance", [7, 7])]  # fmt: skip
    assert (answer["counts"]["results"], answer["counts"]["samples_new"]) == (4, 2)


def test_looking_before_storing_waits_even_when_nothing_is_asked(project, analyst):
    upload = received(project, analyst, "Well,Depth (m),TOC (wt%)\nQuill 1,5,2\n", look=True)
    assert upload.outcome == "waiting"
    (question,) = upload.answer["findings"]
    assert (question["id"], question["options"]) == ("confirm", ["store it"])
    assert not Report.objects.exists()
    services.answer_questions(upload=upload, user=analyst, answers={"confirm": "store it"})
    upload.refresh_from_db()
    assert settled(upload).outcome == "imported"


def test_the_outcome_is_seen_before_it_is_stored(project, analyst):
    upload = received(project, analyst, look=True)
    assert upload.outcome == "refused"
    prepared, counts = desk.look(upload, desk.Draft(FIXES), analyst)
    assert (prepared.outcome, counts["results"], counts["samples_new"]) == ("imported_with_findings", 4, 2)
    upload.refresh_from_db()
    assert (upload.outcome, upload.answers) == ("refused", {})
    assert not Result.objects.exists()
    desk.store_with(upload=upload, user=analyst, draft=desk.Draft(FIXES, lab="North Lab"))
    upload.refresh_from_db()
    assert settled(upload).outcome == "imported_with_findings"
    assert Result.objects.count() == 4
    assert SourceColumn.objects.get(field="TOC").reason == f"set by {analyst.username}"
    told = AuditEntry.objects.get(action="upload.corrected")
    assert told.after["answers"]["field:D1"] == "TOC"


def test_a_person_walks_away(project, analyst):
    upload = received(project, analyst)
    desk.withdraw(upload=upload, user=analyst)
    upload.refresh_from_db()
    assert upload.outcome == Upload.Outcome.WITHDRAWN
    assert AuditEntry.objects.filter(action="upload.withdrawn").exists()
    with pytest.raises(Conflict, match="withdrawn"):
        desk.store_with(upload=upload, user=analyst, draft=desk.Draft(FIXES))
    assert received(project, analyst, answers=FIXES).outcome == "imported_with_findings"


def test_a_file_whose_reading_broke_off_is_withdrawn(project, analyst):
    upload = services.receive(project=project, name="odd.csv", content=ODD.encode(), user=analyst)
    Job.objects.filter(pk=upload.job_id).update(
        state=JobState.FAILED, error_code="example", error_message="It broke off."
    )
    assert desk.withdraw(upload=Upload.objects.get(pk=upload.pk), user=analyst).outcome == "withdrawn"


def test_what_is_in_or_being_read_cannot_be_withdrawn(project, analyst):
    landed = received(project, analyst, answers=FIXES)
    reading = services.receive(project=project, name="more.csv", content=b"Well,Depth\n", user=analyst)
    for upload in (landed, reading):
        with pytest.raises(Conflict):
            desk.withdraw(upload=upload, user=analyst)


def test_the_desk_is_for_those_who_bring_files_in(project, analyst):
    upload = received(project, analyst)
    reader = MembershipFactory(project=project, role=Role.INTERPRETER).user
    for gesture in (
        lambda: desk.look(upload, desk.Draft(), reader),
        lambda: desk.store_with(upload=upload, user=reader, draft=desk.Draft()),
        lambda: desk.withdraw(upload=upload, user=reader),
        lambda: desk.look(upload, desk.Draft(create_wells=True), analyst),
    ):
        with pytest.raises(NotAllowed):
            gesture()


SECOND = ODD.replace("1.50", "1.75").replace("A-1", "B-1").replace("A-2", "B-2")


def test_a_corrected_layout_is_remembered_for_its_laboratory(project, analyst):
    received(project, analyst, answers=FIXES, lab="North Lab")
    kept = RememberedLayout.objects.get()
    assert (kept.laboratory_name, kept.made_by, kept.mapping["header_height"]) == ("North Lab", analyst, 1)
    assert AuditEntry.objects.filter(action="layout.remembered").count() == 1
    again = entry(project, SECOND, well="", lab="north lab")
    assert (again["outcome"], again["counts"]["results"]) == ("imported_with_findings", 4)
    reason = f"as corrected by {analyst.username} on {kept.at:%Y-%m-%d} for this layout"
    assert all(one["reason"].startswith(reason) for letter, one in columns(again).items() if letter != "A")
    assert columns(again)["D"]["confidence"] == 1.0
    assert any(one["code"] == "remembered_layout" and reason in one["message"] for one in again["findings"])
    assert entry(project, SECOND, well="", lab="South Lab")["outcome"] == "refused"
    other = SECOND.replace("Junk", "Rubbish")
    assert entry(project, other, well="", lab="North Lab")["outcome"] == "refused"


def test_a_later_correction_replaces_the_remembered_one(project, analyst):
    received(project, analyst, answers=FIXES, lab="North Lab")
    upload = received(project, analyst, SECOND, "second.csv", lab="North Lab", answers={"field:D1": "TC"})
    assert columns(upload.answer)["D"]["field"] == "TC"
    kept = {one["header"]: (one["field"], one["unit"]) for one in RememberedLayout.objects.get().mapping["columns"]}
    assert (kept["Kero-C"], kept["Lvl"]) == (("TC", "wt%"), ("TOP", "m"))
    assert AuditEntry.objects.filter(action="layout.remembered").count() == 2


def test_a_layout_is_not_remembered_unless_wanted(project, analyst):
    upload = received(project, analyst, lab="North Lab")
    desk.store_with(upload=upload, user=analyst, draft=desk.Draft(FIXES, lab="North Lab", remember=False))
    upload.refresh_from_db()
    assert settled(upload).outcome == "imported_with_findings"
    assert not RememberedLayout.objects.exists()


def test_a_layout_is_forgotten(project, analyst):
    received(project, analyst, answers=FIXES, lab="North Lab")
    layouts.forget(layout=RememberedLayout.objects.get(), user=analyst)
    assert not RememberedLayout.objects.exists()
    assert AuditEntry.objects.get(action="layout.forgotten").before["laboratory"] == "North Lab"
    assert entry(project, SECOND, well="", lab="North Lab")["outcome"] == "refused"


def test_a_header_found_where_it_stands_lower_this_time(project, analyst):
    received(project, analyst, answers=FIXES, lab="North Lab")
    lower = "Our analyses of spring\n\n" + SECOND
    again = entry(project, lower, well="", lab="North Lab")
    assert (again["tables"][0]["range"], again["counts"]["results"]) == ("A3:F5", 4)
