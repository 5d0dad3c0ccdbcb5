"""Grain density of the stated rock, and of its minerals."""

from typing import TypeVar

import numpy as np

from qc.rules.asking import answer, column, dig, nothing
from qc.rules.rule import REJECT, WARN, Answer, Finding, Rule, say
from qc.rules.spans import Floats, exact, num, reported, span
from qc.rules.table import Table

Number = TypeVar("Number", float, Floats)

LITHOLOGY = {
    "sandstone": r"\b(?:sandstone|sst)\b", "limestone": r"\b(?:limestone|lst)\b", "dolostone": r"\b(?:dolostone|dolomite rock|dst)\b",
    "mudstone": r"\borganic[- ](?:rich )?(?:mudstone|shale)\b|\bblack shale\b",
}  # fmt: skip
# g/cm3, from memory of mineral tables; calcite and apatite as printed by SSHADE and webmineral
DENSITY = {
    "QUARTZ": 2.65, "CALCITE": 2.71, "DOLOMITE": 2.87, "ANHYDRITE": 2.98, "K_FELDSPAR": 2.56, "ALBITE": 2.62, "PLAGIOCLASE": 2.65,
    "ILLITE": 2.78, "ILLITE_MICA": 2.78, "ILLITE_SMECTITE": 2.60, "KAOLINITE": 2.61, "SMECTITE": 2.40, "CHLORITE": 2.90,
    "MUSCOVITE": 2.80, "SIDERITE": 3.96, "ANKERITE": 3.00, "PYRITE": 5.01, "BARITE": 4.48, "APATITE": 3.18, "HALITE": 2.16,
    "GYPSUM": 2.31,
}  # fmt: skip
CARBON_IN_KEROGEN = 0.8


def check_window(table: Table, *, reject_below: float, reject_above: float, **windows: float) -> Answer:
    """One check a plug with grain density: possible for rock, and within the window of a lithology stated in the remark."""
    rows = table.panel("core", "RHOG")
    if rows.empty:
        return nothing()
    rho = span(rows, "RHOG", rounded=True)
    text = rows["remark"].astype(str)
    named = np.column_stack([text.str.contains(pattern, case=False, regex=True) for pattern in LITHOLOGY.values()])
    one = named.sum(axis=1) == 1
    which = np.array(list(LITHOLOGY))[named.argmax(axis=1)]
    low = np.array([windows[f"{name}_low"] for name in which])
    high = np.array([windows[f"{name}_high"] for name in which])
    with np.errstate(invalid="ignore"):
        impossible = (rho.hi < reject_below) | (rho.lo > reject_above)
        outside = one & ((rho.hi < low) | (rho.lo > high))
    made = column(rows, low=low, high=high, impossible=impossible)

    def tell(row: int) -> Finding:
        value = num(rows, row, "RHOG")
        if made.at[row, "impossible"]:
            text = f"Grain density {say(value)} g/cm3 is not that of rock."
            return Finding(row, "RHOG", REJECT, text, ("RHOG",), value, [reject_below, reject_above])
        bounds = [num(made, row, "low"), num(made, row, "high")]
        text = (
            f"Grain density {say(value)} g/cm3 is outside {bounds[0]}-{bounds[1]} of {which[rows.index.get_loc(row)]}."
        )
        more = {
            "alternatives": ["other minerals than the name says", "grain volume slip", "organic matter"],
            "discriminating_test": "repeat grain volume; diffraction of the end trim",
        }
        return Finding(row, "RHOG", WARN, text, ("RHOG",), value, bounds, more=more)

    applies = reported(rows, "RHOG") & (one | impossible)
    return answer(rows, tell, applies=applies, known=rho.known, fires=impossible | outside)


