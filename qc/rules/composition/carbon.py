"""Carbon against itself, against calcium, and against what leaves on ignition."""

import numpy as np
import pandas as pd

from qc.rules.asking import answer, column, dig, first, nothing, wt
from qc.rules.composition.stoichiometry import (
    CALCITE_PER_CARBON,
    CO2_PER_CARBON,
    DOLOMITE_AS_CALCITE,
    FEO_PER_FE2O3,
    MOLAR,
    OXIDE_FACTOR,
)
from qc.rules.facts import says
from qc.rules.rule import REJECT, WARN, Answer, Finding, Rule, merge, say
from qc.rules.spans import Floats, exact, num, reported, span
from qc.rules.table import Table

OWN_SULFUR = (
    1.5  # wt% TOC per wt% S below which rock is euxinic: the most sulfur that is assumed where none was measured
)


def check_sum(table: Table, *, uncertainty: float, uncertainty_relative: float, coverage: float) -> Answer:
    """One check a row that reports TC and TIC: TC is TOC + TIC within the combined uncertainty."""
    rows = table.of("pyrolysis", "carbon")
    rows = rows[rows["TC_row"].to_numpy() == rows.index.to_numpy()]
    if rows.empty:
        return nothing()
    each = [np.maximum(uncertainty, uncertainty_relative * rows[name].to_numpy()) for name in ("TC", "TOC", "TIC")]
    limit = coverage * np.sqrt(np.sum(np.square(each), axis=0))
    left = span(rows, "TC") - span(rows, "TOC") - span(rows, "TIC")
    (over, known_over), (under, known_under) = left.above(limit), left.below(-limit)
    made = column(rows, left=exact(rows, "TC") - exact(rows, "TOC") - exact(rows, "TIC"), limit=limit)

    def tell(row: int) -> Finding:
        residual, allowed = num(made, row, "left"), num(made, row, "limit")
        text = (
            f"TC {say(num(rows, row, 'TC'))} is not TOC {say(num(rows, row, 'TOC'))} + TIC {say(num(rows, row, 'TIC'))}: "
            f"{say(residual)} wt% remain, uncertainty explains {say(allowed)}."
        )
        more = {
            "alternatives": ["slip in one of the three", "incomplete acid treatment", "different splits"],
            "discriminating_test": "repeat TC and TOC on one split",
        }
        return Finding(row, "TC", WARN, text, ("TC", "TOC", "TIC"), dig(residual), dig(allowed), more=more)

    applies = reported(rows, "TIC") & ~says(rows, r"by difference")
    return answer(rows, tell, applies=applies, known=known_over & known_under, fires=over | under)


SUM = Rule(
    id="carbon_sum",
    family="composition",
    title="Total carbon is organic and inorganic carbon",
    tests="Where TC, TOC and TIC are all reported, TC must be the sum of the other two.",
    check=check_sum,
    inputs=("TC", "TOC", "TIC"),
    flags="TC",
    formula="|TC - TOC - TIC| > 2 sqrt(u1^2 + u2^2 + u3^2), u = max(0.05, 3 %)",
    message="Total carbon is not the sum of organic and inorganic carbon",
    source="definition of total carbon; uncertainty: our default, no publication",
    must_not_fire="Where one of them is by difference (said in the remark): then the sum proves nothing.",
    example="TC 3.21, TOC 1.05, TIC 2.14: 0.02 <= 0.252 passes; TOC 1.55 leaves 0.48 and fires.",
)


