"""Background work. The database owns a job; Celery only carries its id (labdata/jobs)."""

import uuid

from django.conf import settings
from django.db import models
from django.utils import timezone

from labdata.models.base import Choices
from labdata.models.projects import Project


class JobState(Choices):
    QUEUED = "queued", "queued"
    RUNNING = "running", "running"
    SUCCEEDED = "succeeded", "succeeded"
    FAILED = "failed", "failed"
    CANCELLED = "cancelled", "cancelled"


class Job(models.Model):
    """One piece of work: who wants what, how far it is, how it ended.

    ``idem_key`` is unique for ever (the same request made twice is one job); ``dedupe_key`` is unique
    with ``kind`` while the job is queued or running. A running job has a lease; a write by a worker
    that has lost the lease is refused.
    """

    id = models.UUIDField(primary_key=True, default=uuid.uuid4, editable=False)
    project = models.ForeignKey(Project, on_delete=models.CASCADE, null=True, blank=True, related_name="jobs")
    kind = models.CharField(max_length=40)
    params = models.JSONField(default=dict)
    state = models.CharField(max_length=10, choices=JobState.choices, default=JobState.QUEUED)
    created_by = models.ForeignKey(settings.AUTH_USER_MODEL, on_delete=models.SET_NULL, null=True, blank=True)
    idem_key = models.CharField(max_length=200, null=True, blank=True, unique=True)
    dedupe_key = models.CharField(max_length=200, blank=True)
    attempt = models.PositiveSmallIntegerField(default=0)
    max_attempts = models.PositiveSmallIntegerField(default=3)
    dispatch_count = models.PositiveIntegerField(default=0)
    next_dispatch_at = models.DateTimeField(default=timezone.now)
    lease_token = models.UUIDField(null=True, blank=True)
    lease_until = models.DateTimeField(null=True, blank=True)
    worker = models.CharField(max_length=120, blank=True)
    cancel_requested = models.BooleanField(default=False)
    progress_done = models.PositiveIntegerField(default=0)
    progress_total = models.PositiveIntegerField(default=0)
    progress_note = models.CharField(max_length=300, blank=True)
    result = models.JSONField(default=dict, blank=True)
    error_code = models.CharField(max_length=60, blank=True)
    error_message = models.TextField(blank=True)
    error_detail = models.TextField(blank=True)
    created_at = models.DateTimeField(default=timezone.now, editable=False)
    started_at = models.DateTimeField(null=True, blank=True)
    finished_at = models.DateTimeField(null=True, blank=True)

    class Meta:
        ordering = ["-created_at"]
        constraints = [
            JobState.constraint("state", "job_state_known"),
            models.CheckConstraint(
                condition=(
                    models.Q(state="running", lease_token__isnull=False, lease_until__isnull=False)
                    | (~models.Q(state="running") & models.Q(lease_token__isnull=True, lease_until__isnull=True))
                ),
                name="job_lease_only_while_running",
            ),
            models.CheckConstraint(
                condition=~models.Q(state__in=["failed", "cancelled"]) | ~models.Q(error_message=""),
                name="job_failure_says_why",
            ),
            models.UniqueConstraint(
                fields=["kind", "dedupe_key"],
                condition=models.Q(state__in=["queued", "running"]) & ~models.Q(dedupe_key=""),
                name="job_dedupe_while_live",
            ),
        ]
        indexes = [
            models.Index(fields=["next_dispatch_at"], condition=models.Q(state="queued"), name="job_to_dispatch"),
            models.Index(fields=["lease_until"], condition=models.Q(state="running"), name="job_leases"),
        ]

    def __str__(self) -> str:
        return f"{self.kind} {self.pk}"

    @property
    def settled(self) -> bool:
        """True once the job has ended, well or not."""
        return self.state in {JobState.SUCCEEDED, JobState.FAILED, JobState.CANCELLED}


class JobEvent(models.Model):
    """One change of a job's state."""

    job = models.ForeignKey(Job, on_delete=models.CASCADE, related_name="events")
    from_state = models.CharField(max_length=10, blank=True)
    to_state = models.CharField(max_length=10)
    at = models.DateTimeField(default=timezone.now)
    attempt = models.PositiveSmallIntegerField(default=0)
    worker = models.CharField(max_length=120, blank=True)
    note = models.TextField(blank=True)

    class Meta:
        ordering = ["id"]

    def __str__(self) -> str:
        return f"{self.job_id}: {self.from_state} -> {self.to_state}"


class SweeperBeat(models.Model):
    """When a worker last swept; /healthz and the banner read it."""

    worker = models.CharField(max_length=120, unique=True)
    at = models.DateTimeField()

    def __str__(self) -> str:
        return f"{self.worker} {self.at}"
