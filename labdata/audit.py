"""Writing and verifying the audit trail.

Every entry carries the SHA-256 of the entry before it; ``record`` is called inside the transaction that makes
the change, as its last statement, so that change and entry stand or fall together and the chain's lock is held
as briefly as possible. Triggers (labdata/triggers.py) refuse updates, deletions and gaps in the database itself.
"""

import hashlib
import json
from collections.abc import Iterator
from datetime import UTC, datetime
from typing import Any

from django.contrib.auth.models import AnonymousUser, User
from django.core.serializers.json import DjangoJSONEncoder
from django.db import connection, models
from django.utils import timezone

from labdata.errors import AuditBroken
from labdata.models import AuditEntry, Project

GENESIS = "0" * 64
CHAIN_LOCK = 0x4B45524F  # advisory lock number of the chain on PostgreSQL
SYSTEM = "system"


def canonical(value: Any) -> str:
    """``value`` as JSON with sorted keys and no blanks: the same text for the same content, everywhere."""
    return json.dumps(value, cls=DjangoJSONEncoder, sort_keys=True, separators=(",", ":"), ensure_ascii=False)


def _plain(value: Any) -> Any:
    """``value`` as it comes back from a JSON column, so that hashing before and after storage agrees."""
    return None if value is None else json.loads(canonical(value))


def entry_hash(entry: AuditEntry) -> str:
    """SHA-256 over everything the entry says and the hash of the one before it."""
    content = [
        entry.seq, entry.at.astimezone(UTC).isoformat(timespec="microseconds"), entry.actor_id, entry.actor_name,
        entry.project_id, entry.action, entry.object_type, entry.object_id, entry.before, entry.after, entry.reason,
        entry.prev_hash,
    ]  # fmt: skip
    return hashlib.sha256(canonical(content).encode()).hexdigest()


def record(
    action: str,
    thing: models.Model,
    *,
    actor: User | AnonymousUser | None,
    project: Project | None,
    before: Any = None,
    after: Any = None,
    reason: str = "",
) -> AuditEntry:
    """Append one entry about ``thing``. Raises RuntimeError outside a transaction.

    ``actor`` None means the service itself. Call it as the last statement of the transaction.
    """
    if not connection.in_atomic_block:
        raise RuntimeError("audit.record belongs inside the transaction that it speaks of")
    if connection.vendor == "postgresql":
        with connection.cursor() as cursor:
            cursor.execute("SELECT pg_advisory_xact_lock(%s)", [CHAIN_LOCK])
    last = AuditEntry.objects.order_by("-seq").values_list("seq", "hash").first()
    person = actor if isinstance(actor, User) else None
    entry = AuditEntry(
        seq=last[0] + 1 if last else 1,
        at=timezone.now(),
        actor=person,
        actor_name=person.get_username() if person else SYSTEM,
        project=project,
        action=action,
        object_type=thing._meta.model_name or "",
        object_id=str(thing.pk),
        before=_plain(before),
        after=_plain(after),
        reason=reason,
        prev_hash=last[1] if last else GENESIS,
    )
    entry.hash = entry_hash(entry)
    entry.save(force_insert=True)
    return entry


def verify() -> dict[str, Any]:
    """Walk the whole chain. Returns {entries, head, verified_at}; raises AuditBroken naming the first bad entry."""
    expected_seq, expected_prev = 1, GENESIS
    for entry in _entries():
        about = f"{entry.object_type} {entry.object_id}"
        where: dict[str, Any] = {"seq": entry.seq, "action": entry.action, "object": about}
        if entry.seq != expected_seq:
            raise AuditBroken(f"Entry {expected_seq} of the audit trail is missing; {entry.seq} follows.", **where)
        if entry.prev_hash != expected_prev:
            raise AuditBroken(f"Entry {entry.seq} does not continue entry {entry.seq - 1}.", **where)
        if entry.hash != entry_hash(entry):
            raise AuditBroken(f"Entry {entry.seq} ({entry.action}) was altered after it was written.", **where)
        expected_seq, expected_prev = entry.seq + 1, entry.hash
    return {"entries": expected_seq - 1, "head": expected_prev, "verified_at": datetime.now(UTC).isoformat()}


def _entries() -> Iterator[AuditEntry]:
    return AuditEntry.objects.order_by("seq").iterator(chunk_size=2000)
