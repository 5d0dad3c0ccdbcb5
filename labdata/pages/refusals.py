"""A refusal raised anywhere under a page becomes a page that says what was found and what would do."""

from collections.abc import Callable
from http import HTTPStatus

from django.http import HttpRequest, HttpResponse
from django.shortcuts import render
from django.utils.http import url_has_allowed_host_and_scheme

from labdata.errors import KerogateError

HEADINGS = {
    HTTPStatus.NOT_FOUND: "Not found",
    HTTPStatus.FORBIDDEN: "Not allowed",
    HTTPStatus.CONFLICT: "It stands differently now",
}


class RefusalMiddleware:
    """Renders KerogateError with its own status. The API answers its refusals itself."""

    def __init__(self, get_response: Callable[[HttpRequest], HttpResponse]) -> None:
        self.get_response = get_response

    def __call__(self, request: HttpRequest) -> HttpResponse:
        return self.get_response(request)

    def process_exception(self, request: HttpRequest, exception: Exception) -> HttpResponse | None:
        if not isinstance(exception, KerogateError):
            return None
        heading = HEADINGS.get(HTTPStatus(exception.status), "This was refused")
        context = {"refusal": exception, "heading": heading, "back": _back(request)}
        return render(request, "refused.html", context, status=exception.status)


def _back(request: HttpRequest) -> str:
    """Where the user came from, if that was one of our own pages and not this one."""
    came_from = request.headers.get("referer", "")
    ours = url_has_allowed_host_and_scheme(came_from, {request.get_host()}, require_https=request.is_secure())
    return came_from if ours and came_from != request.build_absolute_uri() else ""
