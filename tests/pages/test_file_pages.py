"""Files come in, ask, and are answered; jobs are watched; releases leave."""

import json

import pytest
from django.core.files.storage import default_storage
from django.core.files.uploadedfile import SimpleUploadedFile

from labdata.models import Job, JobState, Release, Report, Upload

CSV = b"Well,Depth (m),TOC (wt%)\nQuill 2,2100,1.5\n"


def file(content: bytes = CSV, name: str = "toc.csv") -> SimpleUploadedFile:
    return SimpleUploadedFile(name, content)


def test_a_file_is_received_and_its_page_shows_progress(made, as_, at):
    client = as_("analyst")
    answer = client.post(at("uploads"), {"lab_files": [file()], "lab": "Laboratory 9"})
    upload = Upload.objects.latest("pk")
    assert answer["Location"] == at("upload", upload.pk)
    assert (upload.laboratory_name, upload.outcome, upload.job.state) == ("Laboratory 9", "received", JobState.QUEUED)
    page = client.get(answer["Location"]).content.decode()
    assert at("upload_progress", upload.pk) in page
    assert "HX-Refresh" not in client.get(at("upload_progress", upload.pk))


def test_progress_ends_with_a_new_load_of_the_page(made, as_, at):
    answer = as_("analyst").get(at("upload_progress", made.upload.pk))
    assert answer["HX-Refresh"] == "true"


def test_several_files_come_in_at_once(made, as_, at):
    before = Upload.objects.count()
    answer = as_("analyst").post(at("uploads"), {"lab_files": [file(), file(CSV + b"Quill 2,2110,1.6\n", "more.csv")]})
    assert answer["Location"] == at("uploads")
    assert Upload.objects.count() == before + 2


@pytest.mark.parametrize(("sent", "said"), [({}, "This field is required"), ({"lab_files": [file(b"")]}, "empty")])
def test_no_file_and_an_empty_file_are_named(made, as_, at, sent, said):
    answer = as_("analyst").post(at("uploads"), sent)
    assert answer.status_code == 200
    assert said in answer.content.decode()


def test_an_analyst_does_not_make_wells(made, as_, at):
    answer = as_("analyst").post(at("uploads"), {"lab_files": [file()], "create_wells": "on"})
    assert answer.status_code == 200
    assert "may not register" in answer.content.decode()


def test_a_waiting_file_shows_its_questions_tables_and_findings(made, as_, at):
    text = as_("analyst").get(at("upload", made.upload.pk)).content.decode()
    for said in ("The column TOC names no unit.", 'value="fraction"', "A footnote mark follows the number.", "F7", "0.60",
                 "Not read: Analyst"):  # fmt: skip
        assert said in text


def test_an_answer_has_the_file_read_again(made, as_, at):
    client = as_("analyst")
    nothing = client.post(at("upload_answer", made.upload.pk), {}, follow=True)
    assert "No answer was chosen" in nothing.content.decode()
    client.post(at("upload_answer", made.upload.pk), {"answer:unit:Sheet1!H": "wt%", "answer:unasked": "x"})
    made.upload.refresh_from_db()
    assert (made.upload.answers, made.upload.outcome) == ({"unit:Sheet1!H": "wt%"}, "received")
    assert made.upload.job.state == JobState.QUEUED


def test_an_interpreter_sees_the_questions_and_does_not_answer(made, as_, at):
    text = as_("interpreter").get(at("upload", made.upload.pk)).content.decode()
    assert "A sample coordinator or analyst answers these" in text
    assert "Bring in files" not in as_("interpreter").get(at("uploads")).content.decode()


def test_uploads_are_listed_by_outcome(made, as_, at):
    names = [one.file_name for one in as_("analyst").get(at("uploads"), {"outcome": "waiting"}).context["page"]]
    assert names == ["TOC without unit.xlsx"]


def test_the_original_comes_back_byte_for_byte(made, as_, at):
    answer = as_("interpreter").get(at("file_download", made.upload.source_file_id))
    with default_storage.open(made.upload.source_file.stored_as) as stored:
        assert b"".join(answer.streaming_content) == stored.read()
    assert answer["Content-Disposition"].startswith("attachment")


def test_a_failed_job_says_why(made, as_, at):
    client = as_("geochemist")
    failed = Job.objects.get(state=JobState.FAILED)
    assert "The table could not be read." in client.get(at("job", failed.pk)).content.decode()
    assert [job.pk for job in client.get(at("jobs"), {"state": "failed"}).context["page"]] == [failed.pk]


def test_a_release_is_downloaded_in_every_format_and_shape(made, as_, at):
    client = as_("interpreter")
    for format_name in ("parquet", "csv", "json", "xlsx"):
        for shape in ("long", "wide"):
            answer = client.get(at("release_data", 1), {"format": format_name, "shape": shape})
            assert answer.status_code == 200
            assert int(answer["Content-Length"]) == len(b"".join(answer.streaming_content)) > 0
    assert json.loads(client.get(at("release_manifest", 1)).content)["counts"]["results"] == 15


