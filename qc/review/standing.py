"""What stands: the latest decision of each result, what a set holds, and whether a signature is in force."""

from collections.abc import Iterable
from dataclasses import dataclass
from datetime import datetime
from uuid import UUID

from django.db.models import Max, Q, QuerySet

from labdata.models import Result
from qc.models import Decision, Flag, FlagAnswer, ReviewSet, Severity, SignOff, Verdict

SERIOUS = (Severity.WARN, Severity.REJECT_CANDIDATE)


@dataclass(frozen=True)
class Standing:
    """The decision that counts for one result."""

    verdict: str
    reason: str
    text: str
    decided_by: str
    decided_at: datetime
    decision: int
    batch: UUID


def results_of(review_set: ReviewSet) -> QuerySet[Result]:
    """The current results of the set's current analyses: what is decided on and signed."""
    return Result.objects.filter(current=True, analysis__current=True, analysis__review_item__review_set=review_set)


def standing(results: QuerySet[Result]) -> dict[int, Standing]:
    """The latest decision per result id. A result nobody has decided on is absent; an undone one is "undecided"."""
    newest = (
        Decision.objects.filter(result__in=results.order_by().values("pk")).values("result").annotate(newest=Max("pk"))
    )
    rows = Decision.objects.filter(pk__in=newest.values("newest")).values_list(
        "result_id", "verdict", "reason", "text", "decided_by__username", "decided_at", "pk", "batch"
    )
    return {row[0]: Standing(*row[1:]) for row in rows}


def verdict_counts(review_set: ReviewSet) -> dict[str, int]:
    """How many results of the set stand at each verdict, and ``results`` in all."""
    decided = standing(results_of(review_set)).values()
    counts = dict.fromkeys(Verdict.values, 0)
    for decision in decided:
        counts[decision.verdict] += 1
    total = results_of(review_set).count()
    counts[Verdict.UNDECIDED] = total - sum(counts[v] for v in Verdict.values if v != Verdict.UNDECIDED)
    return {"results": total, **counts}


def valid_signature(review_set: ReviewSet) -> SignOff | None:
    """The signature in force: signed and not re-opened since (whatever a stale ``review_set.state`` says)."""
    return review_set.sign_offs.filter(reopening__isnull=True).order_by("-pk").first()


def flag_answers(review_set: ReviewSet) -> dict[tuple[str, str], FlagAnswer]:
    """The latest answer per (rule, fingerprint)."""
    answers = review_set.flag_answers.select_related("answered_by").order_by("pk")
    return {(answer.rule, answer.fingerprint): answer for answer in answers}


def flags_of(review_set: ReviewSet) -> QuerySet[Flag]:
    """Flags of the latest run that speak of the set: of its analyses, or of its well as a whole."""
    own = Q(analysis__review_item__review_set=review_set, analysis__current=True)
    of_well = Flag.objects.in_force().filter(well=review_set.well_id)
    return of_well.filter(own | Q(analysis__isnull=True)).order_by("pk")


def flagged_results(review_set: ReviewSet) -> set[int]:
    """Results with a flag of weight (warning or worse) that nobody has dismissed.

    A flag on an analysis without a result speaks of its analyte, or of all its results where it names none.
    """
    answers = flag_answers(review_set)
    dismissed = {key for key, answer in answers.items() if answer.answer == FlagAnswer.Answer.DISMISSED}
    flags = flags_of(review_set).filter(severity__in=SERIOUS)
    rows = flags.values_list("rule", "fingerprint", "result_id", "analysis_id", "analyte")
    live = [row[2:] for row in rows if (row[0], row[1]) not in dismissed]
    direct = {result for result, _, _ in live if result is not None}
    return direct | _of_analyses(review_set, {(a, code) for result, a, code in live if result is None and a})


def _of_analyses(review_set: ReviewSet, marks: Iterable[tuple[int, str]]) -> set[int]:
    """Results that flags without a result of their own speak of."""
    marked = set(marks)
    if not marked:
        return set()
    rows = results_of(review_set).filter(analysis__in={analysis for analysis, _ in marked})
    named = rows.values_list("pk", "analysis_id", "analyte__code")
    return {pk for pk, analysis, code in named if (analysis, code) in marked or (analysis, "") in marked}
