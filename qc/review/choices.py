"""A choice is what a person wants to decide about one result; here it is checked before anything is written."""

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass

from labdata.errors import InvalidInput
from qc.models import ReasonCode, ReviewSet, Verdict
from qc.review.standing import results_of

NEEDS_REASON = (Verdict.REJECTED, Verdict.HELD)
REASON_WORDS = {word: code for code in ReasonCode if code for word in (code.value, str(code.label).casefold())}


@dataclass(frozen=True)
class Choice:
    """One wanted verdict. ``reason`` is a ReasonCode, ``text`` free words beside it."""

    result_id: int
    verdict: str
    reason: str = ""
    text: str = ""


def reason_of(said: str, text: str = "") -> tuple[str, str]:
    """Code and text of a reason in a person's words: what is no code is free text, code "other" with the words."""
    if not said or said.casefold() in REASON_WORDS:
        return str(REASON_WORDS.get(said.casefold(), "")), text
    return str(ReasonCode.OTHER.value), "; ".join(filter(None, [said, text]))


def check_choices(choices: Sequence[Choice]) -> None:
    """Refuse an empty batch, a result chosen twice, an unknown verdict and a missing reason. Raises InvalidInput."""
    if not choices:
        raise InvalidInput("No result was chosen.", remedy="Select at least one result.")
    for choice in set(choices):
        fault = fault_of(choice.verdict, choice.reason, choice.text)
        if fault:
            raise InvalidInput(*fault[:1], remedy=fault[1], result=choice.result_id)
    twice = [result for result, times in Counter(choice.result_id for choice in choices).items() if times > 1]
    if twice:
        raise InvalidInput(
            f"Result {twice[0]} is named more than once in one batch.", remedy="Name it once.", results=twice[:20]
        )


def fault_of(verdict: str, reason: str, text: str) -> tuple[str, str] | None:
    """What is wrong with a verdict and its reason, and what would do; None when nothing is."""
    if verdict not in Verdict.values:
        return f"«{verdict}» is no verdict.", f"Verdicts: {', '.join(Verdict.values)}."
    if reason not in ReasonCode.values:
        return f"«{reason}» is no reason code.", f"Codes: {', '.join(filter(None, ReasonCode.values))}."
    if verdict in NEEDS_REASON and not reason:
        return (
            f"A result is not {verdict} without a reason.",
            "Give a reason from the short list, or «other» and say which.",
        )
    if reason == ReasonCode.OTHER and not text.strip():
        return "The reason «other» needs words.", "Say in the text what it was."
    return None


def check_members(review_set: ReviewSet, choices: Sequence[Choice]) -> None:
    """Refuse results that are not current results of the set. Raises InvalidInput naming up to twenty."""
    chosen = {choice.result_id for choice in choices}
    known = set(results_of(review_set).values_list("pk", flat=True))
    strangers = sorted(chosen - known)
    if strangers:
        raise InvalidInput(
            f"{len(strangers)} of the {len(chosen)} chosen results are not current results of {review_set}: "
            f"{', '.join(map(str, strangers[:20]))}.",
            remedy="Load the review page again: a later report version may have replaced them.",
            results=strangers[:20],
        )
