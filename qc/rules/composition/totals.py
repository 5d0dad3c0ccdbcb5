"""Oxides and minerals add up to the whole rock."""

from typing import Any

import numpy as np
import pandas as pd

from qc.rules.asking import answer, count, dig, nothing, total
from qc.rules.facts import says
from qc.rules.rule import INFO, REJECT, WARN, Answer, Finding, Rule, merge, say
from qc.rules.spans import Bools, Floats, Span, exact, num, reported, span
from qc.rules.table import Table

MAJORS = (
    "SIO2", "TIO2", "AL2O3", "FE2O3", "FEO", "MNO", "MGO", "CAO", "NA2O", "K2O", "P2O5", "CR2O3", "V2O5", "BAO", "SRO",
    "ZRO2",
)  # fmt: skip
NEEDED = ("SIO2", "AL2O3", "CAO", "MGO", "K2O")
CLAYS = ("ILLITE", "SMECTITE", "ILLITE_SMECTITE", "ILLITE_MICA", "KAOLINITE", "CHLORITE")
CARBONATE_MINERALS = ("CALCITE", "DOLOMITE", "ANKERITE", "SIDERITE", "MAGNESITE", "ARAGONITE")
FELDSPARS = ("K_FELDSPAR", "PLAGIOCLASE", "ALBITE")
OTHERS = (
    "QUARTZ", "PYRITE", "MARCASITE", "GYPSUM", "ANHYDRITE", "BARITE", "HALITE", "APATITE", "FLUORAPATITE", "MUSCOVITE",
    "BIOTITE", "MICA", "GLAUCONITE", "HEMATITE", "GOETHITE", "MAGNETITE", "RUTILE", "ANATASE", "ZEOLITE", "ANALCIME",
    "CLINOPTILOLITE", "HEULANDITE", "OPAL_CT", "CRISTOBALITE", "JAROSITE", "SPHALERITE", "AMPHIBOLE", "ZIRCON", "AMORPHOUS",
)  # fmt: skip
GROUPS = {"CLAY": CLAYS, "CARBONATES": CARBONATE_MINERALS, "FELDSPAR": FELDSPARS}
MINERALS = (*CLAYS, *CARBONATE_MINERALS, *FELDSPARS, *OTHERS)


def check_oxides(
    table: Table, *, warn_low: float, warn_high: float, reject_low: float, reject_high: float, unknown_max: float
) -> Answer:
    """One check a row that reports the major oxides: their sum with loss on ignition is the whole rock."""
    rows = table.panel("elements", *MAJORS, "SO3", "LOI", "TOC", "TIC")
    if rows.empty:
        return nothing()
    applies = np.all([reported(rows, name) for name in NEEDED], axis=0)
    applies &= reported(rows, "FE2O3") | reported(rows, "FEO")
    loi, burnt = span(rows, "LOI"), ~reported(rows, "LOI")
    oxides = total(rows, MAJORS)
    sulfate = np.nan_to_num(span(rows, "SO3").hi, posinf=0.0)  # counted here, or lost on ignition: either may be right
    floor = exact(rows, "TOC") + 3.664 * exact(rows, "TIC")
    low = np.where(burnt, 100 - floor - unknown_max, warn_low)
    whole = Span(
        np.where(burnt, oxides.lo, oxides.lo + loi.lo), np.where(burnt, oxides.hi, oxides.hi + loi.hi) + sulfate
    )
    with np.errstate(invalid="ignore"):
        fires = (whole.lo > warn_high) | (whole.hi < low)
        known = (whole.lo >= low) & (whole.hi - sulfate <= warn_high)

    def tell(row: int) -> Finding:
        at: Any = rows.index.get_loc(row)
        sum_, without = dig(whole.lo[at], 2), bool(burnt[at])
        far = sum_ > reject_high or (not without and sum_ < reject_low)
        text = f"Major oxides {'without' if without else 'and'} loss on ignition add up to {say(sum_)} wt%."
        more = {
            "parts": {
                name: num(rows, row, name) for name in (*MAJORS, "SO3", "LOI") if num(rows, row, f"{name}_id") >= 0
            },
            "alternatives": [
                "unit or typing slip in one oxide",
                "iron as FeO or Fe2O3",
                "sulfur or halogens not counted",
            ],
            "discriminating_test": "ask for the fused-bead total of the laboratory and its iron convention",
        }
        parts = tuple(more["parts"])
        limit = [dig(low[at], 2), warn_high]
        return Finding(
            row, "LOI" if not without else "SIO2", REJECT if far else WARN, text, parts, sum_, limit, more=more
        )

    return answer(rows, tell, applies=applies, known=known, fires=fires)


