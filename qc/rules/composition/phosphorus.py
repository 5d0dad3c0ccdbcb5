"""Phosphorus needs calcium; sulfur needs iron."""

import numpy as np
import pandas as pd

from qc.rules.asking import answer, column, dig, first, nothing, wt
from qc.rules.composition.stoichiometry import (
    FLUORAPATITE,
    FRANCOLITE,
    IRON_PER_PYRITE_SULFUR,
    OXIDE_FACTOR,
    SULFUR_IN_ANHYDRITE,
    SULFUR_IN_GYPSUM,
    SULFUR_IN_PYRITE,
    SULFUR_PER_BARIUM,
)
from qc.rules.facts import says
from qc.rules.rule import INFO, REJECT, WARN, Answer, Finding, Rule, merge, say
from qc.rules.spans import exact, num, reported
from qc.rules.table import Table

SULFUR = ("TS", "S", "SO3", "BA", "ANHYDRITE", "GYPSUM", "FE2O3", "FE", "PYRITE", "TOC")


def residual_lime(lime: float, phosphorus: float, per_phosphorus: float = FLUORAPATITE) -> float:
    """CaO [wt%] left for carbonate when all P2O5 is apatite."""
    return lime - per_phosphorus * phosphorus


def check_apatite(table: Table, *, phosphorus_min: float, uncertainty_relative: float, coverage: float) -> Answer:
    """One check a row with phosphorus: its calcium suffices for apatite."""
    names = ("P2O5", "P", "CAO", "CA")
    rows = table.panel("elements", *names)
    if rows.empty:
        return nothing()
    phosphorus = first(exact(rows, "P2O5"), wt(rows, "P") * OXIDE_FACTOR["P"][1])
    lime = first(exact(rows, "CAO"), wt(rows, "CA") * OXIDE_FACTOR["CA"][1])
    need = FLUORAPATITE * phosphorus
    made = column(rows, lime=lime, p=phosphorus, limit=need - coverage * uncertainty_relative * np.hypot(lime, need))
    with np.errstate(invalid="ignore"):
        fires, enough = lime < made["limit"].to_numpy(), ~(phosphorus < phosphorus_min)

    def tell(row: int) -> Finding:
        cao, p2o5 = num(made, row, "lime"), num(made, row, "p")
        text = f"P2O5 {say(p2o5)} wt% as apatite needs {say(FLUORAPATITE * p2o5)} wt% CaO; {say(cao)} was reported."
        more = {
            "lime_left_fluorapatite": dig(residual_lime(cao, p2o5), 3),
            "lime_left_francolite": dig(residual_lime(cao, p2o5, FRANCOLITE), 3),
            "alternatives": ["P or Ca slip", "P2O5 stored as P or Ca as CaO", "aluminium or iron phosphate"],
            "discriminating_test": "apatite by diffraction",
        }
        return Finding(row, "CAO", REJECT, text, names, dig(cao, 3), dig(num(made, row, "limit"), 3), more=more)

    applies = (reported(rows, "P2O5") | reported(rows, "P")) & enough
    applies &= ~says(rows, r"wavellite|vivianite|strengite|variscite|(?:aluminium|iron) phosphate")
    return answer(rows, tell, applies=applies, known=~np.isnan(lime + phosphorus), fires=fires)


APATITE = Rule(
    id="apatite_ca_floor",
    family="composition",
    title="Phosphorus has its calcium",
    tests="Rock with phosphorus must have the calcium of fluorapatite at least.",
    check=check_apatite,
    inputs=("P2O5", "CAO"),
    flags="CAO",
    formula="CaO < 1.317 P2O5 - 2u where P2O5 >= 1 wt%, u = 3 % of each; 1.317 = 55.60/42.22, francolite 1.570",
    message="Less calcium than the phosphorus needs as apatite",
    source="webmineral, Apatite-(CaF): CaO 55.60, P2O5 42.22; francolite from memory of McClellan",
    must_not_fire="On aluminium or iron phosphates (said in the remark), and below 1 wt% P2O5.",
    example="P2O5 2.5, CaO 2.9: floor 3.29, less 2u = 0.26 is 3.03 > 2.9, fires. P2O5 12, CaO 30 leaves 14.20.",
)


def check_sulfur(
    table: Table, *, excess: float, uncertainty: float, uncertainty_relative: float, toc_min: float,
    euxinic_below: float, freshwater_above: float,
) -> Answer:  # fmt: skip
    """Checks a row with sulfur: pyrite by diffraction fits, iron suffices for pyrite, carbon to sulfur as a label."""
    answers = []
    for method in ("elements", "minerals"):
        rows = table.panel(method, *SULFUR)
        if rows.empty:
            continue
        sulfur = first(exact(rows, "TS"), wt(rows, "S"), exact(rows, "SO3") / OXIDE_FACTOR["S"][1])
        iron = first(exact(rows, "FE2O3") / OXIDE_FACTOR["FE"][1], wt(rows, "FE"))
        sulfate = (
            SULFUR_PER_BARIUM * np.nan_to_num(wt(rows, "BA")) + SULFUR_IN_ANHYDRITE * np.nan_to_num(exact(rows, "ANHYDRITE"))
            + SULFUR_IN_GYPSUM * np.nan_to_num(exact(rows, "GYPSUM"))
        )  # fmt: skip
        made = column(
            rows, s=sulfur, fe=iron, need=IRON_PER_PYRITE_SULFUR * (sulfur - sulfate), pyrite=SULFUR_IN_PYRITE * exact(rows, "PYRITE"),
            most=sulfur + 2 * np.maximum(uncertainty, uncertainty_relative * sulfur), ratio=exact(rows, "TOC") / np.where(sulfur > 0, sulfur, np.nan),
        )  # fmt: skip
        if method == "minerals":
            answers.append(_pyrite(rows, made))
            continue
        answers.append(_iron(rows, made, excess))
        answers.append(_ratio(rows, made, toc_min, euxinic_below, freshwater_above))
    return merge(answers)


