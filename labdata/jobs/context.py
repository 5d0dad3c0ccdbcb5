"""What a handler sees of its job: a way to tell how far it is, and to learn that it should stop."""

import logging
import threading
import time
from collections.abc import Iterator
from contextlib import contextmanager
from typing import TYPE_CHECKING, Any

from django.db import OperationalError, connection

from labdata.errors import KerogateError
from labdata.models import Job

if TYPE_CHECKING:
    from labdata.jobs.lease import Lease

logger = logging.getLogger(__name__)
WRITE_EVERY_SECONDS = 1.0
NOTE_LENGTH = 300


class JobError(KerogateError):
    """A failure that the user should read as it stands; the job is not tried again."""

    def __init__(self, code: str, message: str, **more: Any) -> None:
        super().__init__(message, **more)
        self.code = code  # type: ignore[misc]


class JobCancelled(Exception):
    """Somebody asked for the job to stop."""


class JobInterrupted(Exception):
    """The worker is stopping; the job goes back to the queue."""


class LeaseLost(Exception):
    """Another worker has the job by now; nothing of this one's may be written."""


class JobContext:
    """Given to every handler. ``job`` is as it was when claimed; ``tick`` at least every ``stall`` seconds."""

    def __init__(self, job: Job, lease: "Lease", *, stall_seconds: float, limit_seconds: float) -> None:
        self.job = job
        self.note = ""
        self.done = 0
        self.total = 0
        self.cancelled = threading.Event()
        self.interrupted = threading.Event()
        self.lost = threading.Event()
        self._lease = lease
        self._allowed = stall_seconds
        self._limit = limit_seconds
        self._committing = False
        self._started = self._ticked = time.monotonic()
        self._written = float("-inf")

    def tick(self, done: int | None = None, total: int | None = None, note: str = "") -> None:
        """Say that the work goes on: ``done`` of ``total``, at the step ``note``.

        Raises JobCancelled, JobInterrupted or LeaseLost when it should not go on. Cheap: the database is written
        for a new note, else once a second at most.
        """
        self._ticked = time.monotonic()
        if self._committing:
            return
        self._stop_if_told()
        changed = bool(note) and note[:NOTE_LENGTH] != self.note
        self.note = note[:NOTE_LENGTH] or self.note
        self.done = self.done if done is None else done
        self.total = self.total if total is None else total
        if changed or self._ticked - self._written >= WRITE_EVERY_SECONDS:
            self._write()

    @contextmanager
    def step(self, note: str, allow: float) -> Iterator[None]:
        """A step that cannot tick, such as one long pandas call; it may take ``allow`` seconds."""
        self.tick(note=note)
        before, self._allowed = self._allowed, max(allow, self._allowed)
        try:
            yield
        finally:
            self._allowed = before
        self.tick()

    def seal(self) -> None:
        """From here on the commit runs: ticks only keep it alive. Raises when it should not begin."""
        self._stop_if_told()
        self._ticked = time.monotonic()
        self._committing = True

    def stalled(self) -> str:
        """Why the job counts as stuck, or nothing."""
        now = time.monotonic()
        at = f" at step «{self.note}»" if self.note else ""
        if now - self._ticked > self._allowed:
            return f"no progress for {now - self._ticked:.0f} s{at}"
        if now - self._started > self._limit:
            return f"not done after {now - self._started:.0f} s{at}"
        return ""

    def _stop_if_told(self) -> None:
        if self.lost.is_set():
            raise LeaseLost
        if self.cancelled.is_set():
            raise JobCancelled
        if self.interrupted.is_set():
            raise JobInterrupted

    def _write(self) -> None:
        """Keep the progress and learn of a wish to cancel; a busy database is no reason to fail."""
        self._written = time.monotonic()
        try:
            if self._lease.renew(self.done, self.total, self.note):
                raise JobCancelled
        except OperationalError:
            if connection.in_atomic_block:
                raise
            logger.info("progress of job %s not written, the database is busy", self.job.pk)
