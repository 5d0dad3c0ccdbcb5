"""Faults of depth: the numbers are right, but not where they are said to be from."""

import itertools

import numpy as np
import pandas as pd

from qc.rehearsal.copying import Copy, factor
from qc.rehearsal.kind import BATCH, MODERATE, SAMPLE, STRONG, Injected, Kind, Random, Rows, each, exchanged_digits
from qc.rules.spans import num, word
from qc.rules.table import Table

FOOT = 0.3048
BATCH_MIN = 5


def located(table: Table, free: pd.Index) -> pd.DataFrame:
    """The first row of each free sample with a depth in a well."""
    rows = table.samples()
    rows = rows[rows.index.isin(free)]
    return rows[rows["top_m"].notna() & rows["kind"].ne("outcrop")]


def numbered(table: Table, free: pd.Index) -> list[Rows]:
    """Samples whose label ends in a number and that have neighbours above and below of the same well and kind."""
    rows = located(table, free)
    found: list[Rows] = []
    for _, group in rows[rows["label"].str.contains(r"\d", regex=True)].groupby(["well", "kind", "table"], sort=True):
        ordered = group.sort_values("top_m", kind="stable").index
        found += each(ordered[2:-2])
    return found


def digits(copy: Copy, rows: Rows, strength: str, random: Random) -> Injected | None:
    """Two neighbouring digits of the top exchanged as reported."""
    row = rows[0]
    unit, text = factor(copy.rows, row, "top"), word(copy.rows, row, "top_text")
    low, high = {MODERATE: (1.0, 3.0), STRONG: (3.0, np.inf)}[strength]
    top, spacing = num(copy.rows, row, "top_m"), _spacing(copy.rows, row)
    fitting = [
        one for one in exchanged_digits(text.split(".")[0])
        if low * spacing <= abs(float(one + text[len(one) :]) * unit - top) < high * spacing
    ]  # fmt: skip
    if not fitting or not spacing > 0:
        return None
    chosen = fitting[int(random.integers(len(fitting)))] + text[len(fitting[0]) :]
    copy.move(row, top=float(chosen) * unit)
    return Injected(rows, f"top {text} → {chosen}")


def _spacing(rows: pd.DataFrame, row: int) -> float:
    """Usual distance between tops of the samples of the same well and kind [m]."""
    tops = np.unique(
        rows.loc[(rows["well"] == rows.at[row, "well"]) & (rows["kind"] == rows.at[row, "kind"]), "top_m"].dropna()
    )
    return float(np.median(np.diff(tops))) if len(tops) > 1 else 0.0


def intervals(table: Table, free: pd.Index) -> list[Rows]:
    """Five intervals below each other of one well, kind and source table."""
    rows = located(table, free)
    found: list[Rows] = []
    for _, group in rows[rows["base_m"] > rows["top_m"]].groupby(["well", "kind", "table"], sort=True):
        listed = [int(row) for row in group.sort_values("top_m", kind="stable").index]
        found += [tuple(listed[at : at + 5]) for at in range(len(listed) - 4)]
    return found


def turned(copy: Copy, rows: Rows, strength: str, random: Random) -> Injected:
    """Top and base in each other's column."""
    chosen = rows if strength == STRONG else rows[:1]
    for row in chosen:
        copy.move(row, top=num(copy.rows, row, "base_m"), base=num(copy.rows, row, "top_m"))
    return Injected(chosen, f"top and base of {len(chosen)} intervals exchanged")


def bottom(table: Table, free: pd.Index) -> list[Rows]:
    """The deepest three samples of each well whose total depth is known."""
    rows = located(table, free)
    found: list[Rows] = []
    for _, group in rows.groupby("well", sort=True):
        if not np.isnan(num(table.wells, int(num(rows, group.index[0], "well")), "td_m")):
            found += each(group.sort_values("top_m", kind="stable").index[-3:])
    return found


def beyond(copy: Copy, rows: Rows, strength: str, random: Random) -> Injected:
    """The sample labelled deeper than the well."""
    row = rows[0]
    td = num(copy.original.wells, int(num(copy.rows, row, "well")), "td_m")
    past = {MODERATE: 5.0, STRONG: 50.0}[strength] + 0.001 * td
    length = num(copy.rows, row, "base_m") - num(copy.rows, row, "top_m")
    length = 0.0 if np.isnan(length) else length
    base = td + past * float(random.uniform(1.0, 1.2))
    copy.move(row, top=base - length, base=base if not np.isnan(num(copy.rows, row, "base_m")) else None)
    return Injected(rows, f"base at {base:.2f} m, total depth {td:.2f} m")


def pairs(table: Table, free: pd.Index) -> list[Rows]:
    """A sample and the next one down of the same well, kind and source table; both were measured for the same thing."""
    rows = located(table, free)
    found: list[Rows] = []
    for _, group in rows.groupby(["well", "kind", "table", "method"], sort=True):
        listed = [int(row) for row in group.sort_values("top_m", kind="stable").index]
        found += list(itertools.pairwise(listed))
    return found


