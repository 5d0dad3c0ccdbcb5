"""Laboratory files: bringing them in, what was found in each, and the questions a person answers."""

from typing import Any

from django import forms
from django.contrib import messages
from django.core.files.storage import default_storage
from django.core.files.uploadedfile import UploadedFile
from django.http import FileResponse, HttpRequest, HttpResponse
from django.shortcuts import redirect, render
from django.urls import reverse
from django.views.decorators.http import require_http_methods, require_POST, require_safe

from labdata.access import Action, visible
from labdata.errors import KerogateError, NotFound
from labdata.intake import templates_out
from labdata.intake.services import answer_questions, receive
from labdata.models import Project, SourceFile, Upload
from labdata.pages.common import find, open_project, page_of, person
from labdata.pages.files import FilesField
from labdata.pages.sheet_extract import preview

LEVELS = ("error", "warning", "note")
#: Counts of an answer as the page names them, in its order.
COUNT_WORDS = {
    "results": "results", "analyses": "analyses", "samples_new": "new samples", "samples_matched": "known samples",
    "wells_new": "new wells", "qualified": "results with < > or ~", "blank": "blank cells", "named": "cells in findings",
}  # fmt: skip
LEAVE_BLANK = "cell:"  # an error about a cell may be answered with "blank"
READ_AGAIN = (Upload.Outcome.WAITING, Upload.Outcome.REFUSED, Upload.Outcome.FAILED)
IMPORTED = (Upload.Outcome.IMPORTED, Upload.Outcome.IMPORTED_WITH_FINDINGS)


class AgainForm(forms.Form):
    """What the person knows about a file."""

    lab = forms.CharField(label="Laboratory", max_length=160, required=False)
    well = forms.CharField(
        max_length=120, required=False, help_text="Only for a file that has no well column: the well it is about."
    )
    create_wells = forms.BooleanField(
        label="Make wells that are not known yet", required=False,
        help_text="Otherwise an unknown well is an error, which catches misspelt names.",
    )  # fmt: skip


class UploadForm(AgainForm):
    """Files and what the person knows about them."""

    lab_files = FilesField(
        label="Laboratory files",
        help_text="Tables as the laboratory sent them: .xlsx, .xlsm, .xls, .ods, .csv, .tsv or .txt; gamma logs as .las. "
        "Drop them here or choose them; what they hold is decided by content, not by name.",
    )
    look = forms.BooleanField(
        label="Look before storing", required=False,
        help_text="The file is read and waits on the mapping desk until you say «store it».",
    )  # fmt: skip


@require_http_methods(["GET", "POST"])
def uploads(request: HttpRequest, slug: str) -> HttpResponse:
    """The list, newest first, by outcome if asked; the form for those who may bring files in."""
    project = open_project(request, slug, Action.UPLOAD if request.method == "POST" else Action.VIEW)
    form = UploadForm(request.POST, request.FILES) if request.method == "POST" else UploadForm()
    if form.is_valid():
        received = _receive_all(request, project, form)
        if len(received) == 1:
            return redirect("upload", slug, received[0].pk)
        if received:
            return redirect("uploads", slug)
    rows = visible(request.user, Upload.objects.filter(project=project)).select_related("created_by", "report")
    outcome = request.GET.get("outcome", "")
    if outcome in Upload.Outcome.values:
        rows = rows.filter(outcome=outcome)
    context = {
        "form": form, "page": page_of(request, rows), "outcome": outcome, "outcomes": Upload.Outcome.choices,
        "labs": project.laboratories.values_list("name", flat=True), "wells": project.wells.values_list("name", flat=True),
        "templates": templates_out.methods(),
    }  # fmt: skip
    return render(request, "uploads/uploads.html", context)


def _receive_all(request: HttpRequest, project: Project, form: UploadForm) -> list[Upload]:
    """Receive each file on its own; a refused one is named on the form and does not stop the others."""
    asked = form.cleaned_data
    received = []
    for file in asked["lab_files"]:
        try:
            received.append(_receive(request, project, file, asked))
        except KerogateError as refusal:
            form.add_error("lab_files", f"{file.name}: {refusal}")
            messages.error(request, f"{file.name}: {refusal}")
    return received


def _receive(request: HttpRequest, project: Project, file: UploadedFile, asked: dict[str, Any]) -> Upload:
    return receive(
        project=project, name=file.name or "unnamed", content=file.read(), user=person(request),
        lab=asked["lab"], well=asked["well"], create_wells=asked["create_wells"], look=asked["look"],
    )  # fmt: skip


def find_upload(request: HttpRequest, project: Project, pk: int) -> Upload:
    """The upload with what its pages show of it. Raises NotFound."""
    rows = visible(request.user, Upload.objects.filter(project=project))
    return find(
        rows.select_related("source_file", "report__supersedes", "job", "created_by", "project"), "upload", pk=pk
    )


@require_safe
def upload(request: HttpRequest, slug: str, pk: int) -> HttpResponse:
    """The mapping desk: what was recognised, what was found, and what is asked."""
    project = open_project(request, slug)
    return render(request, "uploads/upload.html", _desk(find_upload(request, project, pk)))


