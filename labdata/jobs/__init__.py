"""Background work. The database owns every job; a message only says that there is one.

``enqueue`` inside the transaction that needs the work; a handler (kinds.py) computes outside any transaction and
returns its commit; the commit and the job's end are one fenced transaction, so that it is applied exactly once.
"""

from labdata.jobs.cancel import request_cancel
from labdata.jobs.context import JobCancelled, JobContext, JobError
from labdata.jobs.here import run_all_here, run_here
from labdata.jobs.outbox import enqueue

__all__ = ["JobCancelled", "JobContext", "JobError", "enqueue", "request_cancel", "run_all_here", "run_here"]