def same_depth(copy: Copy, rows: Rows, strength: str, random: Random) -> Injected | None:
    """The depth of a sample copied onto the next: two results for one depth."""
    first, second = rows
    before, after = copy.value(first, "TOC"), copy.value(second, "TOC")
    if not (before > 0 and after > 0):
        return None
    apart = max(before, after) / min(before, after) - 1
    low, high = {MODERATE: (0.02, 0.30), STRONG: (0.30, np.inf)}[strength]
    if not low <= apart < high:
        return None
    copy.move(second, top=num(copy.rows, first, "top_m"), base=num(copy.rows, first, "base_m"))
    return Injected(
        (second,),
        f"depth of {word(copy.rows, first, 'label')} copied onto {word(copy.rows, second, 'label')}",
        (first,),
    )


def swaps(table: Table, free: pd.Index) -> list[Rows]:
    """A numbered sample and the next four down of the same well, kind and source table."""
    ordered = [row for (row,) in numbered(table, free)]
    keys = (
        table.rows.loc[ordered, ["well", "kind", "table"]].apply(tuple, axis=1) if ordered else pd.Series(dtype=object)
    )
    return [
        tuple(ordered[at : at + 5]) for at in range(len(ordered) - 4) if keys.iloc[at] == keys.iloc[at + 4]
    ]  # fmt: skip


def samples_swapped(copy: Copy, rows: Rows, strength: str, random: Random) -> Injected | None:
    """Two bags changed places: each label stands at the depth of the other."""
    first, second = rows[0], rows[1] if strength == MODERATE else rows[int(random.integers(2, 5))]
    ends = [(num(copy.rows, row, "top_m"), num(copy.rows, row, "base_m")) for row in (first, second)]
    if ends[0][0] == ends[1][0]:
        return None
    copy.move(first, *ends[1])
    copy.move(second, *ends[0])
    names = [word(copy.rows, row, "label") for row in (first, second)]
    return Injected((first, second), f"depths of {names[0]} and {names[1]} exchanged")


def batches(table: Table, free: pd.Index) -> list[Rows]:
    """The samples of one well in one source table, from the top down."""
    rows = located(table, free)
    rows = rows[rows["top_m"] > 0]
    found = []
    for _, group in rows.groupby(["well", "table"], sort=True):
        if len(group) >= BATCH_MIN:
            found.append(tuple(int(row) for row in group.sort_values("top_m", kind="stable").index))
    return found


def feet_as_metres(copy: Copy, rows: Rows, strength: str, random: Random) -> Injected:
    """Depths measured in feet and read as metres: 3.28 times too large."""
    chosen = rows if strength == STRONG else rows[len(rows) // 2 :]
    for row in chosen:
        copy.move(row, top=num(copy.rows, row, "top_m") / FOOT, base=num(copy.rows, row, "base_m") / FOOT)
    return Injected(chosen, f"{len(chosen)} depths 3.28 times too large")


KINDS = (
    Kind("depth_feet_as_metres", "Depths in feet taken for metres", BATCH,
         {MODERATE: "the lower half of a well's samples in one table", STRONG: "all of a well's samples in one table"},
         ("depth_unit_mixup", "depth_beyond_td", "outside_core", "strat_top_mismatch"), batches, feet_as_metres,
         "no table holds at least 5 undoubted samples of one well with depths"),
    Kind("depth_digits", "Two digits of one depth exchanged", SAMPLE,
         {MODERATE: "the top moves by one to three times the usual distance of samples",
          STRONG: "the top moves by more than three times the usual distance of samples"},
         ("sample_sequence", "depth_interval_order", "cuttings_interval", "outside_core", "depth_beyond_td", "duplicate_depth"),
         numbered, digits, "no undoubted sample has a numbered label, a depth and neighbours above and below", sparse=True),
    Kind("top_base_turned", "Top and base exchanged", SAMPLE,
         {MODERATE: "one interval", STRONG: "five intervals below each other"},
         ("depth_interval_order",), intervals, turned, "no table has five undoubted intervals below each other in one well", sparse=True),
    Kind("beyond_total_depth", "Depth beyond the end of the well", SAMPLE,
         {MODERATE: "5 m and 0.1 % beyond total depth", STRONG: "50 m and 0.1 % beyond total depth"},
         ("depth_beyond_td",), bottom, beyond, "no well with undoubted samples has a total depth on record", sparse=True),
    Kind("same_depth_twice", "One depth for two samples with other values", SAMPLE,
         {MODERATE: "their TOC differs by 2 to 30 %", STRONG: "their TOC differs by more than 30 %"},
         ("duplicate_depth", "cuttings_interval"), pairs, same_depth,
         "no two undoubted neighbours of one table have depths and TOC", sparse=True),
    Kind("sample_swap", "Two samples exchanged", SAMPLE,
         {MODERATE: "next neighbours", STRONG: "two to four samples apart"},
         ("sample_sequence",), swaps, samples_swapped,
         "no run of five undoubted samples of one table has numbered labels and depths", sparse=True),
)  # fmt: skip
