"""Wells, samples and results: what the pages show, what a coordinator may change, and what is refused."""

from datetime import timedelta

import pytest
from django.utils import timezone

from labdata.models import AuditEntry, CasingShoe, Result, Sample, Well
from labdata.registry.edits import HEADER
from labdata.registry.names import name_key
from qc.review.services import Choice, decide
from tests.release.scene import small_scene


def header(well: Well, **changes) -> dict:
    """The header form as it would be sent."""
    held = {name: getattr(well, name) for name in HEADER}
    return {
        name: "" if value is None else value for name, value in {**held, "reason": "survey found", **changes}.items()
    }


def test_a_well_is_found_by_any_of_its_names(made, as_, at):
    made.well.aliases.create(name="Old Quill", name_key="old quill")
    client = as_("interpreter")
    for asked in ("quill 2", "OLD QUILL", made.well.uwi[:5], "Alder"):
        assert made.well in client.get(at("wells"), {"q": asked}).context["page"].object_list
    nothing = client.get(at("wells"), {"q": "no such well"})
    assert "No well fits" in nothing.content.decode()


def test_wells_carry_their_counts(made, as_, at):
    rows = {well.name: well for well in as_("interpreter").get(at("wells")).context["page"]}
    assert (rows["Quill 2"].n_samples, rows["Quill 2"].n_analyses, rows["Quill 2"].n_flags) == (3, 6, 1)
    assert rows["Quill 1"].n_flags == 0


def test_the_well_page_tells_all_along_it(made, as_, at):
    text = as_("interpreter").get(at("well", made.well.pk)).content.decode()
    for said in (
        "3120.00",
        "kelly bushing",
        "Upper Shale",
        "9.625",
        "oil-based",
        "2010.00 – 2015.00",
        "s2_floor_for_tmax",
    ):
        assert said in text
    assert "Edit header" not in text


def test_a_header_is_changed_with_a_reason_and_leaves_a_trace(made, as_, at):
    answer = as_("coordinator").post(
        at("well_edit", made.well.pk), header(made.well, td_md_m="3150.5", name="Quill 2A")
    )
    assert answer.status_code == 302
    made.well.refresh_from_db()
    assert (made.well.td_md_m, made.well.name, made.well.name_key) == (3150.5, "Quill 2A", name_key("Quill 2A"))
    assert made.well.aliases.get().name == "Quill 2"
    entry = AuditEntry.objects.get(action="well.edited")
    assert (entry.before["td_md_m"], entry.after["td_md_m"], entry.reason) == (3120.0, 3150.5, "survey found")


@pytest.mark.parametrize(
    ("change", "said"),
    [
        ({"reason": ""}, "This field is required"),
        ({"td_md_m": "-5"}, "violated"),
        ({"td_md_m": "deep"}, "Enter a number"),
        ({"name": ""}, "This field is required"),
        ({"datum_kind": "XX"}, "Select a valid choice"),
    ],
)
def test_an_impossible_header_is_refused(made, as_, at, change, said):
    answer = as_("coordinator").post(at("well_edit", made.well.pk), header(made.well, **change))
    assert answer.status_code == 200
    assert said in answer.content.decode()
    made.well.refresh_from_db()
    assert made.well.td_md_m == 3120.0


def test_two_wells_do_not_share_an_identifier(made, as_, at):
    other = Well.objects.get(name="Quill 1")
    answer = as_("coordinator").post(at("well_edit", made.well.pk), header(made.well, uwi=other.uwi))
    assert answer.status_code == 200
    made.well.refresh_from_db()
    assert made.well.uwi != other.uwi


def test_a_casing_shoe_is_recorded_once_and_taken_out_with_a_reason(made, as_, at):
    client = as_("coordinator")
    shoe = {"casing-md_m": "2500", "casing-diameter_in": "7"}
    assert client.post(at("well_add", made.well.pk, "casing"), shoe).status_code == 302
    twice = client.post(at("well_add", made.well.pk, "casing"), shoe)
    assert "recorded already" in twice.content.decode()
    pk = CasingShoe.objects.get(md_m=2500).pk
    assert client.post(at("well_remove", made.well.pk, "casing", pk)).status_code == 400
    assert client.post(at("well_remove", made.well.pk, "casing", pk), {"reason": "another well's"}).status_code == 302
    assert AuditEntry.objects.get(action="well.casing_removed").before["md_m"] == 2500.0


