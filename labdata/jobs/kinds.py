"""Every kind of job, and what it may take. The handler is named, not imported: rooms import jobs, never back."""

from collections.abc import Callable
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from django.conf import settings
from django.utils.module_loading import import_string

if TYPE_CHECKING:
    from labdata.jobs.context import JobContext

Handler = Callable[["JobContext"], Callable[[], dict[str, Any]]]


@dataclass(frozen=True)
class Kind:
    """``handler``: dotted path. ``stall_seconds``: longest silence without a tick. ``limit_seconds``: for all of it."""

    handler: str
    max_attempts: int = 3
    stall_seconds: float = 120
    limit_seconds: float = 3600

    def load(self) -> Handler:
        """The handler itself."""
        handler: Handler = import_string(self.handler)
        return handler


KINDS = {
    "intake": Kind("labdata.pipeline.process_upload"),
    "qc": Kind("qc.services.prepare_qc", stall_seconds=300),
    "rehearse": Kind("qc.rehearsal.services.prepare_rehearsal", stall_seconds=600),
    "release": Kind("labdata.release.services.prepare_release", stall_seconds=300),
}


def find(kind: str) -> Kind:
    """The kind by its name. Raises ValueError naming the known ones.

    The setting JOB_KINDS_EXTRA may name a mapping of further kinds by its dotted path.
    """
    further = getattr(settings, "JOB_KINDS_EXTRA", "")
    known: dict[str, Kind] = {**KINDS, **(import_string(further) if further else {})}
    if kind not in known:
        raise ValueError(f"There is no kind of job «{kind}»; known are {', '.join(sorted(known))}.")
    return known[kind]
