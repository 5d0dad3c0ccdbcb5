"""Slips of the report: one reported number is wrong, and nothing else follows it."""

import itertools

import numpy as np
import pandas as pd

from qc.rehearsal.copying import Copy
from qc.rehearsal.kind import (
    MODERATE,
    SAMPLE,
    STRONG,
    Injected,
    Kind,
    Random,
    Rows,
    each,
    exchanged_digits,
    measured,
)  # fmt: skip
from qc.rules.table import Table

MADE_OF = {"HI": ("S2", "TOC"), "OI": ("S3", "TOC"), "PI": ("S1", "S2")}
PLACES = {MODERATE: 1, STRONG: 2}
LEAST_UNITS = 10  # a slip is looked for in values of at least so many units of their last decimal


def index_targets(table: Table, free: pd.Index) -> list[Rows]:
    """Rows with a reported HI, OI or PI and the peaks it is made of."""
    found: set[int] = set()
    for index, parts in MADE_OF.items():
        found |= {int(row) for row in measured(table, free, index, *parts)}
    return [(row,) for row in sorted(found)]


def _reported(copy: Copy, row: int, random: Random) -> list[str]:
    """The row's reported indices that are large enough to carry a slip, in random order."""
    held = [index for index, parts in MADE_OF.items() if copy.has(row, index, *parts) and _large(copy, row, index)]
    return [str(one) for one in random.permutation(held)] if held else []


def _large(copy: Copy, row: int, analyte: str) -> bool:
    return copy.value(row, analyte) >= LEAST_UNITS * 10.0 ** -copy.decimals(row, analyte)


def index_digits(copy: Copy, rows: Rows, strength: str, random: Random) -> Injected | None:
    """Two neighbouring digits of an index exchanged."""
    row = rows[0]
    low, high = {MODERATE: (0.08, 0.30), STRONG: (0.30, np.inf)}[strength]
    for index in _reported(copy, row, random):
        value = copy.value(row, index)
        text = f"{value:.{copy.decimals(row, index)}f}"
        fitting = [float(one) for one in exchanged_digits(text) if low <= abs(float(one) / value - 1) < high]
        if fitting:
            return Injected(rows, copy.put(row, index, fitting[int(random.integers(len(fitting)))]))
    return None


def index_decimal(copy: Copy, rows: Rows, strength: str, random: Random) -> Injected | None:
    """The decimal point of an index moved."""
    row = rows[0]
    for index in _reported(copy, row, random)[:1]:
        return Injected(rows, copy.put(row, index, copy.value(row, index) * 10.0 ** _places(strength, random)))
    return None


def _places(strength: str, random: Random) -> int:
    return PLACES[strength] * (1 if random.random() < 0.5 else -1)


def swap_targets(table: Table, free: pd.Index) -> list[Rows]:
    return each(measured(table, free, "HI", "OI", "S2", "S3", "TOC"))


def indices_swapped(copy: Copy, rows: Rows, strength: str, random: Random) -> Injected | None:
    """HI stands in the column of OI and OI in that of HI."""
    row = rows[0]
    hydrogen, oxygen = copy.value(row, "HI"), copy.value(row, "OI")
    low, high = {MODERATE: (1.2, 3.0), STRONG: (3.0, np.inf)}[strength]
    if min(hydrogen, oxygen) <= 0 or not low <= max(hydrogen, oxygen) / min(hydrogen, oxygen) < high:
        return None
    said = copy.put(row, "HI", oxygen)
    return Injected(rows, f"{said}; {copy.put(row, 'OI', hydrogen)}")


def decimal(analyte: str) -> Kind:
    """The decimal point of a TOC or peak moved after the indices were computed."""

    def targets(table: Table, free: pd.Index) -> list[Rows]:
        rows = table.rows.loc[measured(table, free, analyte, "TOC", "S2")]
        with_index = np.zeros(len(rows), dtype=bool)
        for index, parts in MADE_OF.items():
            with_index |= (rows[index].notna() & (analyte in parts)).to_numpy()
        return each(rows.index[with_index & (rows[analyte] >= 2 * LEAST_UNITS * rows[f"{analyte}_h"]).to_numpy()])

    def inject(copy: Copy, rows: Rows, strength: str, random: Random) -> Injected:
        places = _places(strength, random)
        if copy.value(rows[0], analyte) * 10.0**places < 10.0 ** -copy.decimals(rows[0], analyte):
            places = -places
        return Injected(rows, copy.put(rows[0], analyte, copy.value(rows[0], analyte) * 10.0**places))

    return Kind(
        f"decimal_{analyte.lower()}", f"Misplaced decimal of {analyte}", SAMPLE,
        {MODERATE: f"{analyte} ten times too large, or too small where a digit of it is left; indices as computed before",
         STRONG: f"{analyte} a hundred times too large, or too small where a digit of it is left; indices as computed before"},
        ("index_recalc", "pyro_carbon_balance", "hi_ceiling", "pyro_value_range", "s2_toc_outlier", "free_oil_crossover",
         "s1_toc_line", "pi_high_for_maturity"),
        targets, inject, f"no undoubted sample has {analyte} of ten units of its last decimal and an index made of it",
    )  # fmt: skip


