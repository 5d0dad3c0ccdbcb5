"""Asking for work. The job row is written with the change that needs it; the message that follows is only a hint."""

import logging
from functools import partial
from typing import Any
from uuid import UUID

from django.conf import settings
from django.contrib.auth.models import User
from django.db import IntegrityError, transaction
from django.db.models import Q

from labdata.errors import Conflict
from labdata.jobs import kinds
from labdata.jobs.clock import after
from labdata.jobs.lease import note_event
from labdata.jobs.tasks import run_job
from labdata.models import Job, JobState, Project

logger = logging.getLogger(__name__)
FIRST_LOOK_SECONDS = 30.0
LIVE = (JobState.QUEUED, JobState.RUNNING)


def enqueue(
    kind: str,
    params: dict[str, Any],
    *,
    project: Project | None,
    user: User | None,
    idem_key: str | None = None,
    dedupe_key: str = "",
) -> Job:
    """Queue one job inside the caller's transaction; it is published once that commits.

    The same ``idem_key`` again returns the job made first, for ever; the same ``dedupe_key`` returns the job of
    that kind which is still queued or running. Raises Conflict when ``idem_key`` stands for other work.
    """
    attempts = kinds.find(kind).max_attempts
    with transaction.atomic():
        if existing := _existing(kind, project, idem_key, dedupe_key):
            return existing
        try:
            with transaction.atomic():
                job = Job.objects.create(
                    kind=kind, params=params, project=project, created_by=user, max_attempts=attempts,
                    idem_key=idem_key or None, dedupe_key=dedupe_key, next_dispatch_at=after(first_look_seconds()),
                )  # fmt: skip
        except IntegrityError:
            if existing := _existing(kind, project, idem_key, dedupe_key):
                return existing
            raise
        note_event(job.pk, "", JobState.QUEUED, attempt=0)
        transaction.on_commit(partial(publish, job.pk), robust=True)
        job.refresh_from_db()
    return job


def first_look_seconds() -> float:
    """How long a message may be under way before the sweeper publishes another; the setting JOB_REPUBLISH_SECONDS."""
    return float(getattr(settings, "JOB_REPUBLISH_SECONDS", FIRST_LOOK_SECONDS))


def _existing(kind: str, project: Project | None, idem_key: str | None, dedupe_key: str) -> Job | None:
    """The job that these keys already stand for."""
    same = Q(pk__in=[])
    if idem_key:
        same |= Q(idem_key=idem_key)
    if dedupe_key:
        same |= Q(kind=kind, dedupe_key=dedupe_key, state__in=LIVE)
    job = Job.objects.filter(same).order_by("created_at").first()
    if job is not None and (job.kind != kind or job.project_id != (project.pk if project else None)):
        raise Conflict(
            f"The key «{idem_key or dedupe_key}» already stands for another job.", remedy="Use a new key for new work."
        )
    return job


def publish(job_id: UUID) -> bool:
    """Tell the workers about a job. Returns whether the broker took it; the sweeper publishes again if not."""
    try:
        run_job.apply_async(args=(str(job_id),), retry=False)
    except Exception as error:  # noqa: BLE001 - whatever ails the broker, the job row stands and is swept up
        logger.warning("job %s not published yet: %s: %s", job_id, type(error).__name__, error)
        return False
    return True
