"""Sending files: whole, in ranges, or not at all when the client has them already."""

import re
from collections.abc import Iterator
from typing import IO

from django.http import FileResponse, HttpResponse, HttpResponseBase, StreamingHttpResponse
from rest_framework.request import Request

from labdata.errors import KerogateError
from labdata.release.pull import Download

BLOCK = 256 * 1024


class NoSuchRange(KerogateError):
    """The range asked for lies outside the file."""

    code = "range_not_satisfiable"
    status = 416


def send(request: Request, download: Download) -> HttpResponseBase:
    """The answer to GET or HEAD, honouring If-None-Match, Range and If-Range. Raises NoSuchRange."""
    headers = {
        "ETag": download.etag,
        "Accept-Ranges": "bytes",
        "Cache-Control": "private, max-age=0, must-revalidate",
        "Content-Disposition": f'attachment; filename="{download.name}"',
        "X-Content-Type-Options": "nosniff",
    }
    if download.etag in [tag.strip().removeprefix("W/") for tag in request.headers.get("If-None-Match", "").split(",")]:
        download.file.close()
        return HttpResponse(status=304, headers=headers)
    part = _part(request, download)
    start, end = part or (0, download.size - 1)
    if part:
        headers["Content-Range"] = f"bytes {start}-{end}/{download.size}"
    headers["Content-Length"] = str(end - start + 1)
    status = 206 if part else 200
    if request.method == "HEAD":
        download.file.close()
        return HttpResponse(status=status, content_type=download.content_type, headers=headers)
    if part is None:
        return FileResponse(
            download.file,
            as_attachment=True,
            filename=download.name,
            content_type=download.content_type,
            headers=headers,
        )
    return StreamingHttpResponse(
        _blocks(download.file, start, end), status=status, content_type=download.content_type, headers=headers
    )


def _part(request: Request, download: Download) -> tuple[int, int] | None:
    """First and last byte of the one range asked for; None for the whole file (also for several ranges)."""
    asked = re.fullmatch(r"bytes=(\d*)-(\d*)", request.headers.get("Range", "").replace(" ", ""))
    if asked is None or asked.groups() == ("", "") or request.headers.get("If-Range", download.etag) != download.etag:
        return None
    first, last = asked.groups()
    start = int(first) if first else max(download.size - int(last), 0)
    end = min(int(last), download.size - 1) if first and last else download.size - 1
    if start >= download.size or start > end or (not first and int(last) == 0):
        download.file.close()
        raise NoSuchRange(
            f"The file has {download.size} bytes; the range asked for lies outside.", remedy="Ask for a part of it."
        )
    return start, end


def _blocks(file: IO[bytes], start: int, end: int) -> Iterator[bytes]:
    with file:
        file.seek(start)
        left = end - start + 1
        while left > 0 and (block := file.read(min(BLOCK, left))):
            left -= len(block)
            yield block