def neighbour_targets(table: Table, free: pd.Index) -> list[Rows]:
    """A row and the next one down in the same well and unit, both with TOC, S2 and HI."""
    rows = table.rows.loc[measured(table, free, "TOC", "S2", "HI")].dropna(subset=["top_m"])
    found: list[Rows] = []
    for _, group in rows.sort_values(["well", "unit", "kind", "top_m"], kind="stable").groupby(
        ["well", "unit", "kind"], sort=True
    ):
        listed = [int(row) for row in group.index]
        found += list(itertools.pairwise(listed))
    return found


def toc_of_neighbour(copy: Copy, rows: Rows, strength: str, random: Random) -> Injected | None:
    """The TOC values of two neighbours stand in each other's line; their indices do not."""
    first, second = copy.value(rows[0], "TOC"), copy.value(rows[1], "TOC")
    low, high = {MODERATE: (0.15, 0.50), STRONG: (0.50, np.inf)}[strength]
    if min(first, second) <= 0 or not low <= max(first, second) / min(first, second) - 1 < high:
        return None
    said = copy.put(rows[0], "TOC", second)
    return Injected(rows, f"{said}; {copy.put(rows[1], 'TOC', first)}")


def reflectance_targets(table: Table, free: pd.Index) -> list[Rows]:
    """Rows that hold a reflectance of their own."""
    rows = table.rows.loc[free]
    own = rows["RO"].notna() & (rows["RO_row"] == rows.index) & ~rows["RO_q"].isin(["<", ">"]) & ~rows["RO_rej"]
    return each(rows.index[own & (rows["RO"] > 0)])


def reflectance(copy: Copy, rows: Rows, strength: str, random: Random) -> Injected:
    """Ro miskeyed: another first decimal, or a decimal point in the wrong place."""
    row = rows[0]
    value = copy.value(row, "RO")
    if strength == STRONG:
        return Injected(rows, copy.put(row, "RO", value * 10.0 ** (1 if random.random() < 0.5 else -1)))
    step = float(random.choice([0.4, 0.5]))
    return Injected(
        rows, copy.put(row, "RO", value - step if value > step + 0.15 and random.random() < 0.5 else value + step)
    )


NO_INDEX = "no undoubted sample has a reported HI, OI or PI together with the peaks and TOC it is made of"
KINDS = (
    Kind("index_digits", "Two digits of HI, OI or PI exchanged", SAMPLE,
         {MODERATE: "the index is off by 8 to 30 %", STRONG: "the index is off by more than 30 %"},
         ("index_recalc",), index_targets, index_digits, NO_INDEX),
    Kind("index_decimal", "Decimal point of HI, OI or PI misplaced", SAMPLE,
         {MODERATE: "ten times too large or too small", STRONG: "a hundred times too large or too small"},
         ("index_recalc",), index_targets, index_decimal, NO_INDEX),
    Kind("hi_oi_swapped", "HI and OI in each other's column", SAMPLE,
         {MODERATE: "the two differ by a factor of 1.2 to 3", STRONG: "the two differ by a factor of more than 3"},
         ("index_recalc",), swap_targets, indices_swapped, "no undoubted sample has HI and OI with S2, S3 and TOC"),
    decimal("TOC"), decimal("S1"), decimal("S2"),
    Kind("toc_of_neighbour", "TOC of two neighbours exchanged", SAMPLE,
         {MODERATE: "the two differ by 15 to 50 %", STRONG: "the two differ by more than 50 %"},
         ("index_recalc", "s2_toc_outlier", "pyro_carbon_balance"), neighbour_targets, toc_of_neighbour,
         "no two undoubted neighbours of one unit have TOC, S2 and a reported HI"),
    Kind("ro_miskeyed", "Vitrinite reflectance miskeyed", SAMPLE,
         {MODERATE: "the first decimal is off by 4 or 5 (0.4 or 0.5 % Ro)", STRONG: "ten times too large or too small"},
         ("ro_tmax_disagreement", "ro_depth_trend", "vr_low_suspect", "vr_count_sd"), reflectance_targets, reflectance,
         "no undoubted sample has a vitrinite reflectance"),
)  # fmt: skip