WINDOW = Rule(
    id="grain_density_window",
    family="core_analysis",
    title="Grain density of the stated rock",
    tests="Grain density lies in the window of the lithology that the remark states, and is possible for rock at all.",
    check=check_window,
    inputs=("RHOG",),
    flags="RHOG",
    formula="sandstone 2.62-2.68, limestone 2.69-2.73, dolostone 2.80-2.88, organic mudstone 2.3-2.75; < 2.0 or > 4.5 is a candidate for rejection",
    message="Grain density is outside the window of the rock",
    source="windows from memory of industry practice",
    must_not_fire="Without a stated lithology, or where several are stated.",
    example="Limestone of 2.91 fires.",
)


def density_of(minerals: dict[str, float], kerogen: float = 0.0, kerogen_density: float = 1.25) -> float:
    """Grain density [g/cm3] of minerals [wt%, scaled to what kerogen leaves] and kerogen [wt%]."""
    whole = sum(minerals.values())
    dry = sum(share / DENSITY[name] for name, share in minerals.items()) / whole
    return _mixed(dry, kerogen, kerogen_density)


def _mixed(dry: Number, kerogen: Number, kerogen_density: float) -> Number:
    """Grain density of minerals of specific volume ``dry`` [cm3/g] with kerogen [wt%]: 1/rho = sum of w/rho."""
    return 100 / (dry * (100 - kerogen) + kerogen / kerogen_density)


def check_minerals(table: Table, *, tolerance: float, kerogen_density: float, share_min: float) -> Answer:
    """One check a plug whose sample has minerals and TOC: its grain density is the one of its minerals and kerogen."""
    rows = table.panel("core", "RHOG", "TOC", *DENSITY)
    if rows.empty:
        return nothing()
    shares = np.column_stack([np.nan_to_num(exact(rows, name)) for name in DENSITY])
    kerogen = exact(rows, "TOC") / CARBON_IN_KEROGEN
    whole = shares.sum(axis=1)
    with np.errstate(invalid="ignore", divide="ignore"):
        dry = shares @ (1 / np.array(list(DENSITY.values()))) / whole
        predicted = _mixed(dry, kerogen, kerogen_density)
        away = exact(rows, "RHOG") - predicted
        fires = np.abs(away) > tolerance
    made = column(rows, predicted=predicted, without=1 / np.where(whole > 0, dry, np.nan), away=away)

    def tell(row: int) -> Finding:
        value, expected, without = num(rows, row, "RHOG"), num(made, row, "predicted"), num(made, row, "without")
        text = f"Grain density {say(value)} g/cm3 where minerals and kerogen make {say(expected)} ({say(without)} without kerogen)."
        if abs(value - without) <= tolerance:
            text += " Organic matter ignored, or the diffraction normalised without it?"
        more = {
            "without_kerogen": dig(without, 3),
            "alternatives": ["organic matter ignored", "mineral understated", "grain volume slip"],
            "discriminating_test": "grain density before and after extraction",
        }
        given = ("RHOG", "TOC", *(name for name in DENSITY if num(rows, row, f"{name}_id") >= 0))
        return Finding(row, "RHOG", WARN, text, given, dig(num(made, row, "away"), 3), tolerance, more=more)

    applies = reported(rows, "RHOG") & (whole >= share_min)
    return answer(rows, tell, applies=applies, known=~np.isnan(away), fires=fires)


MINERALS = Rule(
    id="grain_density_from_minerals",
    family="core_analysis",
    title="Grain density of the minerals",
    tests="Grain density must be the one that the minerals and the organic matter of the sample make.",
    check=check_minerals,
    inputs=("RHOG", "TOC", "QUARTZ", "CALCITE"),
    flags="RHOG",
    formula="1/rho = sum of w/rho, kerogen = TOC/0.8 at 1.25 g/cm3; |difference| > 0.05 warns",
    message="Grain density is not that of the minerals",
    source="mineral densities from memory of tables; limit: our default, no publication",
    must_not_fire="Without minerals that make at least 90 wt%; without TOC it cannot be evaluated.",
    example="45 quartz, 20 calcite, 25 illite, 5 pyrite, 5 kerogen make 2.607 (2.765 without kerogen): 2.76 at 4 wt% TOC fires.",
)
RULES = (WINDOW, MINERALS)
