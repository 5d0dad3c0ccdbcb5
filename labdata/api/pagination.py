"""Lists by cursor: stable while rows are added."""

from typing import Any

from rest_framework.exceptions import NotFound, ValidationError
from rest_framework.pagination import Cursor, CursorPagination
from rest_framework.request import Request


class ByIdCursor(CursorPagination):
    """Pages in order of creation; ``?page_size=`` up to 2000. Raises ValidationError naming a bad parameter."""

    ordering = "pk"
    page_size_query_param = "page_size"
    page_size_query_description = "Rows a page, 1 to 2000 (200 unless told)."
    max_page_size = 2000
    cursor_query_description = "Where the page starts: taken from «next» or «previous», never made by hand."

    def get_page_size(self, request: Request) -> int | None:
        given = request.query_params.get(self.page_size_query_param)
        if given is None:
            return self.page_size
        if not (given.isascii() and given.isdigit() and 1 <= int(given[:9]) <= self.max_page_size):
            raise ValidationError({"page_size": [f"«{given}» is no number of rows from 1 to {self.max_page_size}."]})
        return int(given)

    def decode_cursor(self, request: Request) -> Cursor | None:
        try:
            return super().decode_cursor(request)
        except NotFound:
            raise ValidationError({"cursor": ["This is no cursor that a list gave out."]}) from None

    def paginate_queryset(self, queryset: Any, request: Request, view: Any = None) -> list[Any] | None:
        try:
            page: list[Any] | None = super().paginate_queryset(queryset, request, view)
        except (ValueError, OverflowError):  # a position that is no id
            raise ValidationError({"cursor": ["This is no cursor that a list gave out."]}) from None
        return page
