"""Jobs without a worker: a command runs them in its own process, or waits for the worker that was faster."""

import os
import sys
import time

from labdata.jobs.lease import claim
from labdata.jobs.outbox import LIVE
from labdata.jobs.runner import run
from labdata.jobs.sweeper import reclaim_by_id
from labdata.models import Job, JobState, Project

LOOK_SECONDS = 0.1


def run_here(job: Job) -> Job:
    """Claim and run ``job`` in this process, or wait until the worker that took it has ended it. Returns it as it is."""
    while not job.settled:
        if lease := claim(job.pk):
            run(lease, on_stall=_give_up)
        elif not reclaim_by_id(job.pk):
            time.sleep(LOOK_SECONDS)
        job.refresh_from_db()
    return job


def run_all_here(project: Project | None = None) -> list[Job]:
    """Run every live job (of ``project``) and those they queue, oldest first, until none is left."""
    done: list[Job] = []
    while job := _next(project):
        done.append(run_here(job))
    return done


def _next(project: Project | None) -> Job | None:
    jobs = Job.objects.filter(state__in=LIVE)
    if project is not None:
        jobs = jobs.filter(project=project)
    waiting = jobs.filter(state=JobState.QUEUED).order_by("created_at").first()
    return waiting or jobs.order_by("created_at").first()


def _give_up(reason: str) -> None:
    print(f"The job is stuck: {reason}. It is tried again by the next worker.", file=sys.stderr)
    os._exit(1)
