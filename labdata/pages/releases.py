"""Releases: the list, asking for the next one, a release with its manifest, its files and its withdrawal."""

from typing import Any

from django import forms
from django.contrib import messages
from django.http import FileResponse, HttpRequest, HttpResponse
from django.shortcuts import redirect, render
from django.views.decorators.http import require_http_methods, require_POST, require_safe

from labdata.access import Action, visible
from labdata.audit import canonical
from labdata.models import Project, Release
from labdata.pages.common import attempt, find, open_project, page_of, person
from labdata.release.export import FORMATS
from labdata.release.pull import pull_release
from labdata.release.services import TITLE_LENGTH, request_release, withdraw
from qc.models import ReviewSet, ReviewSetState
from qc.review.worklist import work_list

SHAPE_WORDS = {"long": "one row a result", "wide": "one row an analysis"}


class ReleaseForm(forms.Form):
    """The next release."""

    title = forms.CharField(
        max_length=TITLE_LENGTH, help_text="What somebody will look for: «Quill wells, spring 2026»."
    )


class WithdrawForm(forms.Form):
    """Why a release should no longer be used."""

    reason = forms.CharField(widget=forms.Textarea(attrs={"rows": 3}), max_length=2000)


@require_safe
def releases(request: HttpRequest, slug: str) -> HttpResponse:
    project = open_project(request, slug)
    rows = visible(request.user, Release.objects.filter(project=project)).select_related("created_by")
    signed = ReviewSet.objects.filter(project=project, state=ReviewSetState.SIGNED).exists()
    return render(request, "releases/releases.html", {"page": page_of(request, rows), "signed": signed})


@require_http_methods(["GET", "POST"])
def release_new(request: HttpRequest, slug: str) -> HttpResponse:
    """What the next release would hold, and its title."""
    project = open_project(request, slug, Action.RELEASE)
    form = ReleaseForm(request.POST or None)
    if request.method == "POST" and form.is_valid():
        title = form.cleaned_data["title"]
        made = attempt(form, lambda: request_release(project=project, user=person(request), title=title))
        if made:
            messages.success(request, "The release is being built.")
            return redirect("job", slug, made.pk)
    lines = work_list(project, person(request))
    context = {
        "form": form,
        "signed": [line for line in lines if line.signature],
        "open": [line for line in lines if not line.signature and line.results],
    }
    return render(request, "releases/release_new.html", context)


def _release(request: HttpRequest, project: Project, number: int) -> Release:
    rows = visible(request.user, Release.objects.filter(project=project))
    return find(rows.select_related("project", "created_by", "withdrawn_by"), "release", number=number)


@require_safe
def release(request: HttpRequest, slug: str, number: int) -> HttpResponse:
    project = open_project(request, slug)
    return _page(request, _release(request, project, number), WithdrawForm())


@require_POST
def release_withdraw(request: HttpRequest, slug: str, number: int) -> HttpResponse:
    """Withdraw with a reason: the bytes stay, the word about them changes."""
    project = open_project(request, slug, Action.WITHDRAW)
    at_hand = _release(request, project, number)
    form = WithdrawForm(request.POST)
    if form.is_valid():
        withdraw(release=at_hand, user=person(request), reason=form.cleaned_data["reason"])
        messages.success(request, f"Release {number} is withdrawn.")
        return redirect("release", slug, number)
    return _page(request, at_hand, form)


def _page(request: HttpRequest, at_hand: Release, form: forms.Form) -> HttpResponse:
    context: dict[str, Any] = {
        "release": at_hand,
        "form": form,
        "manifest": at_hand.manifest,
        "formats": list(FORMATS),
        "shapes": SHAPE_WORDS.items(),
        "host": f"{request.scheme}://{request.get_host()}",
        "newer": at_hand.project.releases.filter(number__gt=at_hand.number, withdrawn_at__isnull=True).first(),
    }
    return render(request, "releases/release.html", context)


@require_safe
def release_data(request: HttpRequest, slug: str, number: int) -> FileResponse:
    """The release as a file, the same bytes as by the API."""
    project = open_project(request, slug, Action.PULL)
    asked = request.GET
    found = pull_release(
        _release(request, project, number), format_name=asked.get("format", "csv"), shape=asked.get("shape", "long"),
        include=asked.get("include", ""),
    )  # fmt: skip
    response = FileResponse(found.file, as_attachment=True, filename=found.name, content_type=found.content_type)
    response["ETag"] = found.etag
    response["Content-Length"] = found.size
    return response


@require_safe
def release_manifest(request: HttpRequest, slug: str, number: int) -> HttpResponse:
    """The manifest as it was hashed."""
    at_hand = _release(request, open_project(request, slug, Action.PULL), number)
    response = HttpResponse(canonical(at_hand.manifest), content_type="application/json")
    response["Content-Disposition"] = f'attachment; filename="{slug}-release-{number}-manifest.json"'
    return response
