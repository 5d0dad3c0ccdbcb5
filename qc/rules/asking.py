"""What rules over panels have in common: an answer from three masks, sums of parts, amounts by any name."""

from collections.abc import Callable, Sequence
from typing import Any

import numpy as np
import pandas as pd

from qc.rules.rule import Answer, Finding, fired, judge
from qc.rules.spans import Bools, Floats, Span, exact, reported, span

PPM = 1e4  # ug/g in one wt%


def nothing() -> Answer:
    """The answer of a rule whose method nobody measured."""
    return Answer(pd.Series([], dtype=object))


def answer(rows: pd.DataFrame, tell: Callable[[int], Finding], *, applies: Any, known: Any, fires: Any) -> Answer:
    """One check a row; ``tell`` writes the finding of a row that fires."""
    outcome = judge(rows.index, applies=applies, known=known, fires=fires)
    return Answer(outcome, [tell(row) for row in fired(outcome)])


def of_sets(entries: Sequence[tuple[int, str, Finding | None]]) -> Answer:
    """An answer from (first row of the set, outcome, finding where it fires)."""
    outcome = pd.Series([entry[1] for entry in entries], index=[entry[0] for entry in entries], dtype=object)
    return Answer(outcome, [entry[2] for entry in entries if entry[2] is not None])


def total(rows: pd.DataFrame, parts: Sequence[str]) -> Span:
    """Sum of what was reported of the parts; a part that nobody reported counts as nothing."""
    spans = [span(rows, part) for part in parts]
    return Span(
        np.sum([np.nan_to_num(one.lo) for one in spans], axis=0),
        np.sum([np.nan_to_num(one.hi, posinf=np.inf) for one in spans], axis=0),
    )


def count(rows: pd.DataFrame, parts: Sequence[str]) -> Floats:
    """How many of the parts were reported, a row."""
    return np.sum([reported(rows, part) for part in parts], axis=0)


def first(*choices: Floats) -> Floats:
    """The first that is known, a row."""
    made = choices[0]
    for other in choices[1:]:
        made = np.where(np.isnan(made), other, made)
    return made


def wt(rows: pd.DataFrame, element: str) -> Floats:
    """An element in wt% from its column in ug/g."""
    return exact(rows, element) / PPM


def column(rows: pd.DataFrame, **made: Floats | Bools) -> pd.DataFrame:
    """Computed columns on the index of the rows."""
    return pd.DataFrame(made, index=rows.index)


def dig(number: float, digits: int = 4) -> float:
    """A number as evidence keeps it."""
    return round(float(number), digits)
