"""One change to a review set: lock it, see that nothing moved meanwhile, raise its version, leave the audit record."""

from datetime import datetime
from typing import Any, NamedTuple

from labdata import audit
from labdata.access import AnyUser
from labdata.errors import Conflict
from labdata.models import AuditEntry
from qc.models import ReviewSet, ReviewSetState
from qc.review.standing import valid_signature

DECIDED = "review.decided"
UNDONE = "review.undone"
ANSWERED = "review.flags_answered"
NOTED = "review.noted"
TAKEN_IN = "review.taken_in"
SIGNED = "review.signed"
REOPENED = "review.reopened"
WRONG_PASSWORD = "review.wrong_password"


def lock(review_set: ReviewSet, expected_version: int | None = None) -> ReviewSet:
    """The set as it now is, locked until the transaction ends. Raises Conflict when it has changed since."""
    held = ReviewSet.objects.select_for_update(of=("self",)).select_related("project", "well").get(pk=review_set.pk)
    if expected_version is not None and expected_version != held.version:
        raise Conflict(
            f"{held} has changed since you loaded it: {_meanwhile(held, expected_version)}.",
            remedy="Look at what was decided, then decide again.",
            expected_version=expected_version,
            version=held.version,
        )
    return held


def refuse_signed(review_set: ReviewSet) -> None:
    """Raises Conflict when a signature is in force."""
    signature = valid_signature(review_set)
    if signature:
        raise Conflict(
            f"{review_set} was signed by {signature.signer_name} on {signature.signed_at:%Y-%m-%d %H:%M} UTC.",
            remedy="An approver can re-open it with a reason.",
            review_set=review_set.pk,
        )


def bump(review_set: ReviewSet, state: ReviewSetState | None = None) -> None:
    """Raise the version (and set the state): whoever looked at the set before must look again."""
    review_set.version += 1
    review_set.state = state or review_set.state
    review_set.save(update_fields=["version", "state"])


def log(
    action: str,
    review_set: ReviewSet,
    actor: AnyUser | None,
    what: str,
    *,
    before: Any = None,
    reason: str = "",
    **after: Any,
) -> None:
    """The audit record of a change: ``what`` in words, the version reached, and the particulars."""
    audit.record(
        action, review_set, actor=actor, project=review_set.project,  # type: ignore[arg-type]
        before=before, after={"version": review_set.version, "what": what, **after}, reason=reason,
    )  # fmt: skip


class Event(NamedTuple):
    """One change of a set in words."""

    at: datetime
    by: str
    what: str
    reason: str


def history(review_set: ReviewSet, since_version: int = 0, *, latest: int) -> list[Event]:
    """The latest changes of the set after ``since_version``, newest first."""
    entries = AuditEntry.objects.filter(object_type="reviewset", object_id=str(review_set.pk))
    newest = entries.filter(after__version__gt=since_version).order_by("-seq")
    return [Event(*row) for row in newest.values_list("at", "actor_name", "after__what", "reason")[:latest]]


def _meanwhile(review_set: ReviewSet, since_version: int) -> str:
    """Who did what, in words: at most the latest five changes."""
    said = [f"{event.by} {event.what}" for event in reversed(history(review_set, since_version, latest=5))]
    return "; ".join(said) or f"it is at version {review_set.version}, not {since_version}"
