"""Laboratory files: bringing them in, what was found in each, and the questions a person answers."""

from typing import Any

from django import forms
from django.contrib import messages
from django.core.files.storage import default_storage
from django.core.files.uploadedfile import UploadedFile
from django.http import FileResponse, HttpRequest, HttpResponse
from django.shortcuts import redirect, render
from django.views.decorators.http import require_http_methods, require_POST, require_safe

from labdata.access import Action, visible
from labdata.errors import KerogateError
from labdata.intake.services import answer_questions, receive
from labdata.models import Project, SourceFile, Upload
from labdata.pages.common import find, open_project, page_of, person
from labdata.pages.files import FilesField

LEVELS = ("error", "question", "warning", "note")
IMPORTED = (Upload.Outcome.IMPORTED, Upload.Outcome.IMPORTED_WITH_FINDINGS)


class UploadForm(forms.Form):
    """Files and what the person knows about them."""

    files = FilesField(
        label="Laboratory files",
        help_text="Tables as the laboratory sent them: .xlsx, .xlsm, .xls, .csv, .tsv or .txt. "
        "Drop them here or choose them; what they hold is decided by content, not by name.",
    )
    lab = forms.CharField(label="Laboratory", max_length=160, required=False)
    well = forms.CharField(
        max_length=120, required=False, help_text="Only for a file that has no well column: the well it is about."
    )
    create_wells = forms.BooleanField(
        label="Make wells that are not known yet", required=False,
        help_text="Otherwise an unknown well is an error, which catches misspelt names.",
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
    }  # fmt: skip
    return render(request, "uploads/uploads.html", context)


def _receive_all(request: HttpRequest, project: Project, form: UploadForm) -> list[Upload]:
    """Receive each file on its own; a refused one is named on the form and does not stop the others."""
    asked = form.cleaned_data
    received = []
    for file in asked["files"]:
        try:
            received.append(_receive(request, project, file, asked))
        except KerogateError as refusal:
            form.add_error("files", f"{file.name}: {refusal}")
            messages.error(request, f"{file.name}: {refusal}")
    return received


def _receive(request: HttpRequest, project: Project, file: UploadedFile, asked: dict[str, Any]) -> Upload:
    return receive(
        project=project, name=file.name or "unnamed", content=file.read(), user=person(request),
        lab=asked["lab"], well=asked["well"], create_wells=asked["create_wells"],
    )  # fmt: skip


def _upload(request: HttpRequest, project: Project, pk: int) -> Upload:
    rows = visible(request.user, Upload.objects.filter(project=project))
    return find(
        rows.select_related("source_file", "report__supersedes", "job", "created_by", "project"), "upload", pk=pk
    )


@require_safe
def upload(request: HttpRequest, slug: str, pk: int) -> HttpResponse:
    """The mapping desk: what was recognised, what was found, and what is asked."""
    project = open_project(request, slug)
    return render(request, "uploads/upload.html", _desk(_upload(request, project, pk)))


def _desk(at_hand: Upload) -> dict[str, Any]:
    findings = at_hand.answer.get("findings", [])
    return {
        "upload": at_hand,
        "tables": at_hand.answer.get("tables", []),
        "counts": at_hand.answer.get("counts", {}),
        "levels": [(level, [one for one in findings if one["level"] == level]) for level in LEVELS],
        "questions": [one for one in findings if one["level"] == "question"],
        "difference": at_hand.report.difference if at_hand.report else {},
        "landed": at_hand.outcome in IMPORTED,
        "busy": _busy(at_hand),
    }


def _busy(at_hand: Upload) -> bool:
    """The file is being read now, for the first time or again after answers."""
    return at_hand.job is not None and not at_hand.job.settled


@require_safe
def upload_progress(request: HttpRequest, slug: str, pk: int) -> HttpResponse:
    """How far the reading is, for polling; the page is loaded again once it has ended."""
    at_hand = _upload(request, open_project(request, slug), pk)
    response = render(request, "jobs/_progress.html", {"job": at_hand.job})
    if not _busy(at_hand):
        response["HX-Refresh"] = "true"
    return response


@require_POST
def upload_answer(request: HttpRequest, slug: str, pk: int) -> HttpResponse:
    """Take the answers given; the file is read again with them."""
    at_hand = _upload(request, open_project(request, slug, Action.UPLOAD), pk)
    asked = [one["id"] for one in at_hand.answer.get("findings", []) if one["level"] == "question"]
    answers = {name: request.POST.get(f"answer:{name}", "").strip() for name in asked}
    given = {name: answer for name, answer in answers.items() if answer}
    if not given:
        messages.error(request, "No answer was chosen. Choose one for at least one question.")
    else:
        answer_questions(upload=at_hand, user=person(request), answers=given)
        messages.success(request, "Thank you: the file is read again with your answers.")
    return redirect("upload", slug, pk)


@require_safe
def file_download(request: HttpRequest, slug: str, pk: int) -> FileResponse:
    """The laboratory's file, byte for byte."""
    project = open_project(request, slug)
    file = find(visible(request.user, SourceFile.objects.filter(project=project)), "file", pk=pk)
    return FileResponse(default_storage.open(file.stored_as), as_attachment=True, filename=file.name)
