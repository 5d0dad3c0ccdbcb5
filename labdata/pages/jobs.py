"""Background work of a project: what is queued, running, done or failed, and calling it off."""

from django.contrib import messages
from django.http import HttpRequest, HttpResponse
from django.shortcuts import redirect, render
from django.urls import reverse
from django.views.decorators.http import require_POST, require_safe

from labdata.access import Action, allowed, visible
from labdata.jobs import request_cancel
from labdata.models import Job, JobState, Project, Release
from labdata.pages.common import find, open_project, page_of, person


@require_safe
def jobs(request: HttpRequest, slug: str) -> HttpResponse:
    """The list, newest first, by state if asked."""
    project = open_project(request, slug)
    rows = visible(request.user, Job.objects.filter(project=project)).select_related("created_by")
    state = request.GET.get("state", "")
    if state in JobState.values:
        rows = rows.filter(state=state)
    context = {"page": page_of(request, rows), "state": state, "states": JobState.choices}
    return render(request, "jobs/jobs.html", context)


def _job(request: HttpRequest, project: Project, pk: object) -> Job:
    rows = visible(request.user, Job.objects.filter(project=project)).select_related("created_by", "project")
    return find(rows, "job", pk=pk)


@require_safe
def job(request: HttpRequest, slug: str, pk: object) -> HttpResponse:
    project = open_project(request, slug)
    at_hand = _job(request, project, pk)
    mine = at_hand.created_by_id == request.user.pk
    context = {
        "job": at_hand,
        "events": at_hand.events.all(),
        "may_cancel": not at_hand.settled and (mine or allowed(request.user, project, Action.ADMINISTER)),
        "made": _made(project, at_hand),
    }
    return render(request, "jobs/job.html", context)


def _made(project: Project, at_hand: Job) -> tuple[str, str] | None:
    """Words and address of what the job made or worked on."""
    upload = at_hand.params.get("upload")
    if at_hand.kind == "intake" and upload:
        return "the file", reverse("upload", args=[project.slug, upload])
    if at_hand.kind == "qc" and at_hand.result.get("run"):
        return "the QC run", reverse("qc_run", args=[project.slug, at_hand.result["run"]])
    if at_hand.kind == "rehearse" and at_hand.result:
        return "the rehearsal", reverse("rehearse", args=[project.slug])
    if at_hand.kind == "release" and at_hand.result.get("release"):
        release = Release.objects.filter(project=project, pk=at_hand.result["release"]).first()
        return ("the release", reverse("release", args=[project.slug, release.number])) if release else None
    return None


@require_safe
def job_progress(request: HttpRequest, slug: str, pk: object) -> HttpResponse:
    """How far the job is, for polling; the page is loaded again once it has ended."""
    at_hand = _job(request, open_project(request, slug), pk)
    response = render(request, "jobs/_progress.html", {"job": at_hand})
    if at_hand.settled:
        response["HX-Refresh"] = "true"
    return response


@require_POST
def job_cancel(request: HttpRequest, slug: str, pk: object) -> HttpResponse:
    """Ask for the job to be called off, by its author or an administrator."""
    at_hand = request_cancel(_job(request, open_project(request, slug), pk), person(request))
    if at_hand.state == JobState.CANCELLED:
        messages.success(request, "The job is cancelled; nothing of it was kept.")
    elif at_hand.settled:
        messages.info(request, "It was too late to cancel: the job has ended.")
    else:
        messages.info(request, "The job is asked to stop; it does so at its next step.")
    return redirect("job", slug, at_hand.pk)
