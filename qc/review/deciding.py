"""Deciding on results and answering flags. One call is one transaction and one audit record."""

from collections import Counter
from collections.abc import Iterable, Sequence
from uuid import UUID, uuid4

from django.contrib.auth.models import User
from django.db import transaction

from labdata import fixity
from labdata.access import Action, require
from labdata.errors import Conflict, InvalidInput, NotAllowed, NotFound
from labdata.models import AuditEntry, Result
from qc.models import Decision, FlagAnswer, ReasonCode, ReviewSet, Verdict
from qc.review import changes
from qc.review.choices import Choice, check_choices, check_members
from qc.review.standing import flagged_results, flags_of, results_of, standing

BATCH_SIZE = 2000
LISTED = 500  # an audit record lists the results of a batch up to this many; beyond, their hash stands for them


@transaction.atomic
def decide(
    *, user: User, review_set: ReviewSet, choices: Sequence[Choice], expected_version: int | None = None
) -> UUID:
    """Record one gesture's verdicts, all or none. Returns the batch.

    Raises NotFound or NotAllowed (role), InvalidInput (verdict, reason, strange result) or Conflict (signed, or
    changed since ``expected_version``, naming who decided what).
    """
    require(user, review_set.project, Action.DECIDE)
    check_choices(choices)
    held = changes.lock(review_set, expected_version)
    changes.refuse_signed(held)
    check_members(held, choices)
    batch = _write(held, user, choices)
    _record(changes.DECIDED, held, user, choices, batch)
    return batch


def accept_unflagged(*, user: User, review_set: ReviewSet, expected_version: int | None = None) -> UUID:
    """Accept every undecided result that carries no flag of weight. Raises InvalidInput when there is none."""
    require(user, review_set.project, Action.DECIDE)
    choices = unflagged_choices(review_set)
    if not choices:
        raise InvalidInput(
            f"{review_set} has no undecided result without a flag.", remedy="Decide on the flagged ones one by one."
        )
    return decide(user=user, review_set=review_set, choices=choices, expected_version=expected_version)


def unflagged_choices(review_set: ReviewSet) -> list[Choice]:
    """Undecided results without a flag of weight, each to be accepted; verdicts already given are left alone."""
    results = results_of(review_set)
    decided = {pk for pk, stands in standing(results).items() if stands.verdict != Verdict.UNDECIDED}
    left_out = decided | flagged_results(review_set)
    ids = results.order_by("pk").values_list("pk", flat=True)
    return [Choice(pk, Verdict.ACCEPTED) for pk in ids if pk not in left_out]


@transaction.atomic
def undo(*, user: User, review_set: ReviewSet, batch: UUID) -> UUID:
    """Put back what stood before a batch of the user's own, by deciding again. Returns the new batch.

    Raises NotFound for a batch of another set, NotAllowed for somebody else's, Conflict when a result of it has
    been decided on again since or was replaced by a later report version.
    """
    require(user, review_set.project, Action.DECIDE)
    held = changes.lock(review_set)
    changes.refuse_signed(held)
    given = {d.result_id: d for d in Decision.objects.filter(review_set=held, batch=batch, carried_from=None)}
    _refuse_undo(held, user, given, batch)
    choices = _before(given)
    made = _write(held, user, choices)
    _record(changes.UNDONE, held, user, choices, made, undone=str(batch))
    return made


def _refuse_undo(review_set: ReviewSet, user: User, given: dict[int, Decision], batch: UUID) -> None:
    if not given:
        raise NotFound(f"{review_set} has no batch {batch}.", remedy="Load the review page again.")
    if any(decision.decided_by_id != user.pk for decision in given.values()):
        raise NotAllowed(
            "Only who decided may undo it.", remedy="Decide otherwise instead: the latest decision stands."
        )
    stands = standing(results_of(review_set).filter(pk__in=Decision.objects.filter(batch=batch).values("result")))
    moved = [pk for pk, decision in given.items() if pk not in stands or stands[pk].decision != decision.pk]
    if moved:
        raise Conflict(
            f"{len(moved)} of the {len(given)} results were decided on again, or replaced, since.",
            remedy="Decide on them anew.",
            results=moved[:20],
        )


def _before(given: dict[int, Decision]) -> list[Choice]:
    """What stood at each result before the decisions of one batch."""
    first = min(decision.pk for decision in given.values())
    batch = next(iter(given.values())).batch
    same = Decision.objects.filter(batch=batch).values("result")
    earlier = Decision.objects.filter(result__in=same, pk__lt=first).order_by("pk")
    before = {d.result_id: Choice(d.result_id, d.verdict, d.reason, d.text) for d in earlier}
    return [before.get(pk, Choice(pk, Verdict.UNDECIDED)) for pk in sorted(given)]


def last_batch(user: User, review_set: ReviewSet) -> UUID | None:
    """The user's latest batch in the set that is not undone, for "undo last"."""
    entries = AuditEntry.objects.filter(
        object_type="reviewset", object_id=str(review_set.pk), actor=user, action__in=[changes.DECIDED, changes.UNDONE]
    ).order_by("-seq")
    gone: set[str] = set()
    for action, batch, undone in entries.values_list("action", "after__batch", "after__undone")[:200]:
        if action == changes.UNDONE:
            gone.add(undone)
        elif batch not in gone:
            return UUID(batch)
    return None


