"""One result: the value, the cell it came from, and what became of it."""

from django.http import HttpRequest, HttpResponse
from django.shortcuts import render
from django.views.decorators.http import require_safe

from labdata.access import visible
from labdata.errors import KerogateError
from labdata.models import Result
from labdata.pages.common import find, open_project
from labdata.pages.history import history
from labdata.pages.sheet_extract import Extract, address, extract
from qc.models import Flag, ReviewSet
from qc.review import notes
from qc.review.standing import standing


@require_safe
def result(request: HttpRequest, slug: str, pk: int) -> HttpResponse:
    """Value, verdict, flags, history, and the cell highlighted in its sheet."""
    project = open_project(request, slug)
    rows = visible(request.user, Result.objects.filter(analysis__project=project), "analysis__project")
    at_hand = find(
        rows.select_related(
            "analysis__sample__well", "analysis__method", "analysis__report__source_file", "analysis__laboratory",
            "analysis__reference_material", "analyte", "column__table__report__source_file",
            "supersedes__analysis__report",
        ),
        "result",
        pk=pk,
    )  # fmt: skip
    sheet, trouble = _sheet(at_hand)
    review_set = ReviewSet.objects.filter(items__analysis=at_hand.analysis_id).first()
    context = {
        "result": at_hand,
        "address": address(at_hand),
        "later": at_hand.successors.select_related("analysis__report", "analyte", "column").first(),
        "stand": standing(Result.objects.filter(pk=pk)).get(pk),
        "flags": Flag.objects.in_force().filter(result=at_hand),
        "analysis_flags": Flag.objects.in_force().filter(analysis=at_hand.analysis, result__isnull=True),
        "history": history(at_hand),
        "review_set": review_set,
        "notes": notes.thread(notes.of_result(at_hand)),
        "may_note": review_set is not None and notes.may_write(request.user, project),
        "note_length": notes.LENGTH,
        "siblings": at_hand.analysis.results.select_related("analyte", "column").order_by("analyte__order"),
        "sheet": sheet,
        "trouble": trouble,
    }
    return render(request, "results/result.html", context)


def _sheet(at_hand: Result) -> tuple[Extract | None, str]:
    """The cut-out, or what kept it from being shown: the page has all else without the file."""
    try:
        return extract(at_hand), ""
    except (KerogateError, OSError) as trouble:
        return None, str(trouble)