@pytest.mark.parametrize(
    ("kind", "sent"),
    [
        ("mud", {"mud-top_md_m": "2000", "mud-base_md_m": "1000", "mud-kind": "oil"}),
        ("core", {"core-number": "2", "core-top_md_m": "2100", "core-base_md_m": "2100"}),
        ("station", {"station-md_m": "100", "station-inclination_deg": "200", "station-azimuth_deg": "0"}),
    ],
)
def test_what_cannot_lie_along_a_well_is_refused(made, as_, at, kind, sent):
    before = AuditEntry.objects.count()
    assert as_("coordinator").post(at("well_add", made.well.pk, kind), sent).status_code == 200
    assert AuditEntry.objects.count() == before


def test_an_unknown_kind_of_record_is_not_found(made, as_, at):
    assert as_("coordinator").post(at("well_add", made.well.pk, "treasure"), {}).status_code == 404


def test_custody_grows_and_is_never_in_the_future(made, as_, at):
    sample = made.result.analysis.sample
    client, address = as_("coordinator"), at("sample", sample.pk)
    now = timezone.now()
    sent = {"kind": "sent", "place": "Laboratory 1", "at": f"{now:%Y-%m-%dT%H:%M}"}
    assert client.post(address, sent).status_code == 302
    assert sample.custody.count() == 2
    late = client.post(address, {**sent, "at": f"{now + timedelta(days=2):%Y-%m-%dT%H:%M}"})
    assert "still to come" in late.content.decode()
    nowhere = client.post(address, {**sent, "place": "  "})
    assert nowhere.status_code == 200
    assert sample.custody.count() == 2


def test_the_sample_page_shows_depth_both_ways_and_how_to_handle_it(made, as_, at):
    text = as_("interpreter").get(at("sample", made.result.analysis.sample_id)).content.decode()
    for said in ("2010.00 – 2015.00 m MD", "2010 – 2015 m", "Core store", "hydrogen sulfide", "radioactive", "oil-based",
                 "qualified people"):  # fmt: skip
        assert said in text
    assert "Add to the chain" not in text


def test_the_result_page_outlines_the_cell_in_the_sheet(made, as_, at):
    answer = as_("interpreter").get(at("result", made.result.pk))
    sheet = answer.context["sheet"]
    marked = [(line.number, letter) for line in sheet.lines for letter, cell in zip(sheet.letters, line.cells, strict=False)
              if cell.mark == "this-cell"]  # fmt: skip
    assert marked == [(6, "F")]
    assert answer.context["address"] == "F6"


def test_the_result_page_stands_without_the_file(made, as_, at):
    made.result.column.table.report.source_file.__class__.objects.update(stored_as="files/gone")
    answer = as_("interpreter").get(at("result", made.result.pk))
    assert answer.status_code == 200
    assert "The sheet cannot be shown" in answer.content.decode()


def test_history_is_told_in_sentences(made, as_, at):
    geochemist = made.person("geochemist")
    held = made.scene.sets[1]
    decide(
        user=geochemist, review_set=held, choices=[Choice(made.result.pk, "rejected", "contamination", "mud filtrate")]
    )
    decide(user=geochemist, review_set=held, choices=[Choice(made.result.pk, "accepted")])
    said = [event.text for event in as_("interpreter").get(at("result", made.result.pk)).context["history"]]
    assert said[0].startswith("Imported from Sheet1!F6 of «file 2.xlsx» (report R-2 v1) as «6.0»")
    assert said[1].endswith("rejected it: contaminated, «mud filtrate».")
    assert said[2].endswith("accepted it.")
    signed = Result.objects.filter(analysis__sample__well__name="Quill 1").first()
    later = [event.text for event in as_("interpreter").get(at("result", signed.pk)).context["history"]]
    assert any("signed Quill 1 set 1" in text for text in later)
    assert any("went into release 1" in text for text in later)


def test_things_of_another_project_do_not_exist_here(made, as_, at):
    other = small_scene()
    client = as_("coordinator")
    theirs = Sample.objects.filter(well__project=other.project).first()
    assert client.get(at("sample", theirs.pk)).status_code == 404
    assert client.get(at("well", theirs.well_id)).status_code == 404
    assert client.get(at("result", Result.objects.filter(analysis__sample=theirs).first().pk)).status_code == 404