def moles_of_bases(rows: pd.DataFrame) -> Floats:
    """Ca + Mg + Fe [mol per 100 g] from oxides, else elements; NaN unless all three are known."""
    lime = first(exact(rows, "CAO"), wt(rows, "CA") * OXIDE_FACTOR["CA"][1])
    magnesia = first(exact(rows, "MGO"), wt(rows, "MG") * OXIDE_FACTOR["MG"][1])
    iron = first(
        exact(rows, "FEO") + FEO_PER_FE2O3 * np.nan_to_num(exact(rows, "FE2O3")), FEO_PER_FE2O3 * exact(rows, "FE2O3"),
        FEO_PER_FE2O3 * OXIDE_FACTOR["FE"][1] * wt(rows, "FE"),
    )  # fmt: skip
    return lime / MOLAR["CAO"] + magnesia / MOLAR["MGO"] + iron / MOLAR["FEO"]


def check_calcium(
    table: Table, *, slack: float, difference: float, difference_relative: float, other_max: float
) -> Answer:
    """One check a row with Ca, Mg, Fe that they can hold the inorganic carbon; one a mineral row that TIC makes its calcite."""
    return merge([_bases(table, slack), _calcite(table, difference, difference_relative, other_max)])


def _bases(table: Table, slack: float) -> Answer:
    names = ("CAO", "CA", "MGO", "MG", "FEO", "FE2O3", "FE", "TIC")
    rows = table.panel("elements", *names)
    if rows.empty:
        return nothing()
    made = column(rows, bases=moles_of_bases(rows), carbon=exact(rows, "TIC") / MOLAR["C"])
    with np.errstate(invalid="ignore"):
        fires = made["bases"] < slack * made["carbon"]

    def tell(row: int) -> Finding:
        bases, carbon, tic = num(made, row, "bases"), num(made, row, "carbon"), num(rows, row, "TIC")
        text = f"TIC {say(tic)} wt% needs {say(carbon)} mol/100 g of Ca, Mg and Fe as carbonate; the rock has {say(bases)}."
        more = {
            "calcite_by_tic": dig(CALCITE_PER_CARBON * tic, 2), "lime_by_tic": dig(4.669 * tic, 2),
            "alternatives": ["TIC slip", "element in another unit", "sodium, barium, strontium or manganese carbonate"],
            "discriminating_test": "weight loss in acid, or carbonate by diffraction",
        }  # fmt: skip
        return Finding(row, "TIC", REJECT, text, names, dig(bases), dig(slack * carbon), more=more)

    applies = reported(rows, "CAO") | reported(rows, "CA")
    return answer(rows, tell, applies=applies, known=~made.isna().any(axis=1), fires=fires)


def _calcite(table: Table, difference: float, relative: float, other_max: float) -> Answer:
    rows = table.panel("minerals", "CALCITE", "DOLOMITE", "SIDERITE", "ANKERITE", "TIC")
    if rows.empty:
        return nothing()
    by_tic = CALCITE_PER_CARBON * exact(rows, "TIC")
    by_xrd = exact(rows, "CALCITE") + DOLOMITE_AS_CALCITE * exact(rows, "DOLOMITE")
    limit = np.maximum(difference, relative * np.maximum(by_tic, by_xrd))
    made = column(rows, by_tic=by_tic, by_xrd=by_xrd, limit=limit)
    with np.errstate(invalid="ignore"):
        other = np.nan_to_num(exact(rows, "SIDERITE")) + np.nan_to_num(exact(rows, "ANKERITE")) > other_max
        fires = np.abs(by_tic - by_xrd) > limit

    def tell(row: int) -> Finding:
        carbon, minerals = num(made, row, "by_tic"), num(made, row, "by_xrd")
        text = f"TIC makes {say(carbon)} wt% calcite, diffraction found {say(minerals)} (dolomite counted as calcite)."
        more = {
            "alternatives": ["TIC slip", "carbonate missed or overstated by diffraction", "different splits"],
            "discriminating_test": "lime by X-ray fluorescence on the same split",
        }
        given = ("TIC", "CALCITE", "DOLOMITE")
        return Finding(
            row, "TIC", WARN, text, given, dig(carbon - minerals, 2), dig(num(made, row, "limit"), 2), more=more
        )

    applies = reported(rows, "CALCITE") & reported(rows, "TIC") & ~other
    return answer(rows, tell, applies=applies, known=~made.isna().any(axis=1), fires=fires)


