"""A second person's signature over exactly what was seen, and how it loses its force."""

from datetime import timedelta

from django.contrib.auth.models import User
from django.db import transaction
from django.utils import timezone

from labdata import audit, fixity
from labdata.access import Action, require
from labdata.errors import Conflict, InvalidInput, OpenResults, SelfSignOff, SigningLocked, WrongPassword
from labdata.models import AuditEntry, Project
from qc.models import Decision, QcRun, Reopening, ReviewSet, ReviewSetState, SignOff, Verdict
from qc.review import changes
from qc.review.seal import content_sha256
from qc.review.standing import valid_signature, verdict_counts

MEANINGS = {
    "reviewed": "I have reviewed these results and their flags, and I approve them for release.",
    "reviewed_rejections": "I have reviewed the accepted results and every rejection, and I approve them for release.",
    "reviewed_limits": "I approve these results for release within the limits stated in the decisions.",
}
MEANING_LENGTH = 300
TRIES = 5
TRIES_WITHIN = timedelta(minutes=15)


def sign_off(
    *, user: User, review_set: ReviewSet, password: str, meaning: str, expected_version: int | None = None
) -> SignOff:
    """Sign the set. ``meaning`` is a key of MEANINGS or the signer's own words.

    Raises NotAllowed (role), SelfSignOff (decided here), OpenResults (undecided or held, with counts), Conflict
    (signed already, empty, or changed since ``expected_version``), InvalidInput (no meaning), WrongPassword, and
    SigningLocked after five wrong passwords within fifteen minutes.
    """
    require(user, review_set.project, Action.SIGN)
    stated = _stated(meaning)
    _refuse_unready(user, review_set)
    check_password(user, review_set.project, password)
    return _sign(user, review_set, stated, expected_version)


@transaction.atomic
def _sign(user: User, review_set: ReviewSet, meaning: str, expected_version: int | None) -> SignOff:
    held = changes.lock(review_set, expected_version)
    counts = _refuse_unready(user, held)
    record = SignOff.objects.create(
        review_set=held, signed_by=user, signer_name=user.get_full_name() or user.get_username(), meaning=meaning,
        content_sha256=content_sha256(held), counts=counts,
        qc_run=QcRun.objects.filter(wells=held.well).order_by("-pk").first(),
    )  # fmt: skip
    changes.bump(held, ReviewSetState.SIGNED)
    changes.log(
        changes.SIGNED, held, user, f"signed {counts['results']} results", sign_off=record.pk,
        content_sha256=record.content_sha256, counts=counts, meaning=meaning,
        facts=fixity.facts("signature", record.pk),
    )  # fmt: skip
    return record


def _stated(meaning: str) -> str:
    """The meaning in words. Raises InvalidInput when there is none, or too many."""
    words = MEANINGS.get(meaning.strip(), meaning.strip())
    if not words:
        raise InvalidInput(
            "A signature states what it means.", remedy=f"Choose one of {', '.join(MEANINGS)}, or say it."
        )
    if len(words) > MEANING_LENGTH:
        raise InvalidInput(
            f"The meaning has {len(words)} characters.", remedy=f"Say it in at most {MEANING_LENGTH}.", field="meaning"
        )
    return words


def _refuse_unready(user: User, review_set: ReviewSet) -> dict[str, int]:
    """See that the set can be signed by this person; returns its counts."""
    changes.refuse_signed(review_set)
    refuse_own(user, review_set)
    counts = verdict_counts(review_set)
    if not counts["results"]:
        raise Conflict(f"{review_set} holds no results.", remedy="There is nothing to sign.")
    refuse_open(review_set, counts)
    return counts


def refuse_own(user: User, review_set: ReviewSet) -> None:
    """Raises SelfSignOff when the user decided anything in the set."""
    own = Decision.objects.filter(review_set=review_set, decided_by=user).count()
    if own:
        raise SelfSignOff(
            f"{user} made {own} of the decisions in {review_set} and may not sign it.",
            remedy="Another approver signs.",
            decisions=own,
        )


def refuse_open(review_set: ReviewSet, counts: dict[str, int]) -> None:
    """Raises OpenResults, with counts, while results are undecided or held."""
    undecided, on_hold = counts[Verdict.UNDECIDED], counts[Verdict.HELD]
    if undecided or on_hold:
        raise OpenResults(
            f"{review_set} is not decided to the end: {undecided} undecided, {on_hold} held of {counts['results']}.",
            remedy="Accept or reject them first.",
            undecided=undecided,
            held=on_hold,
            results=counts["results"],
        )


def check_password(user: User, project: Project, password: str) -> None:
    """Ask for the signer's password again. A wrong one is on record; five in fifteen minutes lock signing.

    The account's row is locked meanwhile, so that tries made side by side are counted one after the other.
    """
    with transaction.atomic():
        signer = User.objects.select_for_update().get(pk=user.pk)
        tries = _wrong_tries(signer)
        right = tries < TRIES and signer.check_password(password)
        if not right and tries < TRIES:
            audit.record(changes.WRONG_PASSWORD, signer, actor=signer, project=project)
    if tries >= TRIES:
        raise SigningLocked(
            f"{TRIES} wrong passwords were given for {user} within {TRIES_WITHIN.seconds // 60} minutes.",
            remedy="Signing is locked; wait and try again.",
        )
    if not right:
        raise WrongPassword(f"That is not the password of {user}.", remedy=f"{TRIES - tries - 1} more tries are left.")


def _wrong_tries(user: User) -> int:
    since = timezone.now() - TRIES_WITHIN
    return AuditEntry.objects.filter(actor=user, action=changes.WRONG_PASSWORD, at__gt=since).count()


@transaction.atomic
def reopen(*, user: User, review_set: ReviewSet, reason: str) -> Reopening:
    """Take the force from a signature, with a reason. Raises NotAllowed, InvalidInput, or Conflict when unsigned."""
    require(user, review_set.project, Action.REOPEN)
    if not reason.strip():
        raise InvalidInput("A set is not re-opened without a reason.", remedy="Say in a few words why.")
    held = changes.lock(review_set)
    if valid_signature(held) is None:
        raise Conflict(f"{held} is not signed.", remedy="It can be decided on as it is.")
    return break_signature(held, actor=user, reason=reason.strip())


def break_signature(review_set: ReviewSet, *, actor: User | None, reason: str) -> Reopening:
    """Re-open a signed, locked set inside the caller's transaction; ``actor`` None: a signed value changed."""
    signature = valid_signature(review_set)
    if signature is None:
        raise Conflict(f"{review_set} is not signed.")
    made = Reopening.objects.create(sign_off=signature, reopened_by=actor, reason=reason)
    changes.bump(review_set, ReviewSetState.OPEN)
    changes.log(
        changes.REOPENED, review_set, actor, "re-opened it", reason=reason, sign_off=signature.pk,
        facts=fixity.facts("re-opening of signature", signature.pk),
    )  # fmt: skip
    return made
