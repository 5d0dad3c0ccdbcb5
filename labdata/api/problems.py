"""Errors as RFC 9457 problem documents: type, title, status, detail, and what more helps to act."""

from collections.abc import Iterator
from http import HTTPStatus
from typing import Any

from django.core.exceptions import PermissionDenied
from django.http import Http404
from rest_framework.exceptions import APIException, ValidationError
from rest_framework.response import Response
from rest_framework.views import exception_handler, set_rollback

from labdata.errors import KerogateError

CONTENT_TYPE = "application/problem+json"
TYPE = "urn:kerogate:problem:"


def problem(status: int, code: str, detail: str, **more: Any) -> dict[str, Any]:
    """The document itself. ``code`` is stable for programs."""
    title = code.replace("_", " ").capitalize()
    return {"type": f"{TYPE}{code}", "title": title, "status": status, "detail": detail, "code": code, **more}


def problem_response(error: Exception, context: dict[str, Any]) -> Response | None:
    """Answer for an exception raised in a view; None lets Django report a bug as such."""
    if isinstance(error, KerogateError):
        set_rollback()
        where = {name: value for name, value in error.where.items() if name not in {"status", "type", "title"}}
        body = problem(
            error.status, error.code, str(error), **{**where, "message": error.message, "remedy": error.remedy}
        )
        return Response(body, status=error.status, content_type=CONTENT_TYPE)
    response = exception_handler(error, context)
    if response is None:
        return None
    response.data = _document(error, response.status_code)
    response.content_type = CONTENT_TYPE
    return response


def _document(error: Exception, status: int) -> dict[str, Any]:
    if isinstance(error, ValidationError):
        errors = dict(_by_field(error.detail, ""))
        said = " ".join(f"{field}: {' '.join(words)}" if field else " ".join(words) for field, words in errors.items())
        return problem(status, "invalid", said, errors=errors)
    if isinstance(error, Http404):
        return problem(status, "not_found", "There is nothing at this address.")
    if isinstance(error, PermissionDenied):
        return problem(status, "not_allowed", str(error) or "This is not allowed.")
    code = error.default_code if isinstance(error, APIException) else HTTPStatus(status).phrase
    detail = error.detail if isinstance(error, APIException) else str(error)
    return problem(status, str(code).lower().replace(" ", "_"), str(detail))


def _by_field(detail: Any, path: str) -> Iterator[tuple[str, list[str]]]:
    """Messages by the path of their field: ``decisions[3].verdict``."""
    if isinstance(detail, dict):
        for name, inner in detail.items():
            if name == "non_field_errors":
                yield from _by_field(inner, path)
            else:
                yield from _by_field(
                    inner, f"{path}.{name}".lstrip(".") if isinstance(name, str) else f"{path}[{name}]"
                )
    elif isinstance(detail, list) and any(isinstance(inner, dict | list) for inner in detail):
        for number, inner in enumerate(detail):
            yield from _by_field(inner, f"{path}[{number}]")
    elif isinstance(detail, list):
        if detail:
            yield path, [str(words) for words in detail]
    else:
        yield path, [str(detail)]
