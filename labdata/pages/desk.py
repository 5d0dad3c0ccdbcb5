"""The mapping desk: a file's sheets with what was recognised, corrections and their outcome at once, storing or walking away."""

from dataclasses import dataclass, replace
from typing import Any

from django.contrib import messages
from django.core.files.storage import default_storage
from django.http import HttpRequest, HttpResponse
from django.shortcuts import redirect, render
from django.views.decorators.http import require_POST, require_safe

from labdata.access import Action, actions, visible
from labdata.errors import KerogateError
from labdata.intake import desk as services
from labdata.intake import layouts as memory
from labdata.intake import templates_out, workbook
from labdata.intake.corrections import FIELD, LEAVE_OUT, UNIT, is_correction, unit_options
from labdata.intake.preparing import CONFIRM
from labdata.models import RememberedLayout, SourceFile, Upload
from labdata.pages.common import find, open_project, page_of, person
from labdata.pages.desk_sheet import field_choices, grid, mapped_tables, tabs
from labdata.pages.uploads import COUNT_WORDS, IMPORTED, LEAVE_BLANK, find_upload, is_busy

SHOWN_FINDINGS = 60
INSTANT_CELLS = 200_000  # a file with more cells is read again only when the button says so, not at each change
KEPT_BOOKS, KEPT_BYTES = 2, 4_000_000
# The last look at a large file, for turning its pages; the files last looked at, so that a change need not read again.
_looks: "dict[tuple[Any, ...], _Seen]" = {}
_books: dict[str, workbook.Workbook] = {}


@require_safe
def desk(request: HttpRequest, slug: str, pk: int) -> HttpResponse:
    """The file as it stands: what was stored, or what would be with the corrections made so far."""
    at_hand = find_upload(request, open_project(request, slug), pk)
    if is_busy(at_hand):
        return redirect("upload", slug, pk)
    return render(request, "uploads/desk.html", _shown(request, at_hand, services.Draft.of(at_hand), request.GET))


@require_POST
def desk_look(request: HttpRequest, slug: str, pk: int) -> HttpResponse:
    """The outcome of what the form holds; nothing is written. The form alone for a script, else the whole page."""
    at_hand = find_upload(request, open_project(request, slug, Action.UPLOAD), pk)
    if is_busy(at_hand):
        return redirect("upload", slug, pk)
    context = _shown(request, at_hand, _draft(request), request.POST)
    by_script = request.headers.get("HX-Request") == "true"
    return render(request, "uploads/_desk.html" if by_script else "uploads/desk.html", {**context, "alone": by_script})


@require_POST
def desk_store(request: HttpRequest, slug: str, pk: int) -> HttpResponse:
    """Store the file with what the form holds, or only keep that with it; a refusal is said on the file's page."""
    at_hand = find_upload(request, open_project(request, slug, Action.UPLOAD), pk)
    keep = "keep" in request.POST
    try:
        services.store_with(upload=at_hand, user=person(request), draft=_draft(request), keep=keep)
    except KerogateError as refusal:
        messages.error(request, str(refusal))
    else:
        what = (
            "kept with the file; nothing is stored yet." if keep else "used: the file is read again and stored with it."
        )
        messages.success(request, f"Your mapping is {what}")
    return redirect("upload", slug, pk)


@require_POST
def upload_withdraw(request: HttpRequest, slug: str, pk: int) -> HttpResponse:
    """Walk away from a file that has not landed."""
    at_hand = find_upload(request, open_project(request, slug, Action.UPLOAD), pk)
    services.withdraw(upload=at_hand, user=person(request))
    messages.success(request, f"«{at_hand.file_name}» was withdrawn; nothing of it was stored.")
    return redirect("upload", slug, pk)


def _draft(request: HttpRequest) -> services.Draft:
    """What the form holds; of several inputs of one name the last that is filled. A unit that does not go with the field chosen beside it is left behind."""
    post, answers = request.POST, {}
    for name in post:
        told = next((text.strip() for text in reversed(post.getlist(name)) if text.strip()), "")
        if told and is_correction(name):
            answers[name] = told
        elif told and name.startswith("answer:"):
            answers[name.removeprefix("answer:")] = told
    for id_ in post.getlist("ask_again"):
        answers.pop(id_, None)
    for name in [name for name in answers if name.startswith(UNIT)]:
        code = answers.get(FIELD + name.removeprefix(UNIT), "")
        if code and answers[name] not in unit_options(code):
            del answers[name]
    return services.Draft(
        answers, post.get("lab", ""), post.get("well", ""), "create_wells" in post, "remember" in post
    )


def _shown(request: HttpRequest, at_hand: Upload, draft: services.Draft, place: Any) -> dict[str, Any]:
    """Everything that the page shows. ``place``: where sheet and first row are asked for."""
    editing = Action.UPLOAD in actions(request.user, at_hand.project) and services.is_open(at_hand)
    book = _book(at_hand.source_file)
    size = sum(len(sheet.rows) * max(map(len, sheet.rows), default=0) for sheet in book.sheets) if book else 0
    instant = size <= INSTANT_CELLS
    seen = _see(request, at_hand, draft, book, instant) if editing else _as_read(at_hand)
    entry = seen.entry
    context = {
        "instant": instant, "laboratory": seen.laboratory, "trouble": seen.trouble, "counted": seen.counted,
        "lands": entry["outcome"] in IMPORTED, "upload": at_hand, "editing": editing, "outcome": entry["outcome"], "draft": draft,
        "counts": [(words, entry["counts"].get(name, 0)) for name, words in COUNT_WORDS.items()],
        "questions": [one for one in entry["findings"] if one["level"] == "question" and one["id"] != CONFIRM],
        "given": [(id_, text) for id_, text in draft.answers.items() if not is_correction(id_) and id_ != CONFIRM],
        "fields": field_choices(), "leave_out": LEAVE_OUT,
    }  # fmt: skip
    return context | (_sheets(book, entry, draft, place) if book else {"findings": _findings(entry, {})})


