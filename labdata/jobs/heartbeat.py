"""A thread beside the running body: renews the lease, writes progress, hears of cancelling, ends a stuck worker."""

import logging
import os
import threading
from collections.abc import Callable
from types import TracebackType
from typing import Self

from django.conf import settings
from django.db import DatabaseError, connection

from labdata.jobs.context import JobContext, LeaseLost
from labdata.jobs.lease import Lease

logger = logging.getLogger(__name__)
STUCK_EXIT = 70
JOIN_SECONDS = 2


def leave_process(reason: str) -> None:
    """End this process at once: a stuck thread cannot be ended alone. The supervisor starts another."""
    logger.error("worker ends itself: %s", reason)
    os._exit(STUCK_EXIT)


class Heartbeat:
    """Use as a context manager around the body. ``on_stall`` must not return to a body that goes on."""

    def __init__(self, lease: Lease, context: JobContext, on_stall: Callable[[str], None] = leave_process) -> None:
        self._lease = lease
        self._context = context
        self._on_stall = on_stall
        self._stop = threading.Event()
        self._thread = threading.Thread(target=self._run, name=f"heartbeat-{lease.job.pk}", daemon=True)

    def __enter__(self) -> Self:
        self._thread.start()
        return self

    def __exit__(self, kind: type[BaseException] | None, error: BaseException | None, at: TracebackType | None) -> None:
        self._stop.set()
        self._thread.join(JOIN_SECONDS)

    def _run(self) -> None:
        try:
            while not self._stop.wait(settings.JOB_LEASE_SECONDS / 4):
                self._beat()
        except LeaseLost:
            self._context.lost.set()
        finally:
            connection.close()

    def _beat(self) -> None:
        """Renew once. A busy or absent database is tried again at the next beat."""
        context = self._context
        try:
            if reason := context.stalled():
                self._lease.give_up(reason)
                self._on_stall(reason)
            elif self._lease.renew(context.done, context.total, context.note):
                context.cancelled.set()
        except DatabaseError as error:
            logger.warning("lease of job %s not renewed: %s", self._lease.job.pk, error)
            connection.close()
