"""A sample: where it is from, who has had it, what was measured on it, and how to handle it."""

from collections import defaultdict
from typing import Any

from django import forms
from django.contrib import messages
from django.db.models import Prefetch, Q
from django.http import HttpRequest, HttpResponse
from django.shortcuts import redirect, render
from django.utils import timezone
from django.views.decorators.http import require_http_methods

from labdata.access import Action, visible
from labdata.models import Analysis, CustodyEvent, MudInterval, Project, Result, Sample
from labdata.pages.common import attempt, find, open_project, person
from labdata.registry.custody import add_custody
from qc.models import Flag
from qc.review.standing import standing


class CustodyForm(forms.Form):
    """One entry of the custody chain."""

    kind = forms.ChoiceField(label="What happened", choices=CustodyEvent.Kind.choices)
    place = forms.CharField(max_length=200, help_text="Laboratory, core store, rig or office.")
    at = forms.DateTimeField(
        label="When (UTC)",
        widget=forms.DateTimeInput(attrs={"type": "datetime-local"}, format="%Y-%m-%dT%H:%M"),
        input_formats=["%Y-%m-%dT%H:%M", "%Y-%m-%dT%H:%M:%S", "%Y-%m-%d %H:%M"],
    )
    remark = forms.CharField(widget=forms.Textarea(attrs={"rows": 2}), required=False)


def _sample(request: HttpRequest, project: Project, pk: int) -> Sample:
    rows = visible(request.user, Sample.objects.filter(well__project=project), "well__project")
    return find(rows.select_related("well__project", "parent"), "sample", pk=pk)


@require_http_methods(["GET", "POST"])
def sample(request: HttpRequest, slug: str, pk: int) -> HttpResponse:
    """Everything about one sample; a coordinator adds to the custody chain here."""
    project = open_project(request, slug, Action.REGISTER if request.method == "POST" else Action.VIEW)
    at_hand = _sample(request, project, pk)
    form = CustodyForm(request.POST or None, initial={"at": timezone.now().replace(second=0, microsecond=0)})
    if request.method == "POST" and form.is_valid():
        entry = form.cleaned_data
        if attempt(form, lambda: add_custody(user=person(request), sample=at_hand, **entry)):
            messages.success(request, "The custody chain has a new entry.")
            return redirect("sample", slug, pk)
    return render(request, "samples/sample.html", {**_particulars(at_hand), "form": form})


def _particulars(at_hand: Sample) -> dict[str, Any]:
    """Custody, splits, analyses with verdicts and flags, and what bears on handling."""
    return {
        "sample": at_hand,
        "custody": at_hand.custody.select_related("recorded_by"),
        "splits": at_hand.splits.all(),
        "consignments": at_hand.consignments.select_related("laboratory"),
        "muds": _muds(at_hand),
        "analyses": _analyses(at_hand),
        "other_flags": Flag.objects.in_force().filter(analysis__sample=at_hand, result__isnull=True),
    }


def _analyses(at_hand: Sample) -> list[dict[str, Any]]:
    """Analyses, current first, each with its results as (result, standing decision, flags)."""
    results = Result.objects.select_related("analyte", "column").order_by("analyte__order", "analyte__code")
    analyses = at_hand.analyses.select_related("method", "report", "laboratory").prefetch_related(
        Prefetch("results", queryset=results)
    )
    stands = standing(Result.objects.filter(analysis__sample=at_hand))
    flags: dict[int, list[Flag]] = defaultdict(list)
    for flag in Flag.objects.in_force().filter(analysis__sample=at_hand, result__isnull=False):
        flags[flag.result_id or 0].append(flag)
    return [
        {"analysis": one, "rows": [(row, stands.get(row.pk), flags[row.pk]) for row in one.results.all()]}
        for one in _current_first(list(analyses))
    ]


def _current_first(analyses: list[Analysis]) -> list[Analysis]:
    return sorted(analyses, key=lambda one: (not one.current, one.method.code, one.replicate, -one.pk))


def _muds(at_hand: Sample) -> list[MudInterval]:
    """Drilling fluid recorded where the sample is from."""
    if at_hand.top_md_m is None:
        return []
    base = at_hand.base_md_m if at_hand.base_md_m is not None else at_hand.top_md_m
    return list(at_hand.well.muds.filter(Q(top_md_m__lte=base) & Q(base_md_m__gte=at_hand.top_md_m)))
