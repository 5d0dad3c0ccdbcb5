"""From the page's columns to points to draw: state, place on the axis, and which way a limit or a far value lies."""

import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from labdata.errors import InvalidInput
from qc.models import Severity, Verdict
from qc.review import figures
from qc.review.columns import SEVERITIES, VERDICTS

WEIGHTY = SEVERITIES.index(Severity.WARN.value)
ARROW_ROOM = 0.09  # share of an axis
WAYS = {"<": -1, ">": 1}
REJECTED = figures.STATES.index(Verdict.REJECTED.value)


@dataclass(frozen=True)
class Column:
    """One column of the page with what its marks need, a value a row (None: not measured)."""

    sent: Mapping[str, Any]
    states: list[int]  # place in figures.STATES
    low: float
    high: float

    @property
    def label(self) -> str:
        """Name and unit as an axis says them."""
        computed = ", computed" if self.sent["computed"] else ""
        return f"{self.sent['label']}{computed} [{self.sent['unit']}]"

    @property
    def log(self) -> bool:
        return bool(self.sent["log"])

    @property
    def ends(self) -> tuple[float, float]:
        """Where the axis ends: there is room for arrows on the side to which some point."""
        ways = {place[1] for place in map(self.at, range(len(self.states))) if place}
        if self.log:
            room = (self.high / self.low) ** ARROW_ROOM
            return self.low / room if -1 in ways else self.low, self.high * room if 1 in ways else self.high
        room = (self.high - self.low) * ARROW_ROOM
        return self.low - room if -1 in ways else self.low, self.high + room if 1 in ways else self.high

    def at(self, row: int) -> tuple[float, int] | None:
        """Where the value is drawn and which way it lies from there: -1, 0 or 1. None where nothing was measured."""
        value = self.sent["value"][row]
        if value is None or (self.log and value <= 0):
            return None
        if value < self.low:
            return self.low, -1
        if value > self.high:
            return self.high, 1
        return value, WAYS.get(self.sent["qualifier"].get(str(row), ""), 0)


def columns(data: Mapping[str, Any]) -> dict[str, Column]:
    """All columns of ``review_data`` by key, in the page's order."""
    return {sent["key"]: _column(sent) for sent in data["columns"]}


def chosen(found: Mapping[str, Column], key: str) -> Column:
    """The column of a key, or of an analyte. Raises InvalidInput for one that the set does not have."""
    for name, column in found.items():
        if key in (name, column.sent["analyte"]):
            return column
    raise InvalidInput(f"The set has no values of «{key}».", remedy=f"It has {', '.join(found) or 'no values at all'}.")


def _column(sent: Mapping[str, Any]) -> Column:
    states = [_state(sent, row) for row in range(len(sent["value"]))]
    pairs = [
        (v, state)
        for v, state in zip(sent["value"], states, strict=True)
        if v is not None and (v > 0 or not sent["log"])
    ]
    kept = [value for value, state in pairs if state != REJECTED] or [value for value, _ in pairs]
    return Column(sent, states, *_domain(kept, log=sent["log"], zero=sent["zero"]))


def _state(sent: Mapping[str, Any], row: int) -> int:
    if sent["computed"]:
        return figures.STATES.index(figures.COMPUTED)
    verdict = VERDICTS[sent["verdict"][row]]
    flagged = verdict == Verdict.UNDECIDED and sent["flag"][row] >= WEIGHTY
    return figures.STATES.index(figures.FLAGGED if flagged else verdict)


def _domain(kept: list[float], *, log: bool, zero: bool) -> tuple[float, float]:
    """The ends of an axis, fitted to what is kept, with a little air; the same as the page's (plots/scale.js)."""
    if not kept:
        return (0.1, 10.0) if log else (0.0, 1.0)
    low, high = min(kept), max(kept)
    if log:
        return low / 1.25, high * 1.25
    if math.isclose(low, high):
        air = abs(low) * 0.1 or 1.0
        low, high = low - air, high + air
    air = (high - low) * 0.06
    return (0.0 if zero and low >= 0 else low - air), high + air
