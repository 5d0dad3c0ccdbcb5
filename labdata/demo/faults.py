"""The faults put into the demonstration on purpose: what went wrong, and which rules should catch it.

A fault of the rock is applied to the true properties before the laboratory measures them; a fault of the report is
applied to what the laboratory wrote down, after rounding.
"""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import pandas as pd

from labdata.demo.basin import CORVANE, FENNICK_1, SALLOWBY_1, TARROW_1, TARROW_2, DemoWell
from labdata.demo.geology import generator

Change = Callable[[pd.DataFrame], pd.DataFrame]
ROCK, REPORT = "rock", "report"
OIL_CARBON = 0.083  # wt% organic carbon per mg HC/g rock


@dataclass(frozen=True)
class Fault:
    """One fault. ``labels`` are the samples it shows in; empty where a whole ``formation`` shows it.

    ``change`` takes and returns a table indexed by sample label. ``mended`` names the report revision that
    corrects it, 0 where none does.
    """

    code: str
    story: str
    well: DemoWell
    labels: tuple[str, ...]
    rules: tuple[str, ...]
    stage: str
    change: Change
    formation: str = ""
    mended: int = 0


def oil_based_mud(table: pd.DataFrame) -> pd.DataFrame:
    """Base oil of the mud clings to the cuttings: 4-8 mg/g in S1, a tenth as much in S2, its carbon in TOC."""
    added = 5.5 * np.exp(0.25 * generator(101).standard_normal(len(OILY)))
    rows = list(OILY)
    table.loc[rows, "s1"] += added
    table.loc[rows, "s2"] += added / 10
    table.loc[rows, "toc"] += OIL_CARBON * 1.1 * added
    return table


def fibre_pill(table: pd.DataFrame) -> pd.DataFrame:
    """Cellulose fibre against losses: low Tmax, much S2 and S3, more TOC than the limestone has."""
    rows = list(FIBRE)
    table.loc[rows, "toc"] += np.array([0.9, 0.6])
    table.loc[rows, "s2"] += np.array([3.1, 2.2])
    table.loc[rows, "s3"] += np.array([2.6, 1.9])
    table.loc[rows, "tmax"] = np.array([352.0, 366.0])
    return table


def leave_as_is(table: pd.DataFrame) -> pd.DataFrame:
    """Nothing to change: the geological model itself holds the effect."""
    return table


def tmax_of_noise(table: pd.DataFrame) -> pd.DataFrame:
    """The instrument gave a Tmax although S2 was next to nothing, and the laboratory left it in."""
    rows = list(NOISE)
    table.loc[rows, "toc"] = [0.21, 0.17]
    table.loc[rows, "s1"] = ["<0.02", "<0.02"]
    table.loc[rows, "s2"] = [0.11, 0.08]
    table.loc[rows, "hi"] = [52.0, 47.0]
    table.loc[rows, "oi"] = np.round(100 * table.loc[rows, "s3"].astype(float) / table.loc[rows, "toc"].astype(float))
    table.loc[rows, "pi"] = None
    table.loc[rows, "tmax"] = [407.0, 489.0]
    return table


def hi_slip(table: pd.DataFrame) -> pd.DataFrame:
    """Two digits of one hydrogen index changed places."""
    table.at[HI_ROW, "hi"] = _swapped(_number(table, HI_ROW, "hi"), 0)
    return table


def pi_slip(table: pd.DataFrame) -> pd.DataFrame:
    """The decimal point of one production index stands a place too far right."""
    table.at[PI_ROW, "pi"] = round(10 * _number(table, PI_ROW, "pi"), 2)
    return table


def depth_digits(table: pd.DataFrame) -> pd.DataFrame:
    """Two digits of one plug depth changed places, as a typist does it."""
    table.at[DEPTH_ROW, "top"] = _swapped(_number(table, DEPTH_ROW, "top"), 2)
    return table


def below_total_depth(table: pd.DataFrame) -> pd.DataFrame:
    """The last bag was labelled with depths that the well never reached."""
    table.loc[DEEP_ROW, ["top", "base"]] = [2900.0, 2920.0]
    return table


def same_depth_twice(table: pd.DataFrame) -> pd.DataFrame:
    """A depth was copied down one row too far."""
    table.loc[TWICE[1], ["top", "base"]] = table.loc[TWICE[0], ["top", "base"]].to_numpy()
    return table