def test_an_unknown_format_is_named_with_the_known_ones(made, as_, at):
    answer = as_("interpreter").get(at("release_data", 1), {"format": "docx"})
    assert answer.status_code == 400
    assert "«docx» is no format" in answer.content.decode()
    assert "parquet, csv" in answer.content.decode()


def test_a_release_is_withdrawn_with_a_reason_once(made, as_, at):
    client = as_("approver")
    assert "required" in client.post(at("release_withdraw", 1), {}).content.decode()
    assert client.post(at("release_withdraw", 1), {"reason": "wrong batch"}).status_code == 302
    assert "wrong batch" in client.get(at("release", 1)).content.decode()
    assert "withdrawn already" in client.post(at("release_withdraw", 1), {"reason": "again"}).content.decode()
    assert Release.objects.get(number=1).withdrawn_by == made.person("approver")


def test_a_release_is_asked_for_with_a_title(made, as_, at):
    client = as_("approver")
    assert client.post(at("release_new"), {"title": " "}).status_code == 200
    answer = client.post(at("release_new"), {"title": "Second look"})
    job = Job.objects.get(kind="release")
    assert answer["Location"] == at("job", job.pk)


def refused(made) -> Upload:
    """The waiting file as a refused one, with a cell that cannot be read and a well that is not known twelve times."""
    cell = {"level": "error", "id": "cell:Sheet1!F7", "code": "unreadable", "sheet": "Sheet1", "cell": "F7", "value": "n/k",
            "message": "S2 in cell F7 cannot be read.", "remedy": "Correct it."}  # fmt: skip
    wells = [{**cell, "id": f"well:{row}", "cell": f"A{row}", "value": "Quil 2", "message": "There is no well «Quil 2»."}
             for row in range(5, 20)]  # fmt: skip
    made.upload.outcome, made.upload.answer = "refused", {"tables": [], "findings": [cell, *wells]}
    made.upload.save()
    return made.upload


def test_errors_that_say_the_same_are_one_line(made, as_, at):
    answer = as_("analyst").get(at("upload", refused(made).pk))
    errors = dict(answer.context["levels"])["error"]
    assert [len(row["places"]) for row in errors] == [1, 15]
    assert "and 3 more" in answer.content.decode()
    assert "leave F7 out" in answer.content.decode()
    assert "leave A5 out" not in answer.content.decode()


def test_a_refused_file_is_read_again_without_a_cell(made, as_, at):
    as_("analyst").post(at("upload_answer", refused(made).pk), {"answer:cell:Sheet1!F7": "blank", "answer:well:5": "x"})
    made.upload.refresh_from_db()
    assert (made.upload.answers, made.upload.outcome) == ({"cell:Sheet1!F7": "blank"}, "received")


def test_a_file_is_read_again_with_other_particulars(made, as_, at):
    fresh = as_("coordinator").post(at("uploads"), {"lab_files": [file()]})["Location"]
    first = Upload.objects.latest("pk")
    Upload.objects.filter(pk=first.pk).update(outcome="refused")
    assert fresh == at("upload", first.pk)
    as_("coordinator").post(
        at("upload_again", first.pk), {"lab": "Laboratory 9", "well": "Quill 2", "create_wells": "on"}
    )
    again = Upload.objects.latest("pk")
    assert again.pk != first.pk
    assert again.source_file == first.source_file
    assert (again.laboratory_name, again.options["well"], again.options["create_wells"]) == (
        "Laboratory 9", "Quill 2", True)  # fmt: skip


def test_an_amended_report_tells_what_changed(made, as_, at):
    imported = Upload.objects.get(outcome="imported")
    report = imported.report
    other = Report.objects.exclude(pk=report.pk).first()
    report.supersedes, report.version = other, 2
    report.difference = {"changed": 1, "added": 0, "withdrawn": 0, "unchanged": 14, "values": [
        {"what": "changed", "sample": "S-1", "analyte": "S2", "was": "6.0", "now": "6.4"}]}  # fmt: skip
    report.save()
    text = as_("interpreter").get(at("upload", imported.pk)).content.decode()
    assert "which supersedes version 1" in text
    assert "6.4" in text


def test_a_recognised_table_is_shown_in_its_sheet(made, as_, at):
    client = as_("interpreter")
    sheet = client.get(at("upload_sheet", made.upload.pk, 0)).context["sheet"]
    assert dict(zip(sheet.letters, sheet.fields, strict=True))["F"] == "S2 mg/g"
    assert dict(zip(sheet.letters, sheet.fields, strict=True))["E"] == ""
    marked = {(line.number, letter): cell.mark for line in sheet.lines
              for letter, cell in zip(sheet.letters, line.cells, strict=False) if cell.mark}  # fmt: skip
    assert marked == {(1, "H"): "found-question", (7, "F"): "found-warning"}
    assert client.get(at("upload_sheet", made.upload.pk, 7)).status_code == 404


def test_the_sheet_comes_alone_when_htmx_asks(made, as_, at):
    answer = as_("interpreter").get(at("upload_sheet", made.upload.pk, 0), headers={"HX-Request": "true"})
    assert b"<html" not in answer.content
