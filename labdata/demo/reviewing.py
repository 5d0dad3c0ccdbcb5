"""How the demonstration's geochemist decides: by rule, the same way every time.

Unflagged results are accepted. What a rule calls a candidate for rejection is rejected with the reason of its
family. Of the warnings, those that say the value is not the rock's are followed too; the others are looked at,
dismissed with a word, and the value accepted.
"""

from collections import defaultdict
from collections.abc import Iterable

from django.contrib.auth.models import User

from qc.models import Flag, FlagAnswer, ReasonCode, ReviewSet, Severity, Verdict
from qc.review.services import Choice, answer_flags, decide, unflagged_choices
from qc.review.standing import SERIOUS, flags_of, results_of, standing

FOLLOWED = {
    "free_oil_crossover": ReasonCode.CONTAMINATION,
    "pi_high_for_maturity": ReasonCode.CONTAMINATION,
    "oil_based_fluid_interval": ReasonCode.CONTAMINATION,
    "index_recalc": ReasonCode.MISKEYED,
    "s2_floor_for_tmax": ReasonCode.LOW_SIGNAL,
    "tmax_range": ReasonCode.CONTAMINATION,
}
BY_FAMILY = {
    "arithmetic": ReasonCode.MISKEYED,
    "depth": ReasonCode.DEPTH,
    "contamination": ReasonCode.CONTAMINATION,
    "suppression": ReasonCode.SUPPRESSION,
}
AGREED, DISMISSED = FlagAnswer.Answer.AGREED, FlagAnswer.Answer.DISMISSED


def decide_all(review_set: ReviewSet, user: User) -> None:
    """Decide on every undecided result of the set, and answer every flag of weight."""
    untouched = unflagged_choices(review_set)
    if untouched:
        decide(user=user, review_set=review_set, choices=untouched)
    open_ids = undecided(review_set)
    for (rule, reason), flags in _grouped(review_set).items():
        verdict = Verdict.REJECTED if reason else Verdict.ACCEPTED
        ids = _spoken_of(review_set, flags) & open_ids
        open_ids -= ids
        answer_flags(
            user=user, review_set=review_set, flags=[(flag.rule, flag.fingerprint) for flag in flags],
            answer=AGREED if reason else DISMISSED, reason=_words(rule, reason),
            choices=[Choice(pk, verdict, reason, _words(rule, reason)) for pk in sorted(ids)],
        )  # fmt: skip
    if open_ids:
        rest = [Choice(pk, Verdict.ACCEPTED, text="Its flag speaks of another value.") for pk in sorted(open_ids)]
        decide(user=user, review_set=review_set, choices=rest)


def decide_some(review_set: ReviewSet, user: User, base_m: float) -> None:
    """Accept what is unflagged above a depth, and hold whatever is a candidate for rejection until the lab answers."""
    above = set(results_of(review_set).filter(analysis__sample__top_md_m__lt=base_m).values_list("pk", flat=True))
    choices = [choice for choice in unflagged_choices(review_set) if choice.result_id in above]
    candidates = flags_of(review_set).filter(severity=Severity.REJECT_CANDIDATE, analysis__isnull=False)
    held = sorted(_spoken_of(review_set, candidates) & undecided(review_set))
    text = "Laboratory asked to look at the raw data."
    choices += [Choice(pk, Verdict.HELD, ReasonCode.REPEAT_ASKED, text) for pk in held]
    if choices:
        decide(user=user, review_set=review_set, choices=choices)


def undecided(review_set: ReviewSet) -> set[int]:
    """Results of the set that are neither accepted nor rejected; a held one is still to be decided."""
    results = results_of(review_set)
    done = {pk for pk, stands in standing(results).items() if stands.verdict in {Verdict.ACCEPTED, Verdict.REJECTED}}
    return set(results.values_list("pk", flat=True)) - done


def _grouped(review_set: ReviewSet) -> dict[tuple[str, str], list[Flag]]:
    """Flags of weight by rule and by the reason for rejecting on it ("": accept); rejections come first."""
    groups: dict[tuple[str, str], list[Flag]] = defaultdict(list)
    for flag in flags_of(review_set).filter(severity__in=SERIOUS):
        candidate = flag.severity == Severity.REJECT_CANDIDATE
        reason = BY_FAMILY.get(flag.family, ReasonCode.MEASUREMENT) if candidate else ""
        reason = FOLLOWED.get(flag.rule, reason) if flag.analysis_id else ""
        groups[flag.rule, str(reason)].append(flag)
    return dict(sorted(groups.items(), key=lambda item: (not item[0][1], item[0])))


def _spoken_of(review_set: ReviewSet, flags: Iterable[Flag]) -> set[int]:
    """Results that flags speak of: the flag's own, or its analysis's of that analyte (all where it names none)."""
    own = {flag.result_id for flag in flags if flag.result_id}
    marks = {(flag.analysis_id, flag.analyte) for flag in flags if flag.analysis_id and not flag.result_id}
    rows = results_of(review_set).filter(analysis__in={analysis for analysis, _ in marks})
    named = rows.values_list("pk", "analysis_id", "analyte__code")
    return own | {pk for pk, analysis, code in named if (analysis, code) in marks or (analysis, "") in marks}


def _words(rule: str, reason: str) -> str:
    return f"Flagged by {rule}." if reason else f"Flagged by {rule}; looked at, stands as measured."
