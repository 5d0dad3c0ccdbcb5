"""Fixed facts and the audit trail hold each other.

Results, decisions, signatures, re-openings and releases never change once written. The audit entry that records
one carries the digest of its rows as they are in the database; ``verify`` computes the digests again and compares.
So rows altered, removed or put in behind the triggers are found, and so is a trail whose end was cut off: the facts
that it spoke of are still there.
"""

import hashlib
from collections.abc import Iterable, Iterator
from datetime import UTC, datetime
from itertools import groupby
from typing import Any, NamedTuple

from django.apps import apps
from django.db.models import QuerySet

from labdata.errors import AuditBroken
from labdata.models import AuditEntry

CHUNK = 5000


class Kind(NamedTuple):
    """One table of facts: rows with the same ``group`` are recorded together; ``columns`` never change."""

    model: str
    group: tuple[str, ...]
    columns: tuple[str, ...]

    def rows(self) -> QuerySet[Any]:
        return apps.get_model(self.model)._default_manager.order_by(*self.group, "pk")


KINDS = {
    "results of report": Kind(
        "labdata.Result",
        ("analysis__report_id",),
        ("pk", "analysis_id", "analyte_id", "column_id", "value", "qualifier", "value_reported", "decimals",
         "supersedes_id"),
    ),
    "decisions": Kind(
        "qc.Decision",
        ("review_set_id", "batch"),
        ("pk", "result_id", "verdict", "reason", "text", "decided_by_id", "decided_at", "carried_from_id"),
    ),
    "signature": Kind(
        "qc.SignOff",
        ("pk",),
        ("review_set_id", "signed_by_id", "signer_name", "signed_at", "meaning", "content_sha256", "qc_run_id"),
    ),
    "re-opening of signature": Kind("qc.Reopening", ("sign_off_id",), ("reopened_by_id", "reopened_at", "reason")),
    "release": Kind(
        "labdata.Release",
        ("pk",),
        ("project_id", "number", "title", "created_by_id", "created_at", "manifest_sha256", "data_sha256", "stored_as",
         "analysis_count", "result_count"),
    ),
}  # fmt: skip


def facts(kind: str, *key: Any) -> dict[str, str]:
    """What an audit entry keeps of the rows of ``key``, inside the transaction that wrote them: name -> digest.

    ``kind`` is one of ``KINDS``, ``key`` the values of its group. Raises LookupError where no such rows are.
    """
    about = KINDS[kind]
    rows = about.rows().filter(**dict(zip(about.group, key, strict=True)))
    found = dict(_digests(kind, rows))
    if not found:
        raise LookupError(f"there are no {kind} {key}")
    return found


def verify() -> dict[str, int]:
    """Hold every fact against the entry that recorded it. Returns how many of each kind there are.

    Raises AuditBroken naming the first that was altered, has no entry, or is gone.
    """
    recorded: dict[str, str] = {}
    for kept in AuditEntry.objects.filter(after__facts__isnull=False).values_list("after__facts", flat=True).iterator():
        recorded.update(kept)
    counts = {}
    for kind, about in KINDS.items():
        counts[kind] = 0
        for name, digest in _digests(kind, about.rows()):
            _compare(name, digest, recorded.pop(name, None))
            counts[kind] += 1
    if recorded:
        name = min(recorded)
        raise AuditBroken(f"«{name}» is in the audit trail and no longer in the database.", fact=name)
    return counts


def _compare(name: str, digest: str, recorded: str | None) -> None:
    if recorded is None:
        raise AuditBroken(
            f"«{name}» is in the database, and no audit entry speaks of it: the trail was cut or the rows were put in "
            "behind it.",
            fact=name,
        )
    if recorded != digest:
        raise AuditBroken(f"«{name}» was altered after it was recorded.", fact=name)


def _digests(kind: str, rows: QuerySet[Any]) -> Iterator[tuple[str, str]]:
    """(name, SHA-256) of every group of ``rows``, which come in the order of the group."""
    about = KINDS[kind]
    width = len(about.group)
    values = rows.values_list(*about.group, *about.columns).iterator(chunk_size=CHUNK)
    for key, some in groupby(values, key=lambda row: row[:width]):
        yield f"{kind} {' '.join(str(part) for part in key)}", _digest(row[width:] for row in some)


def _digest(rows: Iterable[tuple[Any, ...]]) -> str:
    whole = hashlib.sha256()
    for row in rows:
        whole.update(repr(tuple(map(_plain, row))).encode())
    return whole.hexdigest()


def _plain(value: Any) -> Any:
    """A value as both databases give it back: times as text, in UTC to the microsecond."""
    return value.astimezone(UTC).isoformat(timespec="microseconds") if isinstance(value, datetime) else value
