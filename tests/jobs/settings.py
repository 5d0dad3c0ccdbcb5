"""The real settings with the probes as further kinds, for worker processes that tests start."""

from labdata.settings import *  # noqa: F403
from tests.jobs.probes import KINDS

JOB_KINDS_EXTRA = KINDS
