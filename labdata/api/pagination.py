"""Lists by cursor: stable while rows are added."""

from rest_framework.pagination import CursorPagination


class ByIdCursor(CursorPagination):
    """Pages in order of creation; ``?page_size=`` up to 2000."""

    ordering = "pk"
    page_size_query_param = "page_size"
    max_page_size = 2000