def answer_flag(
    *, user: User, review_set: ReviewSet, fingerprint: str, rule: str, answer: str, reason: str
) -> list[FlagAnswer]:
    """Agree with one flag, or dismiss it with a reason."""
    return answer_flags(user=user, review_set=review_set, flags=[(rule, fingerprint)], answer=answer, reason=reason)


@transaction.atomic
def answer_flags(
    *,
    user: User,
    review_set: ReviewSet,
    flags: Sequence[tuple[str, str]],
    answer: str,
    reason: str,
    choices: Sequence[Choice] = (),
    expected_version: int | None = None,
) -> list[FlagAnswer]:
    """Answer flags given as (rule, fingerprint) alike, together with the verdicts that follow (``choices``).

    Raises InvalidInput for an unknown answer, a missing reason or a flag that the latest run no longer raises, and
    what ``decide`` raises.
    """
    require(user, review_set.project, Action.DECIDE)
    _check_answer(flags, answer, reason)
    if choices:
        check_choices(choices)
    held = changes.lock(review_set, expected_version)
    changes.refuse_signed(held)
    check_members(held, choices)
    _check_raised(held, flags)
    made = _write_answers(held, user, flags, answer, reason.strip())
    batch = _write(held, user, choices) if choices else None
    what = f"{answer} {len(flags)} flag{'s' * (len(flags) > 1)} of {', '.join(sorted({rule for rule, _ in flags}))}"
    particulars = {"answer": answer, "flags": [list(flag) for flag in sorted(flags)[:LISTED]]}
    if batch is None:
        changes.bump(held)
        changes.log(changes.ANSWERED, held, user, what, reason=reason, **particulars)
    else:
        _record(changes.DECIDED, held, user, choices, batch, also=what, **particulars)
    return made


def _check_answer(flags: Sequence[tuple[str, str]], answer: str, reason: str) -> None:
    if answer not in FlagAnswer.Answer.values:
        raise InvalidInput(
            f"«{answer}» is no answer to a flag.", remedy=f"Answers: {', '.join(FlagAnswer.Answer.values)}."
        )
    if not reason.strip():
        raise InvalidInput(f"A flag is not {answer} without a reason.", remedy="Say in a few words why.")
    if not flags:
        raise InvalidInput("No flag was chosen.", remedy="Open a rule and choose its flags.")


def _check_raised(review_set: ReviewSet, flags: Iterable[tuple[str, str]]) -> None:
    raised = set(flags_of(review_set).values_list("rule", "fingerprint"))
    gone = sorted({rule for rule, mark in flags if (rule, mark) not in raised})
    if gone:
        raise InvalidInput(
            f"The latest QC run of {review_set.well} raises no such flag: {', '.join(gone)}.",
            remedy="Load the review page again.",
            rules=gone,
        )


def _write_answers(
    review_set: ReviewSet, user: User, flags: Iterable[tuple[str, str]], answer: str, reason: str
) -> list[FlagAnswer]:
    rows = [
        FlagAnswer(review_set=review_set, rule=rule, fingerprint=mark, answer=answer, reason=reason, answered_by=user)
        for rule, mark in dict.fromkeys(flags)
    ]
    return FlagAnswer.objects.bulk_create(rows, batch_size=BATCH_SIZE)


def _write(review_set: ReviewSet, user: User, choices: Sequence[Choice]) -> UUID:
    """One decision row a choice, in few statements."""
    batch = uuid4()
    rows = (
        Decision(
            review_set=review_set, result_id=choice.result_id, verdict=choice.verdict, reason=choice.reason,
            text=choice.text.strip(), decided_by=user, batch=batch,
        )
        for choice in choices
    )  # fmt: skip
    Decision.objects.bulk_create(rows, batch_size=BATCH_SIZE)
    return batch


def _record(
    action: str,
    review_set: ReviewSet,
    user: User,
    choices: Sequence[Choice],
    batch: UUID,
    *,
    also: str = "",
    **more: object,
) -> None:
    """Raise the version and say in the audit trail what the batch decided."""
    changes.bump(review_set)
    verdicts = Counter(choice.verdict for choice in choices)
    rows = [[choice.result_id, choice.verdict, choice.reason, choice.text] for choice in choices]
    changes.log(
        action, review_set, user, "; ".join(filter(None, [also, _words(action, verdicts, choices)])),
        reason=_reason(choices), batch=str(batch), verdicts=dict(verdicts),
        decisions=rows if len(rows) <= LISTED else None,
        facts=fixity.facts("decisions", review_set.pk, batch), **more,
    )  # fmt: skip


def _words(action: str, verdicts: Counter[str], choices: Sequence[Choice]) -> str:
    """Such as "rejected 3 results (TMAX of Q-12, TMAX of Q-13, …)"."""
    named = Result.objects.filter(pk__in=[choice.result_id for choice in choices[:3]]).select_related(
        "analyte", "analysis__sample"
    )
    names = [f"{result.analyte} of {result.analysis.sample}" for result in named]
    counts = ", ".join(f"{verdict} {count} result{'s' * (count > 1)}" for verdict, count in verdicts.items())
    undid = "undid a batch: " if action == changes.UNDONE else ""
    return f"{undid}{counts} ({', '.join(names)}{', …' * (len(choices) > 3)})"


def _reason(choices: Sequence[Choice]) -> str:
    """The reasons of a batch in words, each once."""
    said = {(choice.reason, choice.text.strip()) for choice in choices if choice.reason or choice.text}
    labels = {": ".join(filter(None, [str(ReasonCode(code).label) if code else "", text])) for code, text in said}
    return "; ".join(sorted(labels))[:2000]