CALCIUM = Rule(
    id="tic_vs_calcium",
    family="composition",
    title="Inorganic carbon has its calcium",
    tests=(
        "Inorganic carbon needs calcium, magnesium or iron to stand in carbonate with, and the carbonate minerals must make "
        "the TIC that was reported."
    ),
    check=check_calcium,
    inputs=("TIC", "CAO", "MGO", "FE2O3", "CALCITE", "DOLOMITE"),
    flags="TIC",
    formula=(
        "n(Ca)+n(Mg)+n(Fe) < 0.9 n(C), n = CaO/56.077 + MgO/40.304 + FeO/71.844, n(C) = TIC/12.011; "
        "|8.333 TIC - calcite - 1.086 dolomite| > max(3 wt%, 20 %) warns"
    ),
    message="More inorganic carbon than calcium, magnesium and iron can hold",
    source="stoichiometry; slack of 10 % and of 3 wt%: our default, no publication",
    must_not_fire="On rock with sodium, barium, strontium or manganese carbonates; the mineral limb not where siderite or ankerite stand.",
    example="TIC 2.40 with CaO 6.0, MgO 1.0, FeO 1.0: 0.146 < 0.180 mol/100 g fires.",
)


def check_loi(table: Table, *, uncertainty: float, uncertainty_relative: float, coverage: float) -> Answer:
    """One check a row with loss on ignition: it holds at least the carbon and the carbon dioxide of carbonate."""
    rows = table.panel("elements", "LOI", "TOC", "TIC", "TS", "S", "SO3")
    if rows.empty:
        return nothing()
    toc = exact(rows, "TOC")
    sulfur = first(exact(rows, "TS"), wt(rows, "S"), exact(rows, "SO3") / OXIDE_FACTOR["S"][1], toc / OWN_SULFUR)
    floor = toc + CO2_PER_CARBON * exact(rows, "TIC") - 0.6 * sulfur
    limit = floor - coverage * np.maximum(uncertainty, uncertainty_relative * floor)
    loi = span(rows, "LOI")
    fires, known = loi.below(limit)
    made = column(rows, floor=floor, limit=limit)

    def tell(row: int) -> Finding:
        value, least = num(rows, row, "LOI"), num(made, row, "floor")
        text = (
            f"Loss on ignition {say(value)} wt% is less than carbon and carbonate alone would lose ({say(least)} wt%)."
        )
        more = {
            "alternatives": ["ignition at 550 degC only", "TIC or TOC slip", "loss of another sample"],
            "discriminating_test": "ask at which temperature the loss was taken",
        }
        given = ("LOI", "TOC", "TIC", "TS", "S")
        return Finding(row, "LOI", WARN, text, given, dig(value, 3), dig(num(made, row, "limit"), 3), more=more)

    return answer(rows, tell, applies=reported(rows, "LOI"), known=known, fires=fires)


LOI = Rule(
    id="loi_floor",
    family="composition",
    title="Loss on ignition holds the carbon",
    tests="What leaves at 1000 degC is at least the organic carbon and the carbon dioxide of the carbonate.",
    check=check_loi,
    inputs=("LOI", "TOC", "TIC", "TS"),
    flags="LOI",
    formula="LOI < TOC + 3.664 TIC - 0.6 S - 2u, u = max(0.3, 3 %); S that nobody measured is taken as TOC/1.5",
    message="Loss on ignition is smaller than carbon and carbonate dioxide",
    source="stoichiometry; uncertainty: our default, no publication",
    must_not_fire="Without TOC and TIC of the same sample (cannot be evaluated).",
    example="TOC 2.15, TIC 2.40: 2.15 + 8.79 = 10.94; LOI 6.2 fires.",
)
RULES = (SUM, CALCIUM, LOI)
