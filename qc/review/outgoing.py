"""What leaves this room on paper: the signed record, and figures for a report."""

from typing import cast

from django.contrib.auth.models import User
from django.http import HttpRequest, HttpResponse
from django.views.decorators.http import require_safe

from labdata.errors import InvalidInput
from labdata.pages.common import find
from qc.review.requests import find_set


def as_file(content: bytes, content_type: str, file_name: str) -> HttpResponse:
    """A download; characters that a file name cannot hold become dashes."""
    safe = "".join(sign if sign.isascii() and (sign.isalnum() or sign in "-_.") else "-" for sign in file_name)
    answer = HttpResponse(content, content_type=content_type)
    answer["Content-Disposition"] = f'attachment; filename="{safe}"'
    return answer


@require_safe
def review_record(request: HttpRequest, slug: str, pk: int, signature: int) -> HttpResponse:
    """The record of one signature of the set, in force or not."""
    from qc.review.record import record  # noqa: PLC0415
    from qc.review.record_pdf import record_pdf  # noqa: PLC0415 - the PDF library is wanted only when one is made

    review_set = find_set(request, slug, pk)
    rows = review_set.sign_offs.select_related(
        "signed_by", "qc_run__rule_set", "review_set__well", "review_set__project"
    )
    made = record_pdf(record(find(rows, "signature", pk=signature)))
    name = f"{review_set.well.name}-set-{review_set.number}-signature-{signature}.pdf"
    return as_file(made, "application/pdf", name)


@require_safe
def review_drawing(request: HttpRequest, slug: str, pk: int) -> HttpResponse:
    """A figure: ``plot`` tracks (of ``column``, any number of times) or pair (``x``, ``y``); ``format`` svg, png or pdf."""
    from qc.review.drawings import drawing  # noqa: PLC0415 - drawing takes half a second to load

    review_set, asked, user = find_set(request, slug, pk), request.GET, cast(User, request.user)
    kind, file_format = asked.get("plot", "tracks"), asked.get("format", "pdf")
    if kind == "pair":
        keys = [asked.get("y", ""), asked.get("x", "")]
        figure = drawing.pair(review_set, user, x=keys[1], y=keys[0])
    elif kind == "tracks":
        keys = asked.getlist("column")
        figure = drawing.tracks(review_set, user, keys)
    else:
        raise InvalidInput(f"«{kind}» is no plot.", remedy="Plots: tracks, pair.")
    content = drawing.as_bytes(figure, file_format)
    name = "-".join([review_set.well.name, f"set-{review_set.number}", *(keys or ["tracks"])[:2]])
    return as_file(content, drawing.FORMATS[file_format], f"{name}.{file_format}")
