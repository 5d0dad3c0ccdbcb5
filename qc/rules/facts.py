"""What several rules ask of a row: rock or not, coal, reservoir sandstone, Tmax that may be believed."""

import numpy as np
import pandas as pd

from qc.rules.spans import Bools, Floats, exact, num, span
from qc.rules.table import CORE_KINDS, NOT_ROCK


def says(rows: pd.DataFrame, pattern: str) -> Bools:
    """Rows whose remark (or sample label) matches the pattern, whatever the case."""
    text = rows["remark"].astype(str) + " " + rows["label"].astype(str)
    return text.str.contains(pattern, case=False, regex=True).to_numpy(dtype=bool)


def not_rock(rows: pd.DataFrame) -> Bools:
    """Oils, extracts, neat bitumen and isolates: their carbon does not add up as rock's does."""
    isolate = says(rows, r"\b(?:kerogen|isolate|bitumen|gilsonite|crude|extract)\b")
    return rows["kind"].isin(NOT_ROCK).to_numpy() | isolate


def core(rows: pd.DataFrame) -> Bools:
    return rows["kind"].isin(CORE_KINDS).to_numpy()


def sandstone(rows: pd.DataFrame) -> Bools:
    """Reservoir rock by name: free oil belongs there."""
    text = rows["unit"].astype(str) + " " + rows["remark"].astype(str)
    return text.str.contains(r"\b(?:sandstone|sst)\b", case=False, regex=True).to_numpy(dtype=bool)


def valid_tmax(rows: pd.DataFrame, s2_min: float) -> Floats:
    """Tmax where S2 is certainly a real peak, else NaN."""
    small, decided = span(rows, "S2").below(s2_min)
    return np.where(decided & ~small, exact(rows, "TMAX"), np.nan)


def hydrogen_index(rows: pd.DataFrame) -> Floats:
    """HI from S2 and TOC, else as reported; NaN where neither is known."""
    made = 100 * exact(rows, "S2") / positive(exact(rows, "TOC"))
    return np.where(np.isnan(made), exact(rows, "HI"), made)


def production_index(rows: pd.DataFrame) -> Floats:
    """PI from S1 and S2, else as reported."""
    s1, s2 = exact(rows, "S1"), exact(rows, "S2")
    made = s1 / positive(s1 + s2)
    return np.where(np.isnan(made), exact(rows, "PI"), made)


def positive(values: Floats) -> Floats:
    """NaN instead of a divisor that is zero or less."""
    with np.errstate(invalid="ignore"):
        return np.where(values > 0, values, np.nan)


def made_or_reported(rows: pd.DataFrame, row: int, index: str, otherwise: str) -> str:
    """The index where the laboratory reported it, else the input that stands for it."""
    return index if num(rows, row, f"{index}_id") >= 0 else otherwise


def extracted(rows: pd.DataFrame) -> Bools:
    """Rows measured on solvent-extracted rock, by remark or label."""
    after = says(rows, r"\b(?:post|after)[- ]?(?:solvent[- ])?extraction\b|\bextracted\b|\bsolvent[- ]?washed\b")
    return after & ~says(rows, r"\b(?:not|non|before|pre|prior to|to be)[- ](?:being |solvent[- ])?extract(?:ed|ion)\b")
