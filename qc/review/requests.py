"""From a request to a service call and back: JSON in, JSON out, refusals with their own status."""

import json
from collections.abc import Callable
from functools import wraps
from typing import Any, cast
from uuid import UUID

from django.contrib.auth.models import User
from django.http import HttpRequest, JsonResponse
from django.views.decorators.http import require_POST

from labdata.access import Action
from labdata.errors import InvalidInput, KerogateError
from labdata.pages.common import find, open_project
from qc.models import ReviewSet
from qc.review.choices import Choice

JsonView = Callable[..., dict[str, Any]]


def find_set(request: HttpRequest, slug: str, pk: int) -> ReviewSet:
    """The review set of an address. Raises NotFound for a stranger to the project."""
    project = open_project(request, slug, Action.VIEW)
    return find(ReviewSet.objects.filter(project=project).select_related("well", "project"), "review set", pk=pk)


def answers_json(view: JsonView) -> Callable[..., JsonResponse]:
    """A view of plain data; a refusal is JSON with code, message and remedy."""

    @wraps(view)
    def wrapped(request: HttpRequest, *args: Any, **kwargs: Any) -> JsonResponse:
        try:
            return JsonResponse(view(request, *args, **kwargs))
        except KerogateError as refusal:
            return JsonResponse({"error": refusal.as_dict()}, status=refusal.status)

    return wrapped


def takes_json(view: Callable[[User, ReviewSet, dict[str, Any]], dict[str, Any]]) -> Callable[..., JsonResponse]:
    """A change to a review set: POST with a JSON object, answered by what ``view`` returns."""

    @wraps(view)
    def wrapped(request: HttpRequest, slug: str, pk: int) -> dict[str, Any]:
        review_set = find_set(request, slug, pk)
        return view(cast(User, request.user), review_set, _body(request))

    return cast("Callable[..., JsonResponse]", require_POST(answers_json(wrapped)))


def _body(request: HttpRequest) -> dict[str, Any]:
    try:
        body = json.loads(request.body or b"{}")
    except ValueError:
        raise InvalidInput("The request is not JSON.", remedy="Load the page again.") from None
    if not isinstance(body, dict):
        raise InvalidInput("The request is not a JSON object.", remedy="Load the page again.")
    return body


def text(body: dict[str, Any], name: str) -> str:
    """A text field; absent is empty. Raises InvalidInput for anything else."""
    value = body.get(name, "")
    if not isinstance(value, str):
        raise InvalidInput(f"«{name}» must be text.", remedy="Load the page again.", field=name)
    return value


def version(body: dict[str, Any]) -> int:
    """The version of the set that the person looked at; a page must say which."""
    value = body.get("version")
    if not isinstance(value, int) or isinstance(value, bool):
        raise InvalidInput("The version looked at is missing.", remedy="Load the page again.", field="version")
    return value


def batch(body: dict[str, Any]) -> UUID:
    try:
        return UUID(text(body, "batch"))
    except ValueError:
        raise InvalidInput("The batch is no UUID.", remedy="Load the page again.", field="batch") from None


def choices(body: dict[str, Any]) -> list[Choice]:
    """One verdict over ``results``, the whole selection. Raises InvalidInput when they are not numbers."""
    results = body.get("results", [])
    if not isinstance(results, list) or not all(isinstance(pk, int) and not isinstance(pk, bool) for pk in results):
        raise InvalidInput("«results» must be a list of numbers.", remedy="Load the page again.", field="results")
    verdict, reason, words = text(body, "verdict"), text(body, "reason"), text(body, "text")
    return [Choice(pk, verdict, reason, words) for pk in results]


def marks(body: dict[str, Any]) -> list[tuple[str, str]]:
    """Flags as (rule, fingerprint)."""
    flags = body.get("flags", [])
    if not isinstance(flags, list) or not all(
        isinstance(flag, list) and len(flag) == 2 and all(isinstance(part, str) for part in flag) for flag in flags
    ):
        raise InvalidInput(
            "«flags» must be pairs of rule and fingerprint.", remedy="Load the page again.", field="flags"
        )
    return [(rule, mark) for rule, mark in flags]
