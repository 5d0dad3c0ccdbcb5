"""Calling a job off: at once while it waits, at its next tick while it runs. It may be too late."""

from django.contrib.auth.models import User
from django.db import transaction
from django.db.models.functions import Now

from labdata import audit
from labdata.access import Action, require
from labdata.errors import NotAllowed
from labdata.jobs.lease import note_event
from labdata.models import Job, JobState, Membership, Role


def request_cancel(job: Job, user: User) -> Job:
    """Ask for ``job`` to be called off. Returns it as it now is; a job that has ended stays as it ended.

    Its author may, and the project's administrators. Raises NotFound for strangers, NotAllowed for others.
    """
    _require(job, user)
    with transaction.atomic():
        text = f"Cancelled by {user.get_username()} before it began."
        cancelled = Job.objects.filter(pk=job.pk, state=JobState.QUEUED).update(
            state=JobState.CANCELLED, error_code="cancelled", error_message=text, finished_at=Now()
        )
        if cancelled:
            note_event(job.pk, JobState.QUEUED, JobState.CANCELLED, attempt=job.attempt, note=text)
        asked = cancelled or Job.objects.filter(pk=job.pk, state=JobState.RUNNING).update(cancel_requested=True)
        if asked:
            audit.record("job.cancelled", job, actor=user, project=job.project, after={"kind": job.kind})
    job.refresh_from_db()
    return job


def _require(job: Job, user: User) -> None:
    if job.project is None:
        allowed = user.is_superuser or job.created_by_id == user.pk
    else:
        require(user, job.project, Action.VIEW)
        administers = Membership.objects.filter(user=user, project=job.project, role=Role.ADMINISTRATOR).exists()
        allowed = administers or job.created_by_id == user.pk
    if not allowed:
        raise NotAllowed(f"{user} may not cancel this job.", remedy="Its author and the project's administrators may.")
