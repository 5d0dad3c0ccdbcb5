"""A copy of the typed table that faults are put into; the original stays as it is."""

from dataclasses import replace

import numpy as np
import pandas as pd

from qc.rules.spans import num, word
from qc.rules.table import ANALYTES, Table

SHARED = {"TOC": ("TOC", "TOC_CARBON")}  # columns of the table that may hold one and the same result
INDICES = {
    "HI": lambda peak: 100 * peak["S2"] / peak["TOC"],
    "OI": lambda peak: 100 * peak["S3"] / peak["TOC"],
    "OSI": lambda peak: 100 * peak["S1"] / peak["TOC"],
    "PI": lambda peak: peak["S1"] / (peak["S1"] + peak["S2"]),
    "S2S3": lambda peak: peak["S2"] / peak["S3"],
    "GP": lambda peak: peak["S1"] + peak["S2"],
}
PEAKS = ("S1", "S2", "S3", "TOC")


class Copy:
    """Rows that may be changed. Values are rounded as the laboratory rounds that column."""

    def __init__(self, table: Table) -> None:
        self.original = table
        self.rows = table.rows.copy()

    def table(self) -> Table:
        return replace(self.original, rows=self.rows)

    def value(self, row: int, analyte: str) -> float:
        return num(self.rows, row, analyte)

    def has(self, row: int, *analytes: str) -> bool:
        """Measured numbers, none of them a bound."""
        return all(
            word(self.rows, row, f"{name}_q") in {"", "~"} and not np.isnan(self.value(row, name)) for name in analytes
        )

    def decimals(self, row: int, analyte: str) -> int:
        """Decimals that the column of the report shows, in the canonical unit."""
        half = num(self.rows, row, f"{analyte}_h")
        if not half > 0:
            return int(num(self.rows, row, f"{analyte}_d"))
        return max(0, round(-np.log10(2 * half)))

    def put(self, row: int, analyte: str, value: float) -> str:
        """Write a value over the one reported, wherever the same result stands. Returns the change in words."""
        places = self.decimals(row, analyte)
        text = f"{value:.{places}f}"
        before = word(self.rows, row, f"{analyte}_text") or f"{self.value(row, analyte):g}"
        result = self.rows.at[row, f"{analyte}_id"]
        sample = self.rows["sample"] == self.rows.at[row, "sample"]
        for name in SHARED.get(analyte, (analyte,)):
            same = self.rows.index[sample & (self.rows[f"{name}_id"] == result)]
            for suffix, cell in (("", float(text)), ("_text", text), ("_q", ""), ("_d", places)):
                self.rows.loc[same, f"{name}{suffix}"] = cell
        return f"{analyte} {before} → {text}"

    def follow(self, row: int) -> None:
        """Reported indices as the laboratory would compute them from the peaks as they now stand."""
        peak = {name: self.value(row, name) for name in PEAKS}
        for index, formula in INDICES.items():
            if num(self.rows, row, f"{index}_id") < 0 or not self.has(row, index):
                continue
            with np.errstate(all="ignore"):
                made = _divided(formula, peak)
            if np.isfinite(made):
                self.put(row, index, made)

    def move(self, row: int, top: float | None = None, base: float | None = None) -> None:
        """Give the sample of the row another top or base [m], in every analysis of it; the text follows in its unit."""
        same = self.rows.index[self.rows["sample"] == self.rows.at[row, "sample"]]
        for name, value in (("top", top), ("base", base)):
            if value is None:
                continue
            unit = factor(self.rows, row, name)
            self.rows.loc[same, f"{name}_m"] = value
            self.rows.loc[same, f"{name}_text"] = (
                "" if np.isnan(value) else f"{value / unit:.2f}".rstrip("0").rstrip(".")
            )


def factor(rows: pd.DataFrame, row: int, end: str) -> float:
    """Metres a reported unit of this depth."""
    metres = num(rows, row, f"{end}_m")
    try:
        stated = float(word(rows, row, f"{end}_text").replace(",", ""))
    except ValueError:
        return 1.0
    return metres / stated if stated and metres / stated > 0 else 1.0


def _divided(formula: object, peak: dict[str, float]) -> float:
    try:
        return float(formula(peak))  # type: ignore[operator]
    except ZeroDivisionError:
        return float("nan")


def differences(before: pd.DataFrame, after: pd.DataFrame) -> set[tuple[int, str]]:
    """(row, analyte or column) of everything that differs between two tables of the same rows."""
    found = set()
    for name in before.columns:
        was, now = before[name], after[name]
        unlike = ~((was == now) | (was.isna() & now.isna()))
        base = name.rsplit("_", 1)[0]
        found |= {(int(row), base if base in ANALYTES else name) for row in before.index[unlike]}
    return found
