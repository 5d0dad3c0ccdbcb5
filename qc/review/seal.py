"""The seal of a signature: one hash over exactly what the signer saw.

It is made of content, not of row numbers: a later report version that repeats every value leaves the seal whole,
and any other change of a value, qualifier, depth or verdict breaks it.
"""

import hashlib
from typing import Any

from labdata.audit import canonical
from qc.models import ReviewSet, SignOff, Verdict
from qc.review.standing import Standing, results_of, standing

IDENTITY = (
    "analysis__sample__kind", "analysis__sample__label", "analysis__sample__top_md_m", "analysis__sample__base_md_m",
    "analysis__method__code", "analysis__replicate", "analysis__role", "analyte__code",
)  # fmt: skip
VALUE = ("value", "qualifier", "analyte__unit")
UNDECIDED = (Verdict.UNDECIDED.value, "", "")


def content_lines(review_set: ReviewSet) -> list[str]:
    """One canonical line a result: sample, method, replicate, analyte, value, qualifier, unit, standing verdict.

    Sorted, so that the order of storage does not matter; a float is written with the digits that give it back.
    """
    results = results_of(review_set)
    decided = standing(results)
    rows = results.order_by("pk").values_list("pk", *IDENTITY, *VALUE)
    return sorted(canonical([*row[1:], *_verdict(decided.get(row[0]))]) for row in rows)


def _verdict(decision: Standing | None) -> tuple[Any, ...]:
    return (decision.verdict, decision.reason, decision.text) if decision else UNDECIDED


def content_sha256(review_set: ReviewSet) -> str:
    """SHA-256 over the content lines, headed by the well."""
    text = "\n".join([canonical(["well", review_set.well.name, review_set.well.uwi]), *content_lines(review_set)])
    return hashlib.sha256(text.encode()).hexdigest()


def holds(sign_off: SignOff) -> bool:
    """Whether the set still says what was signed."""
    return content_sha256(sign_off.review_set) == sign_off.content_sha256
