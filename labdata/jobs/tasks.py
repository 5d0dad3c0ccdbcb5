"""The one Celery task. It carries a job's id; the database decides whether there is anything to do."""

import logging
from uuid import UUID

from celery import shared_task

from labdata.jobs.runner import CURRENT, run

logger = logging.getLogger(__name__)


@shared_task(name="labdata.run_job", ignore_result=True)
def run_job(job_id: str) -> None:
    """Run the job if it still waits. An id that this database does not know is somebody else's: ignored."""
    try:
        lease = CURRENT.claim(UUID(str(job_id)))
    except ValueError:
        logger.warning("message with «%s», which is no job id, ignored", job_id)
        return
    if lease is None:
        logger.info("job %s: nothing to do", job_id)
    else:
        run(lease)
