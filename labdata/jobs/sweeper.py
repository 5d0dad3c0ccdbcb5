"""Nothing is left lying: jobs of dead workers are queued again or failed, unpublished ones are published.

Any number of sweepers may run. Each change compares and sets in one UPDATE, so that two of them never both act;
SKIP LOCKED, where the database has it, only saves them from waiting for each other.
"""

import logging
import random
import threading
from uuid import UUID

from django.conf import settings
from django.db import DatabaseError, connection, transaction
from django.db.models import F, QuerySet
from django.db.models.functions import Now

from labdata.jobs.clock import after
from labdata.jobs.lease import NO_LEASE, note_event, worker_name
from labdata.jobs.outbox import first_look_seconds, publish
from labdata.models import Job, JobState, SweeperBeat

logger = logging.getLogger(__name__)
AT_ONCE = 200
LONGEST_WAIT_SECONDS = 7200
FORGET_WORKER_SECONDS = 86_400


def sweep() -> None:
    """One pass: lapsed leases, unpublished jobs, and a sign that this worker lives."""
    for job in lapsed()[:AT_ONCE]:
        reclaim(job)
    for job in due()[:AT_ONCE]:
        republish(job)
    SweeperBeat.objects.update_or_create(worker=worker_name(), defaults={"at": Now()})
    SweeperBeat.objects.filter(at__lt=after(-FORGET_WORKER_SECONDS)).delete()


def lapsed() -> QuerySet[Job]:
    """Running jobs whose worker no longer renews its lease."""
    return Job.objects.filter(state=JobState.RUNNING, lease_until__lt=Now()).order_by("lease_until")


def due() -> QuerySet[Job]:
    """Queued jobs that should have begun by now."""
    return Job.objects.filter(state=JobState.QUEUED, next_dispatch_at__lte=Now()).order_by("next_dispatch_at")


def reclaim(job: Job) -> bool:
    """Decide about a job whose lease lapsed: cancelled if asked, failed after its last attempt, else queued again.

    Returns whether this call did; False when another sweeper was faster or the worker had renewed meanwhile.
    """
    why = job.error_message if job.error_code == "stalled" else _death(job)
    with transaction.atomic():
        row = Job.objects.filter(pk=job.pk, state=JobState.RUNNING, lease_token=job.lease_token, lease_until__lt=Now())
        if not row.select_for_update(skip_locked=True).values_list("pk").first():
            return False
        if job.cancel_requested:
            state, code, text = JobState.CANCELLED, "cancelled", f"Cancelled; {why}."
        elif job.attempt >= job.max_attempts:
            state, code, text = JobState.FAILED, job.error_code or "worker_died", _tried(job, why)
        else:
            state, code, text = JobState.QUEUED, "", ""
        ended = None if state == JobState.QUEUED else Now()
        changed = row.update(
            state=state, error_code=code, error_message=text, finished_at=ended, next_dispatch_at=Now(), **NO_LEASE
        )
        if changed:
            note_event(
                job.pk,
                JobState.RUNNING,
                state,
                attempt=job.attempt,
                worker=job.worker,
                note=text or f"Queued again: {why}.",
            )
    return bool(changed)


def _death(job: Job) -> str:
    at = f" at step «{job.progress_note}»" if job.progress_note else ""
    return f"the worker ({job.worker}) died{at}"


def _tried(job: Job, why: str) -> str:
    times = "once" if job.attempt == 1 else f"{job.attempt} times"
    return f"Tried {times}; the last time {why}."


def republish(job: Job) -> bool:
    """Publish a queued job and look again later, each time twice as late. Returns whether this call did."""
    wait = min(first_look_seconds() * 2 ** min(job.dispatch_count, 10), LONGEST_WAIT_SECONDS)
    mine = Job.objects.filter(pk=job.pk, state=JobState.QUEUED, dispatch_count=job.dispatch_count).update(
        dispatch_count=F("dispatch_count") + 1, next_dispatch_at=after(wait)
    )
    return bool(mine) and publish(job.pk)


def republish_all() -> int:
    """Make every queued job due at once: the broker starts empty, so no message is on its way."""
    return Job.objects.filter(state=JobState.QUEUED).update(next_dispatch_at=Now())


class Sweeper(threading.Thread):
    """Sweeps every JOB_SWEEP_SECONDS, give or take a third, in every worker."""

    def __init__(self) -> None:
        super().__init__(name="sweeper", daemon=True)
        self._stop_asked = threading.Event()

    def run(self) -> None:
        while True:
            self._pass()
            if self._stop_asked.wait(settings.JOB_SWEEP_SECONDS * random.uniform(0.7, 1.3)):
                return

    def stop(self) -> None:
        """Ask it to end after the pass it is in."""
        self._stop_asked.set()

    def _pass(self) -> None:
        try:
            sweep()
        except DatabaseError as error:
            logger.warning("sweep not done, the database is busy or away: %s", error)
        except Exception:
            logger.exception("sweep failed")
        finally:
            connection.close()  # a forked child must never inherit it


def reclaim_by_id(job_id: UUID) -> bool:
    """Reclaim one job if its lease has lapsed."""
    job = lapsed().filter(pk=job_id).first()
    return job is not None and reclaim(job)
