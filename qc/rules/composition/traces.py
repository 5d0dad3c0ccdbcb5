"""Enrichment of redox-sensitive metals, and what a grinding tool leaves behind."""

from typing import Any

import numpy as np

from qc.rules.asking import answer, column, dig, first, nothing, wt
from qc.rules.composition.stoichiometry import OXIDE_FACTOR
from qc.rules.rule import INFO, WARN, Answer, Finding, Rule, say
from qc.rules.spans import exact, num, reported
from qc.rules.table import Table

METALS = ("MO", "U", "V", "NI", "CO", "CR", "TH", "W")


def modern_setting(v: float, mo: float, u: float) -> str:
    """Setting by metals per aluminium [ug/g per % Al]; '' where the limbs disagree.

    Bennett & Canfield 2020, abstract (authors from memory).
    """
    if v > 46 and u > 5 and mo > 5:
        return "perennial oxygen-minimum-zone core"
    if 23 <= v <= 46 and mo > 5:
        return "euxinic"
    if v < 23 and mo < 5 and u > 1:
        return "beneath an oxygen-minimum zone"
    return ""


def check(
    table: Table, *, uranium_max: float, tungsten_max: float, cobalt_max: float, molybdenum_ef: float, crustal_ef: float,
    chromium_ef: float, upper_crust_al: float, upper_crust_v: float, upper_crust_mo: float, upper_crust_u: float,
    upper_crust_cr: float,
) -> Answer:  # fmt: skip
    """One check a row with aluminium and at least one metal: tool contamination, metals that rock does not have."""
    rows = table.panel("elements", "AL", "AL2O3", *METALS)
    if rows.empty:
        return nothing()
    aluminium = first(wt(rows, "AL"), exact(rows, "AL2O3") / OXIDE_FACTOR["AL"][1])
    aluminium = np.where(aluminium > 0, aluminium, np.nan)
    value = {metal: exact(rows, metal) for metal in METALS}
    crust = {"V": upper_crust_v, "MO": upper_crust_mo, "U": upper_crust_u, "CR": upper_crust_cr}
    ef = {metal: value[metal] / aluminium * upper_crust_al / crust[metal] for metal in crust}
    with np.errstate(invalid="ignore"):
        carbide = (value["W"] > tungsten_max) & (value["CO"] > cobalt_max)
        alone = (ef["MO"] > molybdenum_ef) & (ef["U"] < crustal_ef) & (ef["V"] < crustal_ef)
        steel = (ef["CR"] > chromium_ef) & (ef["V"] < crustal_ef)
        hot = value["U"] > uranium_max
    made = column(rows, al=aluminium, carbide=carbide, alone=alone, steel=steel, hot=hot)

    def tell(row: int) -> Finding:
        at: Any = rows.index.get_loc(row)
        reasons = {
            "carbide": f"W {say(value['W'][at])} and Co {say(value['CO'][at])} ug/g point to a tungsten carbide mill",
            "alone": f"Mo is enriched {say(ef['MO'][at])} times while U and V are as in the crust (Mo from a grinding tool?)",
            "steel": f"Cr is enriched {say(ef['CR'][at])} times while V is as in the crust (steel of a mill?)",
            "hot": f"U {say(value['U'][at])} ug/g is more than rock has",
        }
        met = [name for name in reasons if made.at[row, name]]
        per_al = {metal: value[metal][at] / aluminium[at] for metal in ("V", "MO", "U")}
        given = tuple(name for name in ("AL", "AL2O3", *METALS) if num(rows, row, f"{name}_id") >= 0)
        more = {
            "reference": "upper continental crust", "enrichment": {metal: dig(ef[metal][at], 2) for metal in ef if ef[metal][at] == ef[metal][at]},
            "per_aluminium": {metal: dig(per_al[metal], 2) for metal in per_al if per_al[metal] == per_al[metal]},
            "setting": modern_setting(per_al["V"], per_al["MO"], per_al["U"]),
            "alternatives": ["metal-rich black shale", "ore"], "discriminating_test": "grind again in agate and repeat",
        }  # fmt: skip
        analyte = {"carbide": "W", "alone": "MO", "steel": "CR", "hot": "U"}[met[0]]
        return Finding(
            row,
            analyte,
            WARN if made.at[row, "carbide"] else INFO,
            "; ".join(reasons[name] for name in met) + ".",
            given,
            more=more,
        )

    applies = np.any([reported(rows, metal) for metal in METALS], axis=0)
    return answer(rows, tell, applies=applies, known=~np.isnan(aluminium), fires=carbide | alone | steel | hot)


RULE = Rule(
    id="redox_enrichment_sanity",
    family="composition",
    title="Metals of the rock or of the mill",
    tests="Mo, W and Co without U and V point to a grinding tool; the enrichment against the crust is shown.",
    check=check,
    inputs=("AL", "AL2O3", *METALS),
    flags="MO",
    formula="EF = (X/Al) / (X/Al) of the upper crust; W > 100 with Co > 100 ug/g warns; Mo EF > 10 with U and V EF < 2, U > 1000 inform",
    message="Metals that a grinding tool may have left",
    source=(
        "crustal values from memory of compilations of the upper continental crust; settings: Bennett & Canfield 2020, "
        "abstract, authors from memory; limits: our default, no publication"
    ),
    must_not_fire="Without aluminium of the same sample (cannot be evaluated). The setting is a label, never a fault.",
    example="Al2O3 12.3, V 450, Mo 60, U 18: 69.1, 9.2, 2.8 per % Al, no label. With Co 400 and W 900: tool contamination.",
)
RULES = (RULE,)
