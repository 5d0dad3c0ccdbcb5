"""The mapping desk as pages: looking, correcting, storing, walking away; remembered layouts; empty workbooks."""

import io

import pytest
from django.core.files.storage import default_storage
from openpyxl import load_workbook

from labdata.intake import services
from labdata.models import Job, JobState, RememberedLayout, Upload
from labdata.pages import desk as pages
from tests.intake.landing import carry
from tests.intake.test_corrections import FIXES, ODD

pytestmark = pytest.mark.django_db
WELL = {"well": "", "lab": "North Lab", "create_wells": "on"}


@pytest.fixture
def odd(made):
    """A file in a layout that nobody knows, read and refused."""
    upload = services.receive(
        project=made.scene.project,
        name="odd.csv",
        content=ODD.encode(),
        user=made.person("coordinator"),
        lab="North Lab",
    )
    return settled(upload)


def settled(upload):
    carry(upload)
    Job.objects.filter(pk=upload.job_id).update(state=JobState.SUCCEEDED)
    upload.refresh_from_db()
    return upload


def text_of(answer) -> str:
    return answer.content.decode()


def test_the_desk_shows_the_sheet_and_what_would_happen(made, as_, at, odd):
    text = text_of(as_("coordinator").get(at("desk", odd.pk)))
    for said in ('id="cell-D2"', "refused", 'name="header:"', "No table was recognised"):
        assert said in text


def test_corrections_show_their_outcome_and_write_nothing(made, as_, at, odd):
    client = as_("coordinator")
    answer = client.post(at("desk_look", odd.pk), FIXES | WELL, headers={"hx-request": "true"})
    text = text_of(answer)
    assert answer.context["outcome"] == "imported_with_findings"
    assert ("results", 4) in answer.context["counts"]
    assert "<html" not in text
    assert 'hx-swap-oob="true"' in text
    assert "set by" in text
    assert '<option value="TOC" selected>' in text
    odd.refresh_from_db()
    assert (odd.outcome, odd.answers) == ("refused", {})
    assert "<html" in text_of(client.post(at("desk_look", odd.pk), FIXES | WELL))


def test_a_header_row_alone_lists_every_column(made, as_, at, odd):
    answer = as_("coordinator").post(at("desk_look", odd.pk), {"header:": "1", **WELL})
    (table,) = answer.context["tables"]
    assert [(one.letter, one.header, one.field) for one in table.columns][1:4] == [
        ("B", "Probe no", ""), ("C", "Lvl", ""), ("D", "Kero-C", "")]  # fmt: skip


def test_a_unit_of_another_field_is_left_behind(made, as_, at, odd):
    answer = as_("coordinator").post(at("desk_look", odd.pk), FIXES | WELL | {"field:D1": "TMAX", "in:D1": "wt%"})
    column = next(one for one in answer.context["tables"][0].columns if one.letter == "D")
    assert (column.field, column.said_unit, column.units) == ("TMAX", "", ["degC"])


def test_storing_from_the_desk_lands_the_file(made, as_, at, odd):
    answer = as_("coordinator").post(at("desk_store", odd.pk), FIXES | WELL | {"remember": "on"})
    assert answer["Location"] == at("upload", odd.pk)
    odd.refresh_from_db()
    assert odd.outcome == "received"
    assert settled(odd).outcome == "imported_with_findings"
    assert RememberedLayout.objects.get().laboratory_name == "North Lab"
    page = text_of(as_("interpreter").get(at("desk", odd.pk)))
    assert "How it ended" in page
    assert "Store it" not in page
    assert "set by coordinator" in page or f"set by {made.person('coordinator').username}" in page


def test_a_file_is_withdrawn_and_says_so(made, as_, at, odd):
    client = as_("analyst")
    assert "nothing of it was stored" in text_of(client.post(at("upload_withdraw", odd.pk), follow=True))
    odd.refresh_from_db()
    assert odd.outcome == Upload.Outcome.WITHDRAWN
    assert "is withdrawn" in text_of(client.post(at("desk_store", odd.pk), FIXES, follow=True))


