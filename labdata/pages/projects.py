"""A project's front page, and opening a new project."""

from django import forms
from django.contrib import messages
from django.http import HttpRequest, HttpResponse
from django.shortcuts import redirect, render
from django.views.decorators.http import require_http_methods, require_safe

from labdata.errors import NotAllowed
from labdata.pages.common import attempt, open_project, person
from labdata.projects import may_open_project
from labdata.projects import open_project as create_project


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
    return render(request, "projects/project.html", {"project": open_project(request, slug)})


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
