"""The real settings with the probes as further kinds, for worker processes that tests start."""

from labdata.settings import *  # noqa: F403

JOB_KINDS_EXTRA = "tests.jobs.probes.KINDS"
JOB_REPUBLISH_SECONDS = 4.0