def toc_slip(table: pd.DataFrame) -> pd.DataFrame:
    """One TOC lost a digit on the way to the report; the index was computed from the slip."""
    toc = round(_number(table, TOC_ROW, "toc") / 10, 2)
    table.at[TOC_ROW, "toc"] = toc
    for index, peak in (("hi", "s2"), ("oi", "s3")):
        table.at[TOC_ROW, index] = round(100 * _number(table, TOC_ROW, peak) / toc)
    return table


def negative_peak(table: pd.DataFrame) -> pd.DataFrame:
    """The blank taken off was larger than the S1 peak."""
    table.at[NEGATIVE_ROW, "s1"] = -0.03
    table.at[NEGATIVE_ROW, "pi"] = None
    return table


def top_for_base(table: pd.DataFrame) -> pd.DataFrame:
    """Top and base of one interval stand in each other's column."""
    table.loc[TURNED_ROW, ["top", "base"]] = table.loc[TURNED_ROW, ["base", "top"]].to_numpy()
    return table


def _number(table: pd.DataFrame, label: str, name: str) -> float:
    """One reported number."""
    return float(str(table.at[label, name]))


def _swapped(value: float, position: int) -> float:
    """``value`` with the digits at ``position`` and the next changed over."""
    digits = list(f"{value:.2f}")
    digits[position], digits[position + 1] = digits[position + 1], digits[position]
    return float("".join(digits))


OILY = tuple(f"T1-{number:03d}" for number in range(133, 151))
FIBRE = ("SA-040", "SA-041")
NOISE = ("SA-005", "SA-011")
HI_ROW = "T1-096"
PI_ROW = "SA-034"
DEPTH_ROW = "F1-049"
DEEP_ROW = "SA-072"
TWICE = ("T2-044", "T2-045")
TOC_ROW = "T2-066"
NEGATIVE_ROW = "T2-009"
TURNED_ROW = "SA-027"

FAULTS = (
    Fault("oil_based_mud", "Oil-based mud below 2520 m: base oil in the cuttings raises S1, PI and OSI.",
          TARROW_1, OILY, ("free_oil_crossover", "pi_high_for_maturity", "oil_based_fluid_interval"), ROCK, oil_based_mud),
    Fault("matrix_retention", "Clay of the Corvane Shale holds hydrocarbons back from S2: lean samples show too low an HI.",
          TARROW_1, (), ("s2_toc_fit",), ROCK, leave_as_is, formation=CORVANE.name),
    Fault("fibre_pill", "A cellulose fibre pill against losses at 2210 m: S2 of the fibre peaks far below rock.",
          SALLOWBY_1, FIBRE, ("tmax_range",), ROCK, fibre_pill),
    Fault("tmax_of_noise", "Tmax reported from an S2 of about 0.1 mg/g.",
          SALLOWBY_1, NOISE, ("s2_floor_for_tmax",), REPORT, tmax_of_noise),
    Fault("hi_slip", "Two digits of a reported hydrogen index changed places.",
          TARROW_1, (HI_ROW,), ("index_recalc",), REPORT, hi_slip, mended=2),
    Fault("pi_slip", "A reported production index ten times too large.",
          SALLOWBY_1, (PI_ROW,), ("index_recalc",), REPORT, pi_slip),
    Fault("depth_digits", "Two digits of a core plug's depth changed places.",
          FENNICK_1, (DEPTH_ROW,), ("sample_sequence",), REPORT, depth_digits),
    Fault("below_total_depth", "Cuttings labelled deeper than the well's total depth.",
          SALLOWBY_1, (DEEP_ROW,), ("depth_beyond_td",), REPORT, below_total_depth),
    Fault("same_depth_twice", "One depth copied down onto the next sample.",
          TARROW_2, TWICE, ("duplicate_depth",), REPORT, same_depth_twice),
    Fault("toc_slip", "A TOC ten times too small: less carbon than S1 and S2 alone release.",
          TARROW_2, (TOC_ROW,), ("pyro_carbon_balance",), REPORT, toc_slip),
    Fault("negative_peak", "An S1 below zero after the blank was taken off.",
          TARROW_2, (NEGATIVE_ROW,), ("pyro_value_range",), REPORT, negative_peak),
    Fault("top_for_base", "Top and base of one interval changed over.",
          SALLOWBY_1, (TURNED_ROW,), ("depth_interval_order",), REPORT, top_for_base),
)  # fmt: skip


def with_faults(table: pd.DataFrame, well: DemoWell, stage: str, revision: int = 1) -> pd.DataFrame:
    """``table`` (indexed by label) with the faults of this well and stage that ``revision`` still carries."""
    for fault in FAULTS:
        if fault.well is well and fault.stage == stage and not 0 < fault.mended <= revision:
            table = fault.change(table)
    return table