def _desk(at_hand: Upload) -> dict[str, Any]:
    findings, counts = at_hand.answer.get("findings", []), at_hand.answer.get("counts", {})
    amends = at_hand.report is not None and at_hand.report.supersedes_id is not None
    busy = is_busy(at_hand)
    return {
        "upload": at_hand,
        "tables": at_hand.answer.get("tables", []),
        "counts": [(words, counts.get(name, 0)) for name, words in COUNT_WORDS.items()],
        "levels": [(level, _grouped(findings, level)) for level in LEVELS],
        "questions": [one for one in findings if one["level"] == "question"],
        "difference": at_hand.report.difference if at_hand.report and amends else {},
        "landed": at_hand.outcome in IMPORTED,
        "busy": busy,
        "may_read_again": not busy and at_hand.outcome in READ_AGAIN,
    }


def _grouped(findings: list[dict[str, Any]], level: str) -> list[dict[str, Any]]:
    """Findings of a level; those that say the same are one row with all their places."""
    rows: dict[tuple[str, str, str], dict[str, Any]] = {}
    for one in findings:
        if one["level"] == level:
            row = rows.setdefault((one["message"], one["remedy"], one["value"]), {**one, "places": []})
            place = f"{one['sheet']}!{one['cell']}" if one["sheet"] and one["cell"] else one["sheet"] or one["cell"]
            row["places"].append(place)
            row["leave_blank"] = level == "error" and one["id"].startswith(LEAVE_BLANK)
    return list(rows.values())


def is_busy(at_hand: Upload) -> bool:
    """The file is being read now, for the first time or again after answers."""
    return at_hand.job is not None and not at_hand.job.settled


@require_safe
def upload_progress(request: HttpRequest, slug: str, pk: int) -> HttpResponse:
    """How far the reading is, for polling; then the page again, or the desk for a file that one wants to look at first."""
    at_hand = find_upload(request, open_project(request, slug), pk)
    response = render(request, "jobs/_progress.html", {"job": at_hand.job})
    if not is_busy(at_hand):
        if at_hand.options.get("look") and at_hand.outcome in READ_AGAIN and "confirm" not in at_hand.answers:
            response["HX-Redirect"] = reverse("desk", args=[slug, pk])
        else:
            response["HX-Refresh"] = "true"
    return response


@require_safe
def upload_sheet(request: HttpRequest, slug: str, pk: int, table: int) -> HttpResponse:
    """A recognised table as it stands in the sheet; loaded after the page, since the file is read once more."""
    at_hand = find_upload(request, open_project(request, slug), pk)
    tables = at_hand.answer.get("tables", [])
    if table >= len(tables):
        raise NotFound(f"No table {table + 1} was found in this file.", remedy="Load the page again.")
    try:
        sheet = preview(at_hand.source_file, tables[table], at_hand.answer.get("findings", []))
        trouble = ""
    except (KerogateError, OSError) as found:
        sheet, trouble = None, str(found)
    name = "uploads/_sheet.html" if request.headers.get("HX-Request") else "uploads/sheet.html"
    return render(request, name, {"upload": at_hand, "sheet": sheet, "trouble": trouble, "table": tables[table]})


@require_POST
def upload_answer(request: HttpRequest, slug: str, pk: int) -> HttpResponse:
    """Take the answers given; the file is read again with them."""
    at_hand = find_upload(request, open_project(request, slug, Action.UPLOAD), pk)
    findings = at_hand.answer.get("findings", [])
    asked = [one["id"] for one in findings if one["level"] == "question" or one["id"].startswith(LEAVE_BLANK)]
    answers = {name: request.POST.get(f"answer:{name}", "").strip() for name in asked}
    given = {name: answer for name, answer in answers.items() if answer}
    if not given:
        messages.error(request, "No answer was chosen. Choose one for at least one question.")
    else:
        answer_questions(upload=at_hand, user=person(request), answers=given)
        messages.success(request, "Thank you: the file is read again with your answers.")
    return redirect("upload", slug, pk)


@require_POST
def upload_again(request: HttpRequest, slug: str, pk: int) -> HttpResponse:
    """Bring the same bytes in once more, with other particulars; the answers given so far go with them."""
    project = open_project(request, slug, Action.UPLOAD)
    before = find_upload(request, project, pk)
    form = AgainForm(request.POST)
    form.full_clean()
    with default_storage.open(before.source_file.stored_as) as stored:
        content = stored.read()
    made = receive(
        project=project, name=before.file_name, content=content, user=person(request), answers=before.answers,
        **form.cleaned_data,
    )  # fmt: skip
    return redirect("upload", slug, made.pk)


@require_safe
def file_download(request: HttpRequest, slug: str, pk: int) -> FileResponse:
    """The laboratory's file, byte for byte."""
    project = open_project(request, slug)
    file = find(visible(request.user, SourceFile.objects.filter(project=project)), "file", pk=pk)
    return FileResponse(default_storage.open(file.stored_as), as_attachment=True, filename=file.name)