def test_a_question_is_answered_on_the_desk_and_asked_again(made, as_, at):
    content = b"Well,Depth (m),TOC\nQuill 1,5,0.9\nQuill 1,6,0.8\n"
    user = made.person("coordinator")
    upload = settled(
        services.receive(project=made.scene.project, name="q.csv", content=content, user=user, create_wells=True)
    )
    client = as_("coordinator")
    page = client.get(at("desk", upload.pk))
    assert [one["id"] for one in page.context["questions"]] == ["unit:C"]
    sent = {"answer:unit:C": "fraction", "create_wells": "on"}
    answered = client.post(at("desk_look", upload.pk), sent)
    assert (answered.context["outcome"], answered.context["given"]) == ("imported", [("unit:C", "fraction")])
    again = client.post(at("desk_look", upload.pk), sent | {"ask_again": "unit:C"})
    assert again.context["outcome"] == "waiting"


def test_looking_first_leads_to_the_desk(made, as_, at):
    client = as_("analyst")
    content = io.BytesIO(b"Well,Depth (m),TOC (wt%)\nQuill 2,2100,1.5\n")
    content.name = "toc.csv"
    client.post(at("uploads"), {"lab_files": [content], "look": "on"})
    upload = settled(Upload.objects.latest("pk"))
    assert upload.outcome == "waiting"
    assert client.get(at("upload_progress", upload.pk))["HX-Redirect"] == at("desk", upload.pk)
    assert "Store it" in text_of(client.get(at("desk", upload.pk)))


def test_a_file_that_is_read_now_has_no_desk_yet(made, as_, at):
    upload = services.receive(
        project=made.scene.project, name="new.csv", content=ODD.encode() + b"x", user=made.person("analyst")
    )
    assert as_("analyst").get(at("desk", upload.pk))["Location"] == at("upload", upload.pk)


def test_an_unreadable_file_still_has_its_findings(made, as_, at, odd):
    default_storage.delete(odd.source_file.stored_as)
    default_storage.save(odd.source_file.stored_as, io.BytesIO(b"%PDF-1.4"))
    answer = as_("interpreter").get(at("desk", odd.pk))
    assert "cannot be shown" in text_of(answer)


def test_a_long_sheet_is_shown_in_parts_with_its_findings(made, as_, at):
    rows = "".join(f"Quill 1,{2000 + at},{'bad' if at == 240 else 1.5}\n" for at in range(300))
    user = made.person("coordinator")
    upload = settled(services.receive(
        project=made.scene.project, name="long.csv", content=b"Well,Depth (m),TOC (wt%)\n" + rows.encode(), user=user,
        create_wells=True,
    ))  # fmt: skip
    client = as_("coordinator")
    shown = client.get(at("desk", upload.pk)).context["grid"]
    numbers = [line.number for line in shown.lines]
    assert (shown.first, shown.last, shown.total, shown.before, shown.after) == (1, 100, 301, 0, 101)
    assert 242 in numbers and 200 not in numbers
    assert client.get(at("desk", upload.pk), {"from": "201"}).context["grid"].first == 201


def test_remembered_layouts_are_listed_and_forgotten(made, as_, at):
    kept = RememberedLayout.objects.create(
        project=made.scene.project, laboratory_name="North Lab", fingerprint="a" * 64, headers="Lvl | Kero-C",
        made_by=made.person("analyst"),
        mapping={"header_height": 1, "columns": [{"offset": 1, "header": "Kero-C", "field": "TOC", "unit": "wt%"}]},
    )  # fmt: skip
    client = as_("analyst")
    assert "Kero-C is TOC in wt%" in text_of(client.get(at("layouts")))
    assert "Forgotten" in text_of(client.post(at("layout_forget", kept.pk), follow=True))
    assert not RememberedLayout.objects.exists()


