"""Values as intervals: what the unrounded or censored number may have been.

``<0.05`` may be anything from 0 up to (not including) 0.05; a number given to d decimals anything within half a unit
of its last decimal. A comparison is then certainly true, certainly false, or not decided by what was reported.
"""

from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt
import pandas as pd

Floats = npt.NDArray[np.float64]
Bools = npt.NDArray[np.bool_]


@dataclass(frozen=True)
class Span:
    """Arrays of lower and upper ends; NaN where nothing was reported."""

    lo: Floats
    hi: Floats

    @property
    def known(self) -> Bools:
        return ~(np.isnan(self.lo) | np.isnan(self.hi))

    def __add__(self, other: "Span") -> "Span":
        return Span(self.lo + other.lo, self.hi + other.hi)

    def __sub__(self, other: "Span") -> "Span":
        return Span(self.lo - other.hi, self.hi - other.lo)

    def times(self, factor: float) -> "Span":
        """``factor`` >= 0."""
        return Span(self.lo * factor, self.hi * factor)

    def over(self, other: "Span", scale: float = 1.0) -> "Span":
        """``scale * self / other`` for values that are not negative; NaN where the divisor may be zero or less."""
        divisor_lo = np.where(other.lo > 0, other.lo, np.nan)
        with np.errstate(invalid="ignore", over="ignore", divide="ignore"):
            lo = scale * np.maximum(self.lo, 0) / other.hi
            hi = scale * self.hi / divisor_lo
        return Span(np.where(np.isnan(hi), np.nan, lo), hi)

    def meets(self, other: "Span") -> Bools:
        """Where the two intervals overlap (with the tolerance of double arithmetic)."""
        slack = 1e-9 * np.maximum(np.abs(other.hi), 1.0)
        with np.errstate(invalid="ignore"):
            return (self.lo <= other.hi + slack) & (other.lo <= self.hi + slack)

    def below(self, limit: Any) -> tuple[Bools, Bools]:
        """(certainly below, decided): the second is False where the ends of the interval disagree or are unknown."""
        with np.errstate(invalid="ignore"):
            certain, certainly_not = self.hi < limit, self.lo >= limit
        return certain, certain | certainly_not

    def above(self, limit: Any) -> tuple[Bools, Bools]:
        """(certainly above, decided)."""
        with np.errstate(invalid="ignore"):
            certain, certainly_not = self.lo > limit, self.hi <= limit
        return certain, certain | certainly_not


def span(rows: pd.DataFrame, analyte: str, *, rounded: bool = False) -> Span:
    """The interval of an analyte a row. ``rounded`` widens measured values by half a unit of the last decimal.

    An approximate value (``~``) has no known half-unit: NaN when rounding matters, else its number.
    """
    value = rows[analyte].to_numpy(dtype=float)
    qualifier = rows[f"{analyte}_q"].to_numpy(dtype=object)
    half = rows[f"{analyte}_h"].to_numpy(dtype=float) if rounded else np.zeros(len(value))
    if rounded:
        half = np.where(qualifier == "~", np.nan, half)
    lo, hi = value - half, value + half
    # open ends: "<0.2" is below 0.2, not at it
    lo = np.where(qualifier == "<", 0.0, np.where(qualifier == ">", np.nextafter(value, np.inf), lo))
    hi = np.where(qualifier == "<", np.nextafter(value, -np.inf), np.where(qualifier == ">", np.inf, hi))
    unknown = np.isnan(value)
    return Span(np.where(unknown, np.nan, lo), np.where(unknown, np.nan, hi))


def exact(rows: pd.DataFrame, analyte: str) -> Floats:
    """The measured number; NaN where missing or censored."""
    value = rows[analyte].to_numpy(dtype=float)
    return np.where(censored(rows, analyte), np.nan, value)


def censored(rows: pd.DataFrame, analyte: str) -> Bools:
    """Where the value is a bound (``<`` or ``>``) and not a measurement."""
    qualifier = rows[f"{analyte}_q"].to_numpy(dtype=object)
    return (qualifier == "<") | (qualifier == ">")


def reported(rows: pd.DataFrame, analyte: str) -> Bools:
    """Where the laboratory reported anything at all, be it a bound of unknown size."""
    return rows[f"{analyte}_id"].to_numpy() >= 0


def num(rows: pd.DataFrame, row: int, column: str) -> float:
    """One cell as a number; NaN where it is empty."""
    return float(rows.at[row, column])  # type: ignore[arg-type]


def word(rows: pd.DataFrame, row: int, column: str) -> str:
    """One cell as text."""
    return str(rows.at[row, column])


def line(rows: pd.DataFrame, row: int) -> pd.Series:
    """One row."""
    return rows.loc[row]  # type: ignore[return-value]
