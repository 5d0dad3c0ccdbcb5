"""The pages of this room and what they post. Each post is one service call; the services check everything."""

from typing import Any, cast

from django.contrib.auth.models import User
from django.http import HttpRequest, HttpResponse
from django.shortcuts import render
from django.urls import reverse
from django.views.decorators.http import require_GET, require_safe

from labdata.access import Action
from labdata.pages.common import find, open_project
from qc.models import Flag, ReasonCode, ReviewSet
from qc.review import figures, services
from qc.review.data import review_data as build_data
from qc.review.requests import answers_json, batch, choices, find_set, marks, takes_json, text, version
from qc.review.signing import MEANING_LENGTH
from qc.review.standing import flags_of, valid_signature
from qc.review.worklist import work_list

POSTS = ("decide", "accept", "undo", "answer", "sign", "reopen", "note")


@require_safe
def review_sets(request: HttpRequest, slug: str) -> HttpResponse:
    """The work list: what waits for whom."""
    project = open_project(request, slug, Action.VIEW)
    rows = work_list(project, cast(User, request.user))
    return render(request, "review/review_sets.html", {"rows": rows, "mine": [row for row in rows if row.for_me]})


@require_safe
def review(request: HttpRequest, slug: str, pk: int) -> HttpResponse:
    """The linked page of one set. Its scripts fetch ``review_data``."""
    review_set = find_set(request, slug, pk)
    context = {
        "review_set": review_set,
        "signature": valid_signature(review_set),
        "reasons": [(code.value, code.label) for code in ReasonCode if code],
        "meanings": services.MEANINGS,
        "meaning_length": MEANING_LENGTH,
        "markers": figures.MARKERS,
        "addresses": {name: reverse(f"review_{name}", args=[slug, pk]) for name in ("data", *POSTS)},
    }
    return render(request, "review/review.html", context)


@require_GET
@answers_json
def review_data(request: HttpRequest, slug: str, pk: int) -> dict[str, Any]:
    """Everything drawn; ``?version=N`` answers shortly while the set is still at N."""
    review_set = find_set(request, slug, pk)
    if request.GET.get("version") == str(review_set.version):
        return {"unchanged": True, "version": review_set.version}
    return build_data(review_set, cast(User, request.user))


@require_GET
@answers_json
def review_flag(request: HttpRequest, slug: str, pk: int, flag: int) -> dict[str, Any]:
    """One flag's evidence."""
    found: Flag = find(flags_of(find_set(request, slug, pk)), "flag", pk=flag)
    return {
        "id": found.pk, "rule": found.rule, "message": found.message, "evidence": found.evidence, "source": found.source,
    }  # fmt: skip


@takes_json
def review_decide(user: User, review_set: ReviewSet, body: dict[str, Any]) -> dict[str, Any]:
    made = services.decide(
        user=user, review_set=review_set, choices=choices(body), expected_version=version(body)
    )  # fmt: skip
    return {"batch": str(made)}


@takes_json
def review_accept(user: User, review_set: ReviewSet, body: dict[str, Any]) -> dict[str, Any]:
    made = services.accept_unflagged(user=user, review_set=review_set, expected_version=version(body))
    return {"batch": str(made)}


@takes_json
def review_undo(user: User, review_set: ReviewSet, body: dict[str, Any]) -> dict[str, Any]:
    return {"batch": str(services.undo(user=user, review_set=review_set, batch=batch(body)))}


@takes_json
def review_answer(user: User, review_set: ReviewSet, body: dict[str, Any]) -> dict[str, Any]:
    """Agree with flags or dismiss them; with ``results`` the verdict that follows is given in the same gesture."""
    rest = choices({**body, "text": body.get("answer_reason", "")}) if body.get("results") else []
    made = services.answer_flags(
        user=user, review_set=review_set, flags=marks(body), answer=text(body, "answer"),
        reason=text(body, "answer_reason"), choices=rest, expected_version=version(body),
    )  # fmt: skip
    return {"answered": len(made)}


@takes_json
def review_sign(user: User, review_set: ReviewSet, body: dict[str, Any]) -> dict[str, Any]:
    record = services.sign_off(
        user=user, review_set=review_set, password=text(body, "password"), meaning=text(body, "meaning"),
        expected_version=version(body),
    )  # fmt: skip
    return {"sign_off": record.pk, "content_sha256": record.content_sha256}


@takes_json
def review_reopen(user: User, review_set: ReviewSet, body: dict[str, Any]) -> dict[str, Any]:
    return {"reopening": services.reopen(user=user, review_set=review_set, reason=text(body, "reason")).pk}
