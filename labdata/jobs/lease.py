"""Who has a job: claiming it, keeping it, ending it. Every write by a worker is fenced by its lease token."""

import json
import os
import socket
import uuid
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

from django.conf import settings
from django.db import transaction
from django.db.models import F, QuerySet
from django.db.models.functions import Now

from labdata.audit import canonical
from labdata.jobs.clock import after
from labdata.jobs.context import LeaseLost
from labdata.models import Job, JobEvent, JobState

NO_LEASE: dict[str, Any] = {"lease_token": None, "lease_until": None}


def worker_name() -> str:
    """This process, for people: machine and process number."""
    return f"{socket.gethostname()}:{os.getpid()}"[:120]


def note_event(job_id: uuid.UUID, before: str, now: str, *, attempt: int, worker: str = "", note: str = "") -> None:
    """Keep one change of state."""
    JobEvent.objects.create(
        job_id=job_id, from_state=before, to_state=now, attempt=attempt, worker=worker, note=note, at=Now()
    )


def claim(job_id: uuid.UUID | str) -> "Lease | None":
    """Take a queued job. Returns None when there is no such job or somebody else was faster."""
    token, worker = uuid.uuid4(), worker_name()
    with transaction.atomic():
        taken = Job.objects.filter(pk=job_id, state=JobState.QUEUED).update(
            state=JobState.RUNNING,
            lease_token=token,
            lease_until=after(settings.JOB_LEASE_SECONDS),
            worker=worker,
            attempt=F("attempt") + 1,
            started_at=Now(),
            progress_done=0,
            progress_total=0,
            progress_note="",
            error_code="",
            error_message="",
            error_detail="",
        )
        if not taken:
            return None
        job = Job.objects.select_related("project", "created_by").get(pk=job_id)
        note_event(job.pk, JobState.QUEUED, JobState.RUNNING, attempt=job.attempt, worker=worker)
    return Lease(job, token)


@dataclass(frozen=True)
class Lease:
    """The right to work on ``job``. Methods raise LeaseLost once another worker may have it."""

    job: Job
    token: uuid.UUID

    def held(self) -> QuerySet[Job]:
        """The job, if this lease still holds it."""
        return Job.objects.filter(pk=self.job.pk, lease_token=self.token, state=JobState.RUNNING)

    def renew(self, done: int, total: int, note: str) -> bool:
        """Keep the job for another lease and write its progress. Returns whether somebody wants it cancelled."""
        kept = self.held().update(
            lease_until=after(settings.JOB_LEASE_SECONDS), progress_done=done, progress_total=total, progress_note=note
        )
        if not kept:
            raise LeaseLost
        return Job.objects.filter(pk=self.job.pk, cancel_requested=True).exists()

    def succeed(self, commit: Callable[[], dict[str, Any] | None]) -> None:
        """End the job and write all it found, in one transaction whose first statement is the fence."""
        with transaction.atomic():
            self._end(JobState.SUCCEEDED, progress_done=F("progress_total"))
            result = commit() or {}
            if result:
                Job.objects.filter(pk=self.job.pk).update(result=_plain(result))

    def fail(self, code: str, message: str, detail: str = "") -> None:
        """End the job without result, saying why."""
        with transaction.atomic():
            self._end(JobState.FAILED, note=message, error_code=code[:60], error_message=message, error_detail=detail)

    def cancel(self) -> None:
        """End the job since somebody asked for it."""
        text = "Cancelled while it ran; nothing was written."
        with transaction.atomic():
            self._end(JobState.CANCELLED, note=text, error_code="cancelled", error_message=text)

    def hand_back(self, note: str, *, code: str = "", wait: float = 0, counts: bool = False) -> None:
        """Queue the job again after ``wait`` seconds. The attempt is forgotten unless it ``counts``."""
        with transaction.atomic():
            given = self.held().update(
                state=JobState.QUEUED,
                attempt=F("attempt") - (0 if counts else 1),
                next_dispatch_at=after(wait),
                error_code=code,
                error_message=note if code else "",
                **NO_LEASE,
            )
            if not given:
                raise LeaseLost
            note_event(
                self.job.pk, JobState.RUNNING, JobState.QUEUED,
                attempt=self.job.attempt, worker=self.job.worker, note=note,
            )  # fmt: skip

    def give_up(self, reason: str) -> None:
        """Let the lease lapse at once since the body is stuck; the sweeper decides what becomes of the job."""
        if not self.held().update(error_code="stalled", error_message=reason, lease_until=after(-1)):
            raise LeaseLost

    def _end(self, state: JobState, note: str = "", **fields: Any) -> None:
        if not self.held().update(state=state, finished_at=Now(), **fields, **NO_LEASE):
            raise LeaseLost
        note_event(self.job.pk, JobState.RUNNING, state, attempt=self.job.attempt, worker=self.job.worker, note=note)


def _plain(result: dict[str, Any]) -> Any:
    """``result`` as plain JSON data: dates and ids become text."""
    return json.loads(canonical(result))
