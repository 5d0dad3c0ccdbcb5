"""QC runs: the list, starting one, and a run with its counts and flags."""

from collections import Counter, defaultdict
from typing import Any

from django import forms
from django.contrib import messages
from django.db.models import Count, QuerySet
from django.http import HttpRequest, HttpResponse
from django.shortcuts import redirect, render
from django.views.decorators.http import require_POST, require_safe

from labdata.access import Action, visible
from labdata.models import Project, Well
from labdata.pages.common import find, open_project, page_of, person
from qc.models import Flag, QcRun, Severity
from qc.rules import RULES
from qc.services import start_run

OUTCOMES = ("pass", "fire", "not_applicable", "cannot_evaluate")


class FlagFilter(forms.Form):
    """Which flags of a run to show."""

    rule = forms.ChoiceField(required=False)
    severity = forms.ChoiceField(label="Weight", required=False, choices=[("", "all"), *Severity.choices])
    well = forms.ChoiceField(required=False)

    def __init__(self, *args: Any, rules: list[str], wells: QuerySet[Well], **kwargs: Any) -> None:
        super().__init__(*args, **kwargs)
        self.fields["rule"].choices = [("", "all"), *((rule, rule) for rule in rules)]  # type: ignore[attr-defined]
        self.fields["well"].choices = [("", "all"), *((one.pk, one.name) for one in wells)]  # type: ignore[attr-defined]


def _runs(request: HttpRequest, project: Project) -> QuerySet[QcRun]:
    rows = visible(request.user, QcRun.objects.filter(project=project))
    return rows.select_related("rule_set", "started_by", "job")


@require_safe
def qc_runs(request: HttpRequest, slug: str) -> HttpResponse:
    """Runs, newest first, and the button for a new one."""
    project = open_project(request, slug)
    rows = _runs(request, project).annotate(
        n_flags=Count("flags", distinct=True), n_wells=Count("wells", distinct=True)
    )
    context = {
        "page": page_of(request, rows.order_by("-pk")),
        "wells": project.wells.all(),
        "latest": _by_rule(Flag.objects.in_force().filter(well__project=project)),
        "severities": Severity.values,
    }
    return render(request, "qc/qc_runs.html", context)


def _by_rule(flags: QuerySet[Flag]) -> list[dict[str, Any]]:
    """Rows of rule, family and how many flags of each severity, in the order in which rules run."""
    counts: dict[str, Counter[str]] = defaultdict(Counter)
    for rule_id, severity, number in flags.order_by().values_list("rule", "severity").annotate(Count("pk")):
        counts[rule_id][severity] += number
    order = {rule.id: rule for rule in RULES}
    known = sorted(
        counts, key=lambda rule_id: (list(order).index(rule_id) if rule_id in order else len(order), rule_id)
    )
    return [
        {
            "rule": rule_id,
            "title": order[rule_id].title if rule_id in order else "",
            "counts": [(severity, counts[rule_id][severity]) for severity in Severity.values],
        }
        for rule_id in known
    ]


@require_POST
def qc_start(request: HttpRequest, slug: str) -> HttpResponse:
    """Run the rules now on the wells named, or on all."""
    project = open_project(request, slug, Action.RUN_QC)
    named = [pk for pk in request.POST.getlist("well") if pk.isdigit()]
    wells = [find(project.wells.all(), "well", pk=int(pk)) for pk in named] or list(project.wells.all())
    job = start_run(project, wells, person(request))
    messages.success(request, f"QC of {len(wells)} well{'' if len(wells) == 1 else 's'} is on its way.")
    return redirect("job", slug, job.pk)


@require_safe
def qc_run(request: HttpRequest, slug: str, pk: int) -> HttpResponse:
    """One run: how often each rule gave which of the four answers, and its flags."""
    project = open_project(request, slug)
    run = find(_runs(request, project), "QC run", pk=pk)
    rules = list(run.flags.order_by("rule").values_list("rule", flat=True).distinct())
    form = FlagFilter(request.GET, rules=rules, wells=run.wells.all())
    flags = run.flags.select_related("well", "analysis__sample", "analysis__method", "result").order_by("pk")
    if form.is_valid():
        flags = flags.filter(**{name: value for name, value in form.cleaned_data.items() if value})
    context = {"run": run, "form": form, "page": page_of(request, flags), "summary": run.summary, "outcomes": OUTCOMES,
               "wells": run.wells.all()}  # fmt: skip
    return render(request, "qc/qc_run.html", context)
