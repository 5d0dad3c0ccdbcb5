"""Running a claimed job: body outside any transaction, its commit in one short fenced one, every end told clearly."""

import logging
import threading
import traceback
from collections.abc import Callable
from uuid import UUID

from django.db import InterfaceError, OperationalError

from labdata.errors import KerogateError
from labdata.jobs import kinds
from labdata.jobs.context import JobCancelled, JobContext, JobInterrupted, LeaseLost
from labdata.jobs.heartbeat import Heartbeat, leave_process
from labdata.jobs.lease import Lease, claim

logger = logging.getLogger(__name__)
DATABASE_RETRY_SECONDS = 5


class _Current:
    """What this process works on, for the thread that ends the process in good order."""

    def __init__(self) -> None:
        self.lease: Lease | None = None
        self.context: JobContext | None = None
        self._closing = threading.Lock()
        self._closed = False

    def claim(self, job_id: UUID) -> Lease | None:
        """Take a job unless the process is about to end."""
        with self._closing:
            self.lease = None if self._closed else claim(job_id)
            return self.lease

    def close(self) -> None:
        """Take no further job."""
        with self._closing:
            self._closed = True


CURRENT = _Current()


def run(lease: Lease, on_stall: Callable[[str], None] = leave_process) -> None:
    """Do the job that ``lease`` holds. Returns when it has ended, well or not, or was handed back."""
    try:
        _run_body(lease, on_stall)
    except LeaseLost:
        logger.warning("job %s is somebody else's by now; its late end was not written", lease.job.pk)
    finally:
        CURRENT.lease = CURRENT.context = None


def _run_body(lease: Lease, on_stall: Callable[[str], None]) -> None:
    try:
        kind = kinds.find(lease.job.kind)
        context = JobContext(lease.job, lease, stall_seconds=kind.stall_seconds, limit_seconds=kind.limit_seconds)
        CURRENT.lease, CURRENT.context = lease, context
        with Heartbeat(lease, context, on_stall):
            commit = kind.load()(context)
            with context.step("writing", allow=kind.stall_seconds * 2):
                context.seal()
                lease.succeed(commit)
    except LeaseLost:
        raise
    except JobCancelled:
        lease.cancel()
    except JobInterrupted:
        lease.hand_back("The worker was stopped; the job waits for the next one.")
    except (SystemExit, KeyboardInterrupt):
        lease.hand_back("The worker was stopped; the job waits for the next one.")
        raise
    except KerogateError as refusal:
        lease.fail(refusal.code, str(refusal))
    except (OperationalError, InterfaceError) as error:
        _database_away(lease, error)
    except Exception as error:
        logger.exception("job %s (%s) failed", lease.job.pk, lease.job.kind)
        lease.fail("internal", f"Internal error: {type(error).__name__}: {error}", traceback.format_exc())


def _database_away(lease: Lease, error: Exception) -> None:
    """Try the job again later; if not even that can be written, its lease lapses and the sweeper does."""
    text = f"The database could not be used: {error}"
    logger.warning("job %s: %s", lease.job.pk, text)
    try:
        if lease.job.attempt >= lease.job.max_attempts:
            lease.fail("database", text, traceback.format_exc())
        else:
            lease.hand_back(text, code="database", wait=DATABASE_RETRY_SECONDS * lease.job.attempt, counts=True)
    except (OperationalError, InterfaceError):
        logger.warning("job %s is left to the sweeper", lease.job.pk)