def _given(rows: pd.DataFrame, row: int) -> tuple[str, ...]:
    return tuple(name for name in SULFUR if num(rows, row, f"{name}_id") >= 0)


def _pyrite(rows: pd.DataFrame, made: pd.DataFrame) -> Answer:
    def tell(row: int) -> Finding:
        held, most = num(made, row, "pyrite"), num(made, row, "most")
        text = f"Pyrite by diffraction holds {say(held)} wt% sulfur, the rock {say(num(made, row, 's'))} wt% in all."
        more = {
            "alternatives": ["pyrite overstated by diffraction", "sulfur slip or unit", "different splits"],
            "discriminating_test": "total sulfur on the split of the diffraction",
        }
        return Finding(row, "PYRITE", REJECT, text, _given(rows, row), dig(held), dig(most), more=more)

    known = ~np.isnan(made["pyrite"] + made["most"])
    return answer(rows, tell, applies=reported(rows, "PYRITE"), known=known, fires=made["pyrite"] > made["most"])


def _iron(rows: pd.DataFrame, made: pd.DataFrame, excess: float) -> Answer:
    def tell(row: int) -> Finding:
        need, iron = num(made, row, "need"), num(made, row, "fe")
        text = f"The sulfur needs {say(need)} wt% iron as pyrite, the rock has {say(iron)}: organic sulfur, sulfate, or a unit slip."
        more = {
            "carbon_to_sulfur": num(made, row, "ratio"),
            "alternatives": [
                "organic sulfur",
                "sulfate",
                "unit slip in sulfur or iron",
                "drilling barite or anhydrite",
            ],
            "discriminating_test": "sulfur forms: pyritic, sulfate, organic",
        }
        return Finding(
            row,
            "TS" if num(rows, row, "TS_id") >= 0 else "S",
            WARN,
            text,
            _given(rows, row),
            dig(need),
            dig(excess * iron),
            more=more,
        )

    stated = says(rows, r"organic s(?:ulfur)?\b|sulfate|gypsum|anhydrite")
    applies = (reported(rows, "TS") | reported(rows, "S") | reported(rows, "SO3")) & ~stated
    return answer(
        rows,
        tell,
        applies=applies,
        known=~np.isnan(made["need"] + made["fe"]),
        fires=made["need"] > excess * made["fe"],
    )


def _ratio(rows: pd.DataFrame, made: pd.DataFrame, toc_min: float, low: float, high: float) -> Answer:
    def tell(row: int) -> Finding:
        ratio = num(made, row, "ratio")
        text = (
            f"C/S is {say(ratio)}: {'as in euxinic' if ratio < low else 'as in freshwater'} sediment (label, no fault)."
        )
        return Finding(row, "TOC", INFO, text, _given(rows, row), dig(ratio, 3), [low, high])

    with np.errstate(invalid="ignore"):
        applies = exact(rows, "TOC") >= toc_min
        fires = (made["ratio"] < low) | (made["ratio"] > high)
    return answer(
        rows,
        tell,
        applies=applies & (reported(rows, "TS") | reported(rows, "S")),
        known=~made["ratio"].isna(),
        fires=fires,
    )


PYRITE = Rule(
    id="sulfur_iron_pyrite",
    family="composition",
    title="Sulfur has its iron",
    tests="Sulfur that is not barite, anhydrite or gypsum is set against iron as pyrite, and pyrite by diffraction against total sulfur.",
    check=check_sulfur,
    inputs=SULFUR,
    flags="TS",
    formula=(
        "pyrite 0.5345 > S + 2u is a candidate for rejection; 0.871 (S - S_barite - S_anhydrite) > 1.05 Fe warns; "
        "C/S < 1.5 or > 10 is a label"
    ),
    message="Sulfur, iron and pyrite do not fit together",
    source="stoichiometry of pyrite; C/S from memory of Berner & Raiswell 1983 (normal marine 2.8 +- 0.8)",
    must_not_fire="Where organic sulfur or sulfate is stated in the remark.",
    example="S 1.80 with 0.082 in barite needs 1.496 wt% Fe; Fe2O3 1.90 is 1.329, fires. TOC 2.15, S 0.90: C/S 2.39, normal.",
)
RULES = (APATITE, PYRITE)
