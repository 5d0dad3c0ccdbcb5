"""From what a laboratory measured to what it writes down: rounding, reporting limits, blanks."""

from dataclasses import dataclass

import numpy as np
import pandas as pd

from labdata.demo import geology
from labdata.demo.basin import FOOT, WELLS, DemoLaboratory, DemoWell
from labdata.demo.composition import OXIDES, TRACES, elements
from labdata.demo.faults import REPORT, ROCK, with_faults

Cell = float | str | None
TMAX_FLOOR_S2 = 0.2  # mg HC/g rock; below it these laboratories report no Tmax


@dataclass(frozen=True)
class Rounding:
    """Decimals in the report, and the reporting limit below which ``<limit`` is written (None: no limit)."""

    decimals: int
    limit: float | None = None


PYROLYSIS = {
    "toc": Rounding(2, 0.05), "s1": Rounding(2, 0.02), "s2": Rounding(2, 0.05), "s3": Rounding(2, 0.05),
    "tmax": Rounding(0), "hi": Rounding(0), "oi": Rounding(0), "pi": Rounding(2), "carb": Rounding(1),
}  # fmt: skip
ELEMENTS = {name: Rounding(2, 0.02) for name in OXIDES} | {
    "V": Rounding(0, 5.0), "NI": Rounding(0, 3.0), "MO": Rounding(1, 2.0), "U": Rounding(1, 2.0),
}  # fmt: skip
# what each index is made of: it is blank where one of them is below its limit
INDEX_INPUTS = {"hi": ("s2", "toc"), "oi": ("s3", "toc"), "pi": ("s1", "s2")}


def pyrolysis(well: DemoWell, laboratory: DemoLaboratory, revision: int = 1) -> pd.DataFrame:
    """The reported pyrolysis table of a well, indexed by label: kind, top, base [m], formation and PYROLYSIS cells.

    Revision 2 is the amended report: five samples run again, and the slips mended that it is said to mend.
    """
    truth = faulty_rock(well)
    number = WELLS.index(well)
    table = geology.measured(truth, laboratory, geology.generator(20, number))
    if revision > 1:
        table = _run_again(table, truth, laboratory)
    cells = rounded(table, PYROLYSIS)
    cells.loc[table["s2"] < TMAX_FLOOR_S2, "tmax"] = None
    for index, inputs in INDEX_INPUTS.items():
        censored = cells[list(inputs)].map(lambda cell: isinstance(cell, str)).any(axis=1)
        cells.loc[censored, index] = None
    return with_faults(_beside(truth, cells), well, REPORT, revision)


def faulty_rock(well: DemoWell) -> pd.DataFrame:
    """True properties of the well's samples after contamination, indexed by label."""
    return with_faults(geology.rock(well).set_index("label"), well, ROCK)


RUN_AGAIN = ("T1-071", "T1-088", "T1-094", "T1-096", "T1-103")


def _run_again(table: pd.DataFrame, truth: pd.DataFrame, laboratory: DemoLaboratory) -> pd.DataFrame:
    """``table`` with fresh measurements of the samples that the laboratory ran again."""
    rows = list(RUN_AGAIN)
    fresh = geology.measured(truth.loc[rows], laboratory, geology.generator(21))
    table = table.copy()
    table.loc[rows, fresh.columns] = fresh
    return table


def reflectance(well: DemoWell, every: int) -> pd.DataFrame:
    """Vitrinite reflectance of every n-th sample: ro, its standard deviation [%] and the number of readings."""
    truth = geology.rock(well).set_index("label").iloc[every // 2 :: every]
    stream = geology.generator(30, WELLS.index(well))
    size = len(truth)
    readings = stream.integers(20, 46, size)
    spread = 0.045 + 0.04 * truth["ro"] * stream.uniform(0.7, 1.2, size)
    ro = truth["ro"] + spread / np.sqrt(readings) * stream.standard_normal(size)
    cells = pd.DataFrame({"ro": ro.round(2), "ro_sd": spread.round(3), "ro_n": readings.astype(float)}, dtype=object)
    return _beside(truth, cells)


def elemental(well: DemoWell, every: int) -> pd.DataFrame:
    """Oxides, loss on ignition and trace elements of every n-th sample."""
    truth = faulty_rock(well).iloc[1::every]
    table = elements(truth, geology.generator(40, WELLS.index(well)))
    return _beside(truth, rounded(table[[*OXIDES, *TRACES]], ELEMENTS))


def carbon_sulphur(well: DemoWell, every: int, first: int = 0) -> pd.DataFrame:
    """Total and inorganic carbon and total sulphur [wt%] of every n-th sample from ``first``, by combustion."""
    truth = faulty_rock(well).iloc[first::every]
    stream = geology.generator(50, WELLS.index(well))
    inorganic = truth["carb"] / 8.333 * (1 + 0.02 * stream.standard_normal(len(truth)))
    total = (truth["toc"] + inorganic) * (1 + 0.01 * stream.standard_normal(len(truth)))
    sulphur = truth["toc"] / 2.8 * (1 + 0.15 * stream.standard_normal(len(truth)))
    table = pd.DataFrame({"tc": total, "tic": inorganic, "ts": sulphur})
    return _beside(truth, rounded(table, dict.fromkeys(("tc", "tic", "ts"), Rounding(2, 0.05))))


def rounded(table: pd.DataFrame, rules: dict[str, Rounding]) -> pd.DataFrame:
    """The cells of a report: rounded numbers, ``<limit`` as text below the limit, None where nothing was measured."""
    return pd.DataFrame(
        {name: [_cell(value, rule) for value in table[name]] for name, rule in rules.items()},
        index=table.index,
        dtype=object,
    )


def _cell(value: float, rule: Rounding) -> Cell:
    if np.isnan(value):
        return None
    if rule.limit is not None and value < rule.limit:
        return f"<{rule.limit:g}"
    return round(float(value), rule.decimals)


def _beside(truth: pd.DataFrame, cells: pd.DataFrame) -> pd.DataFrame:
    """Identity of each sample and its cells, base None for a point."""
    identity = truth[["kind", "top", "base", "formation"]].astype(object)
    identity["base"] = identity["base"].where(truth["base"].notna(), None)
    return pd.concat([identity, cells], axis=1)


def in_feet(table: pd.DataFrame) -> pd.DataFrame:
    """``table`` with top and base in feet, to a tenth."""
    feet = table.copy()
    for name in ("top", "base"):
        feet[name] = [None if value is None else round(float(value) / FOOT, 1) for value in table[name]]
    return feet
