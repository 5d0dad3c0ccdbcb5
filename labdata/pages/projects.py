"""A project's front page, and opening a new project."""

from django import forms
from django.contrib import messages
from django.http import HttpRequest, HttpResponse
from django.shortcuts import redirect, render
from django.views.decorators.http import require_http_methods, require_safe

from labdata.errors import NotAllowed
from labdata.models import JobState, Project, Result, Sample
from labdata.pages.common import attempt, open_project, person
from labdata.pages.work import flag_counts, waiting_for
from labdata.projects import may_open_project
from labdata.projects import open_project as create_project
from qc.review.worklist import work_list


class ProjectForm(forms.Form):
    """A new project."""

    name = forms.CharField(max_length=200)
    slug = forms.SlugField(
        label="Short name", max_length=60, required=False,
        help_text="For addresses and commands: small letters, digits, hyphens. Made from the name if left empty.",
    )  # fmt: skip
    description = forms.CharField(widget=forms.Textarea(attrs={"rows": 3}), required=False)


@require_safe
def project(request: HttpRequest, slug: str) -> HttpResponse:
    """Counts, what waits for the user, wells that have flags, and what happened last."""
    at_hand = open_project(request, slug)
    context = {
        "project": at_hand,
        "counts": _counts(at_hand),
        "waiting": waiting_for(person(request), at_hand),
        "flags": flag_counts(at_hand),
        "lines": work_list(at_hand, person(request)),
        "uploads": at_hand.uploads.select_related("created_by")[:6],
        "releases": at_hand.releases.all()[:4],
        "jobs": at_hand.jobs.filter(state__in=[JobState.QUEUED, JobState.RUNNING])[:6],
    }
    return render(request, "projects/project.html", context)


def _counts(at_hand: Project) -> list[tuple[str, int]]:
    """How much the project holds."""
    return [
        ("wells", at_hand.wells.count()),
        ("samples", Sample.objects.filter(well__project=at_hand).count()),
        ("analyses", at_hand.analyses.filter(current=True).count()),
        ("results", Result.objects.filter(analysis__project=at_hand, current=True).count()),
        ("reports", at_hand.reports.count()),
        ("releases", at_hand.releases.count()),
    ]


@require_http_methods(["GET", "POST"])
def project_new(request: HttpRequest) -> HttpResponse:
    if not may_open_project(request.user):
        raise NotAllowed(
            f"{request.user} may not open a project.", remedy="Staff and administrators of an existing project may."
        )
    form = ProjectForm(request.POST or None)
    if request.method == "POST" and form.is_valid():
        made = attempt(form, lambda: create_project(user=person(request), **form.cleaned_data))
        if made:
            messages.success(request, f"Project {made.name} is open and you administer it. Add its members next.")
            return redirect("members", made.slug)
    return render(request, "projects/project_new.html", {"form": form})
