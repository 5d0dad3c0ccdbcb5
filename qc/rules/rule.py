"""What a rule is, and what it may answer."""

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from typing import Any, Final

import numpy as np
import pandas as pd

PASS: Final = "pass"
FIRE: Final = "fire"
NOT_APPLICABLE: Final = "not_applicable"
CANNOT_EVALUATE: Final = "cannot_evaluate"
OUTCOMES: Final = (PASS, FIRE, NOT_APPLICABLE, CANNOT_EVALUATE)

INFO: Final = "info"
WARN: Final = "warn"
REJECT: Final = "reject-candidate"

FAMILIES: Final = (
    "arithmetic", "validity", "contamination", "suppression", "maturity", "depth", "lab_control", "composition",
    "core_analysis", "isotopes_gc", "outlier",
)  # fmt: skip


@dataclass(frozen=True)
class Finding:
    """One firing. A suggestion to a human: nothing is changed or rejected by it.

    ``row`` is a row of ``Table.rows``; None where the finding speaks of a set of samples (``rows`` then names them).
    ``analyte`` is the value it speaks of; ``inputs`` the analytes whose cells are evidence. ``more`` joins the
    evidence record: fit, excluded, alternatives, discriminating_test and the like.
    """

    row: int | None
    analyte: str
    severity: str
    message: str
    inputs: tuple[str, ...] = ()
    computed: Any = None
    limit: Any = None
    rows: tuple[int, ...] = ()
    more: Mapping[str, Any] = field(default_factory=dict)


@dataclass(frozen=True)
class Answer:
    """What a rule found: one outcome a check, one finding a firing.

    ``outcome`` is indexed by row of ``Table.rows`` (a row appears once for each value checked in it; a rule over sets
    has one entry a set, at the set's first row). ``sets`` carries fits on to the rules that build upon them; ``settled`` are
    places in ``findings`` that a reviewer dismissed, to which later rules pay no heed.
    """

    outcome: pd.Series
    findings: list[Finding] = field(default_factory=list)
    sets: Mapping[Any, Any] = field(default_factory=dict)
    settled: frozenset[int] = frozenset()

    @property
    def open(self) -> list[Finding]:
        """Findings that no reviewer has dismissed."""
        return [finding for place, finding in enumerate(self.findings) if place not in self.settled]

    def counts(self) -> dict[str, int]:
        """How often each of the four outcomes was given."""
        seen = self.outcome.value_counts()
        return {name: int(seen.get(name, 0)) for name in OUTCOMES}


@dataclass(frozen=True)
class Rule:
    """A pure check with everything that a reviewer may ask of it.

    ``check(table, **thresholds)`` reads ``qc.rules.table.Table`` and leaves it as it found it. ``inputs`` are the
    analytes or facts it reads, ``flags`` the value it speaks of. ``id`` stays as it is once flags carry it.
    """

    id: str
    family: str
    title: str
    tests: str
    check: Callable[..., Answer]
    inputs: tuple[str, ...]
    flags: str
    formula: str
    message: str
    source: str
    must_not_fire: str
    example: str
    version: int = 1


def judge(index: pd.Index, *, applies: Any, known: Any, fires: Any) -> pd.Series:
    """Outcome a row from three masks: where the rule applies, where its inputs are known, where it fires.

    A row that fires is known: an unknown input is never a pass, a certain firing never unknown.
    """
    applies, known, fires = (
        np.broadcast_to(np.asarray(mask, dtype=bool), len(index)) for mask in (applies, known, fires)
    )
    choice = np.select([~applies, fires, ~known], [NOT_APPLICABLE, FIRE, CANNOT_EVALUATE], PASS)
    return pd.Series(choice, index=index, dtype=object)


def merge(answers: list[Answer]) -> Answer:
    """Several checks of one rule as one answer."""
    outcomes = [answer.outcome for answer in answers if len(answer.outcome)]
    empty = pd.Series([], dtype=object)
    return Answer(
        pd.concat(outcomes) if outcomes else empty, [finding for answer in answers for finding in answer.findings]
    )


def fired(outcome: pd.Series) -> list[int]:
    """Rows that fire, in order."""
    return [int(row) for row in outcome.index[outcome.to_numpy() == FIRE]]


def say(number: float) -> str:
    """A number as a message shows it: four significant digits, no trailing noise."""
    if np.isnan(number):
        return "unknown"
    if np.isinf(number):
        return "any amount"
    return f"{number:.0f}" if abs(number) >= 10_000 else f"{number:.4g}"
