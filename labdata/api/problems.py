"""Errors as RFC 9457 problem documents."""

from typing import Any

from rest_framework.response import Response
from rest_framework.views import exception_handler

from labdata.errors import KerogateError


def problem_response(error: Exception, context: dict[str, Any]) -> Response | None:
    """Answer for an exception raised in a view; None lets Django report a bug as such."""
    if isinstance(error, KerogateError):
        body = {"type": f"about:blank#{error.code}", "title": error.code, "status": error.status, "detail": str(error)}
        return Response({**body, **error.as_dict()}, status=error.status, content_type="application/problem+json")
    return exception_handler(error, context)
