"""/healthz: whether database and worker answer. No login, no data, nothing but numbers."""

import logging
from typing import Any

from django.conf import settings
from django.contrib.auth.decorators import login_not_required
from django.db import DatabaseError
from django.db.models import Min
from django.db.models.functions import Now
from django.http import HttpRequest, JsonResponse
from django.views.decorators.cache import never_cache
from django.views.decorators.http import require_safe

from labdata.jobs.clock import after
from labdata.models import Job, JobState, SweeperBeat

OK = "ok"


def _not_about_healthz(record: logging.LogRecord) -> bool:
    """A 503 of this page is its answer, not an error of the server."""
    return getattr(getattr(record, "request", None), "path", "") != "/healthz"


logging.getLogger("django.request").addFilter(_not_about_healthz)


def fresh_seconds() -> float:
    """A worker that swept within this time counts as alive."""
    return max(3 * float(settings.JOB_SWEEP_SECONDS), 15.0)


@login_not_required
@never_cache
@require_safe
def healthz(request: HttpRequest) -> JsonResponse:
    """200 when database and worker answer, else 503 with which does not."""
    answer = look()
    healthy = answer["database"] == OK and answer["worker"] == OK
    return JsonResponse({"status": OK if healthy else "unavailable", **answer}, status=200 if healthy else 503)


def look() -> dict[str, Any]:
    """What is the matter with database and worker, and how much waits."""
    try:
        return {"database": OK, "worker": worker_state(), **_queue()}
    except DatabaseError as error:
        reason = str(error).splitlines()[0] if str(error) else type(error).__name__
        return {"database": f"does not answer: {reason}", "worker": "unknown, it is seen through the database"}


def worker_state() -> str:
    """``ok``, or since when no worker has swept; pages show it as a banner."""
    beat = SweeperBeat.objects.annotate(now=Now()).order_by("-at").first()
    if beat is None:
        return "none has started yet"
    age = (beat.now - beat.at).total_seconds()
    return OK if age <= fresh_seconds() else f"none has reported for {age:.0f} s"


def _queue() -> dict[str, Any]:
    waiting = Job.objects.filter(state=JobState.QUEUED).aggregate(oldest=Min("created_at"), now=Min(Now()))
    age = (waiting["now"] - waiting["oldest"]).total_seconds() if waiting["oldest"] else 0.0
    running = Job.objects.filter(state=JobState.RUNNING)
    return {
        "queued": Job.objects.filter(state=JobState.QUEUED).count(),
        "oldest_queued_seconds": round(max(age, 0.0), 1),
        "running": running.count(),
        "running_without_worker": running.filter(lease_until__lt=after(0)).count(),
    }