def _sheets(book: workbook.Workbook, entry: dict[str, Any], draft: services.Draft, place: Any) -> dict[str, Any]:
    """The sheet at hand as a grid, all sheets as tabs, all tables with their columns."""
    current = _current(book, entry, place)
    tables = mapped_tables(book, entry, dict(draft.answers))
    numbers = {sheet.name: number for number, sheet in enumerate(book.sheets)}
    return {
        "sheet": current,
        "sheet_name": book.sheets[current].name,
        "tabs": tabs(book, entry, dict(draft.answers), current),
        "tables": tables,
        "grid": grid(book.sheets[current], tables, entry, _number(place.get("from"), 1)),
        "findings": _findings(entry, numbers),
    }


@dataclass(frozen=True)
class _Seen:
    """The contract's entry of a file as it is or would be stored. ``counted`` is False when nobody has counted yet."""

    entry: dict[str, Any]
    laboratory: str
    trouble: str = ""
    counted: bool = True


def _as_read(at_hand: Upload) -> _Seen:
    """The entry that reading the file gave last; one that only waits for a look would land."""
    nothing: dict[str, Any] = {"tables": [], "findings": [], "counts": {}, "outcome": at_hand.outcome}
    entry = {**nothing, **at_hand.answer}
    if {one["id"] for one in entry["findings"] if one["level"] in {"error", "question"}} == {CONFIRM}:
        entry["outcome"] = str(Upload.Outcome.IMPORTED_WITH_FINDINGS)
        return _Seen(entry, at_hand.laboratory_name, counted=False)
    return _Seen(entry, at_hand.laboratory_name)


def _see(
    request: HttpRequest, at_hand: Upload, draft: services.Draft, book: workbook.Workbook | None, instant: bool
) -> _Seen:
    """The outcome of the draft. A large file is read for it only when the button asks, or when the draft was not seen yet."""
    key = (at_hand.pk, repr(sorted(draft.answers.items())), draft.lab, draft.well, draft.create_wells)
    if not instant:
        if request.method == "GET" and at_hand.answer:
            return _as_read(at_hand)
        if key in _looks and "look" not in request.POST:
            return _looks[key]
    try:
        prepared, counts = services.look(at_hand, draft, person(request), book)
    except KerogateError as refusal:
        return replace(_as_read(at_hand), trouble=str(refusal))
    seen = _Seen(prepared.entry(counts, prepared.number), prepared.laboratory)
    if not instant:
        _looks.clear()
        _looks[key] = seen
    return seen


def _findings(entry: dict[str, Any], numbers: dict[str, int]) -> list[dict[str, Any]]:
    """Findings with the number of their sheet, gravest first; questions have a place of their own."""
    shown = [
        {
            **one,
            "sheet_number": numbers.get(one["sheet"]),
            "leave_blank": one["level"] == "error" and one["id"].startswith(LEAVE_BLANK),
        }
        for one in entry["findings"]
        if one["id"] != CONFIRM
    ]
    return shown[:SHOWN_FINDINGS] + [{"rest": len(shown) - SHOWN_FINDINGS}] * (len(shown) > SHOWN_FINDINGS)


def _current(book: workbook.Workbook, entry: dict[str, Any], place: Any) -> int:
    """The sheet asked for, else the first with a table."""
    with_tables = [table["sheet"] for table in entry["tables"]]
    first = next((at for at, sheet in enumerate(book.sheets) if sheet.name in with_tables), 0)
    asked = _number(place.get("go") or place.get("sheet"), first)
    return asked if 0 <= asked < len(book.sheets) else first


def _number(text: Any, otherwise: int) -> int:
    return int(text) if text and str(text).isascii() and str(text).isdigit() and len(str(text)) < 8 else otherwise


def _book(file: SourceFile) -> workbook.Workbook | None:
    """The file's sheets, from memory when it was looked at just before; None when it cannot be read."""
    if file.sha256 in _books:
        return _books[file.sha256]
    try:
        with default_storage.open(file.stored_as) as stored:
            book = workbook.read(file.name, stored.read())
    except (KerogateError, OSError):
        return None
    if file.size <= KEPT_BYTES:
        _books[file.sha256] = book
        for oldest in list(_books)[:-KEPT_BOOKS]:
            _books.pop(oldest, None)
    return book


@require_safe
def layouts(request: HttpRequest, slug: str) -> HttpResponse:
    """Mappings that people corrected, by laboratory."""
    project = open_project(request, slug)
    rows = visible(request.user, RememberedLayout.objects.filter(project=project)).select_related("made_by")
    return render(request, "uploads/layouts.html", {"page": page_of(request, rows)})


@require_POST
def layout_forget(request: HttpRequest, slug: str, layout: int) -> HttpResponse:
    """Forget one; the next such file is read as recognised."""
    project = open_project(request, slug, Action.UPLOAD)
    rows = visible(request.user, RememberedLayout.objects.filter(project=project)).select_related("project")
    memory.forget(layout=find(rows, "remembered layout", pk=layout), user=person(request))
    messages.success(request, "Forgotten; the next file of this layout is read as recognised.")
    return redirect("layouts", slug)


@require_safe
def template_out(request: HttpRequest, slug: str, method: str) -> HttpResponse:
    """The empty workbook of a method."""
    open_project(request, slug)
    answer = HttpResponse(
        templates_out.build(method), content_type="application/vnd.openxmlformats-officedocument.spreadsheetml.sheet"
    )
    answer["Content-Disposition"] = f'attachment; filename="{method}-empty.xlsx"'
    return answer
