"""Writing notes, from the review page and from a result's page, and the questions as a text to send."""

from typing import Any, cast

from django.contrib import messages
from django.contrib.auth.models import User
from django.http import HttpRequest, HttpResponse
from django.shortcuts import redirect
from django.urls import reverse
from django.views.decorators.http import require_POST, require_safe

from labdata.errors import InvalidInput
from labdata.pages.common import find
from qc.models import NoteKind, ReviewSet
from qc.review import notes
from qc.review.outgoing import as_file
from qc.review.requests import find_set, marks, takes_json, text

PLAIN = "text/plain; charset=utf-8"


@takes_json
def review_note(user: User, review_set: ReviewSet, body: dict[str, Any]) -> dict[str, Any]:
    """A note on a flag (``flags``: one pair of rule and fingerprint) or an answer (``answers``: the question)."""
    named = marks(body)
    answers = body.get("answers")
    if len(named) > 1 or not (answers is None or (isinstance(answers, int) and not isinstance(answers, bool))):
        raise InvalidInput("A note is about one thing.", remedy="Load the page again.")
    made = notes.write(
        user=user, review_set=review_set, text=text(body, "text"), kind=text(body, "kind"), answers=answers,
        flag=named[0] if named else None,
    )  # fmt: skip
    return {"note": made.pk}


@require_POST
def review_result_note(request: HttpRequest, slug: str, pk: int, result: int) -> HttpResponse:
    """A note from a result's page; what cannot be written is said there."""
    review_set, given = find_set(request, slug, pk), request.POST
    answers = given.get("answers", "")
    try:
        notes.write(
            user=cast(User, request.user), review_set=review_set, text=given.get("text", ""),
            kind=given.get("kind", NoteKind.NOTE), result_id=result, answers=int(answers) if answers.isdigit() else None,
        )  # fmt: skip
    except InvalidInput as refusal:
        messages.error(request, str(refusal))
    return redirect(f"{reverse('result', args=[slug, result])}#notes")


@require_safe
def review_question(request: HttpRequest, slug: str, pk: int, note: int) -> HttpResponse:
    """One question as a text."""
    review_set = find_set(request, slug, pk)
    asked = review_set.notes.filter(kind=NoteKind.QUESTION).select_related("written_by", "result")
    words = notes.letter(review_set, [find(asked, "question", pk=note)])
    return as_file(words.encode(), PLAIN, f"{review_set.well.name}-question-{note}.txt")


@require_safe
def review_questions(request: HttpRequest, slug: str, pk: int) -> HttpResponse:
    """All open questions of the set as one text."""
    review_set = find_set(request, slug, pk)
    words = notes.letter(review_set, notes.open_questions(review_set))
    return as_file(words.encode(), PLAIN, f"{review_set.well.name}-set-{review_set.number}-questions.txt")