def test_an_empty_workbook_is_downloaded(made, as_, at):
    answer = as_("interpreter").get(at("template_out", "pyrolysis"))
    assert load_workbook(io.BytesIO(answer.content)).sheetnames == ["Results"]
    assert as_("interpreter").get(at("template_out", "alchemy")).status_code == 404
    assert at("template_out", "core") in text_of(as_("interpreter").get(at("uploads")))


def test_what_is_not_ready_is_kept_for_later(made, as_, at, odd):
    client = as_("coordinator")
    client.post(at("desk_store", odd.pk), FIXES | WELL | {"field:D1": "TMAX", "keep": "on"})
    odd.refresh_from_db()
    assert "confirm" not in odd.answers
    assert settled(odd).outcome == "waiting"
    page = client.get(at("desk", odd.pk))
    assert '<option value="TMAX" selected>' in text_of(page)
    client.post(at("desk_store", odd.pk), FIXES | WELL)
    odd.refresh_from_db()
    assert settled(odd).outcome == "imported_with_findings"


def test_header_rows_are_proposed_where_none_is_recognised(made, as_, at, odd):
    (tab,) = as_("coordinator").get(at("desk", odd.pk)).context["tabs"]
    assert (tab.recognised, tab.likely) == ("", "1")


def test_a_well_is_chosen_from_the_list_or_written(made, as_, at):
    user = made.person("coordinator")
    upload = settled(services.receive(
        project=made.scene.project, name="no well.csv", content=b"Depth (m),TOC (wt%)\n5,0.9\n", user=user
    ))  # fmt: skip
    client = as_("coordinator")
    well = made.well.name
    for given in (["", well], [well, ""]):
        answer = client.post(at("desk_look", upload.pk), {"answer:well": given})
        assert (answer.context["outcome"], answer.context["given"]) == ("imported", [("well", well)])


def test_a_table_on_its_side_is_marked_and_mapped_by_rows(made, as_, at):
    content = b"Sample,A,B,C\nDepth (m),5,6,7\nFlame,3,4,5\nTOC (wt%),1,2,3\n"
    user = made.person("coordinator")
    upload = settled(services.receive(
        project=made.scene.project, name="side.csv", content=content, user=user, look=True, well=made.well.name
    ))  # fmt: skip
    page = as_("coordinator").get(at("desk", upload.pk))
    (table,) = page.context["tables"]
    assert [(one.letter, one.header, one.field, one.field_name) for one in table.columns][2] == (
        "3",
        "Flame",
        "",
        "field:A3",
    )
    assert 'id="cell-A3" tabindex="-1" class="found-note in-head is-left"' in text_of(page)
    answer = as_("coordinator").post(at("desk_look", upload.pk), {"field:A3": "S2", "well": made.well.name})
    assert ("results", 6) in answer.context["counts"]


def test_a_large_file_is_read_again_only_when_asked(made, as_, at, monkeypatch):
    content = b"Well,Depth (m),TOC (wt%)\n" + b"".join(b"Quill 1,%d,1.5\n" % (2000 + at) for at in range(120))
    user = made.person("coordinator")
    upload = settled(services.receive(
        project=made.scene.project, name="large.csv", content=content, user=user, look=True, create_wells=True
    ))  # fmt: skip
    monkeypatch.setattr(pages, "INSTANT_CELLS", 100)
    looks = []
    plain = pages.services.look
    monkeypatch.setattr(pages.services, "look", lambda *args: looks.append(args) or plain(*args))
    client = as_("coordinator")
    first = client.get(at("desk", upload.pk))
    assert (first.context["lands"], first.context["counted"], looks) == (True, False, [])
    assert "hx-post" not in text_of(first)
    sent = {"create_wells": "on", "field:C1": "TC"}
    seen = client.post(at("desk_look", upload.pk), sent | {"look": "on"})
    assert ("results", 120) in seen.context["counts"]
    turned = client.post(at("desk_look", upload.pk), sent | {"from": "101"})
    assert (turned.context["grid"].first, turned.context["tables"][0].columns[2].field, len(looks)) == (101, "TC", 1)
    client.post(at("desk_look", upload.pk), sent | {"field:C1": "TIC"})
    assert len(looks) == 2