OXIDES = Rule(
    id="oxide_total",
    family="composition",
    title="Oxides and loss on ignition make the whole rock",
    tests="The major oxides and the loss on ignition of one analysis must add up to about 100 wt%.",
    check=check_oxides,
    inputs=(*MAJORS, "SO3", "LOI"),
    flags="LOI",
    formula=(
        "sum of oxides + LOI outside 98-102 warns, outside 95-105 is a candidate for rejection; without LOI only a sum "
        "above 102 or below 100 - (TOC + 3.664 TIC) - 5 fires"
    ),
    message="Major oxides do not add up to the whole rock",
    source="our default, no publication",
    must_not_fire="On suites of trace elements. SO3 that may also be lost on ignition is counted either way.",
    example="Oxides and LOI that add up to 103.4 fire; 99.6 passes.",
)


def listed(rows: pd.DataFrame) -> tuple[str, ...]:
    """Minerals and the group totals that stand for minerals nobody listed."""
    groups = [group for group, members in GROUPS.items() if not count(rows, members).any()]
    return (*MINERALS, *groups)


def check_minerals(table: Table, *, tolerance: float, minerals_min: float, toc_high: float) -> Answer:
    """One check a mineral analysis that its entries add up to 100; another that rich rock has an entry for organic matter."""
    rows = table.panel("minerals", *MINERALS, *GROUPS, "TOC")
    if rows.empty:
        return nothing()
    names = listed(rows)
    whole = total(rows, names)
    slack = tolerance + np.sum([np.nan_to_num(rows[f"{name}_h"].to_numpy(dtype=float)) for name in names], axis=0)
    applies = (count(rows, names) >= minerals_min) & ~says(rows, r"(?:un|not |non-)normali[sz]ed")
    fires = (whole.lo > 100 + slack) | (whole.hi < 100 - slack)
    known = (whole.lo >= 100 - slack) & (whole.hi <= 100 + slack)
    return merge(
        [
            answer(rows, lambda row: _sum(rows, names, row, whole, slack), applies=applies, known=known, fires=fires),
            _organic(rows, applies, toc_high),
        ]
    )


def _sum(rows: pd.DataFrame, names: tuple[str, ...], row: int, whole: Span, slack: Floats) -> Finding:
    at: Any = rows.index.get_loc(row)
    made, limit = dig(whole.hi[at], 2), dig(slack[at], 3)
    parts = {name: num(rows, row, name) for name in names if num(rows, row, f"{name}_id") >= 0}
    text = f"The minerals add up to {say(made)} wt%; a refined total is made 100, rounding explains {say(limit)}."
    more = {
        "parts": parts,
        "alternatives": ["a mineral left out of the table", "not normalised", "typing slip in one mineral"],
        "discriminating_test": "ask whether the amorphous part and organic matter were left out, and for the refinement's own total",
    }
    return Finding(
        row,
        max(parts, key=lambda name: parts[name]),
        WARN,
        text,
        tuple(parts),
        made,
        [100 - limit, 100 + limit],
        more=more,
    )


def _organic(rows: pd.DataFrame, applies: Bools, toc_high: float) -> Answer:
    """Rich rock whose minerals make 100 without organic or amorphous matter."""
    over, known = span(rows, "TOC").above(toc_high)

    def tell(row: int) -> Finding:
        toc = num(rows, row, "TOC")
        text = f"TOC is {say(toc)} wt%, and the mineral table has no entry for organic or amorphous matter."
        more = {"discriminating_test": "scale the minerals to 100 - TOC/0.8 before comparing them with elements"}
        return Finding(row, "TOC", INFO, text, ("TOC",), toc, toc_high, more=more)

    fires = over & ~reported(rows, "AMORPHOUS")
    return answer(rows, tell, applies=applies & reported(rows, "TOC"), known=known, fires=fires)


MINERAL = Rule(
    id="mineral_total",
    family="composition",
    title="Minerals add up to 100",
    tests="The minerals of one X-ray diffraction analysis must add up to 100 wt%; rich rock needs an entry for organic matter.",
    check=check_minerals,
    inputs=MINERALS,
    flags="QUARTZ",
    formula="|sum of minerals - 100| > 0.5 + half-units of the entries; info when TOC > 5 and nothing stands for organic matter",
    message="Minerals do not add up to 100 wt%",
    source="our default, no publication",
    must_not_fire="Where the remark says that the total is not normalised. A total of 100 proves nothing: it is made so.",
    example="Minerals that add up to 97.3 fire; 100.0 passes.",
)
RULES = (OXIDES, MINERAL)
