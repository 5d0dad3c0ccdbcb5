"""Ratios of gas chromatography: pristane to phytane, odd to even n-alkanes."""

import re

import numpy as np
import pandas as pd

from qc.rules.asking import answer, column, dig, nothing
from qc.rules.rule import INFO, WARN, Answer, Finding, Rule, merge, say
from qc.rules.spans import Floats, exact, num, reported
from qc.rules.table import Table

ALKANES = tuple(f"NC{number}" for number in range(21, 35))


def bray_evans(c: dict[int, Floats]) -> Floats:
    """CPI over C24-C34: mean of odd C25-C33 over even C24-C32 and over even C26-C34. Bray & Evans 1961, from memory."""
    odd, low, high = (np.sum([c[n] for n in range(*span)], axis=0) for span in ((25, 34, 2), (24, 33, 2), (26, 35, 2)))
    return np.asarray(0.5 * (odd / low + odd / high))


def marzi(c: dict[int, Floats]) -> Floats:
    """Marzi et al. 1993."""
    return ((c[23] + c[25] + c[27]) + (c[25] + c[27] + c[29])) / (2 * (c[24] + c[26] + c[28]))


def philippi(c: dict[int, Floats]) -> Floats:
    """2 C29 / (C28 + C30)."""
    return 2 * c[29] / (c[28] + c[30])


def odd_even(c: dict[int, Floats], start: int) -> Floats:
    """OEP of five n-alkanes from ``start`` on, Scalan & Smith 1970: exponent (-1)^(start+1)."""
    ratio = (c[start] + 6 * c[start + 2] + c[start + 4]) / (4 * c[start + 1] + 4 * c[start + 3])
    return ratio ** ((-1) ** (start + 1))


FORMULAS = {r"bray": bray_evans, r"marzi": marzi, r"philippi": philippi}


def check_phytane(table: Table, *, reducing_below: float, oxic_above: float, impossible_above: float) -> Answer:
    """One check a pristane/phytane ratio: possible, and not at an end that is read as a setting."""
    rows = table.panel("gc", "PR_PH")
    if rows.empty:
        return nothing()
    value = exact(rows, "PR_PH")
    with np.errstate(invalid="ignore"):
        fault = (value > impossible_above) | (value <= 0)
        fires = fault | (value < reducing_below) | (value > oxic_above)
    made = column(rows, fault=fault)

    def tell(row: int) -> Finding:
        ratio = num(rows, row, "PR_PH")
        if made.at[row, "fault"]:
            more = {
                "alternatives": ["co-elution with n-C17 or n-C18"],
                "discriminating_test": "look at the chromatogram",
            }
            return Finding(
                row,
                "PR_PH",
                WARN,
                f"Pristane/phytane {say(ratio)} is not believable.",
                ("PR_PH",),
                ratio,
                [0.0, impossible_above],
                more=more,
            )
        hint = "reducing or hypersaline" if ratio < reducing_below else "terrigenous or oxic"
        text = f"Pristane/phytane {say(ratio)} hints at a {hint} setting (label, no fault)."
        return Finding(row, "PR_PH", INFO, text, ("PR_PH",), ratio, [reducing_below, oxic_above])

    return answer(rows, tell, applies=reported(rows, "PR_PH"), known=~np.isnan(value), fires=fires)


PHYTANE = Rule(
    id="prph_label",
    family="isotopes_gc",
    title="Pristane to phytane",
    tests="The ratio is believable; its ends are labelled.",
    check=check_phytane,
    inputs=("PR_PH",),
    flags="PR_PH",
    formula="> 10 or 0 warns; < 0.8 or > 3 is a label; 0.8-3 tells nothing",
    message="Pristane/phytane is not believable, or at an end",
    source="from memory of Didyk et al. 1978 and ten Haven et al. 1987",
    must_not_fire="As a fault between 0 and 10: there it is a label.",
    example="11.8 fires.",
)


def check_predominance(
    table: Table, *, tolerance: float, high: float, low: float, tmax_mature: float, carbonate_max: float
) -> Answer:
    """Checks a reported CPI: it follows from the n-alkanes by its named formula, and fits the maturity."""
    rows = table.panel("gc", "CPI", "TMAX", "CARB", *ALKANES)
    if rows.empty:
        return nothing()
    return merge([_recalculated(table, rows, tolerance), _maturity(rows, (low, high), tmax_mature, carbonate_max)])


def _formula(table: Table, rows: pd.DataFrame) -> list[str]:
    """The formula that header or remark of each row names; '' where none does."""
    said = []
    for number, place, remark in zip(rows["table"], rows["CPI_col"], rows["remark"], strict=True):
        text = f"{table.headers.get((int(number), int(place)), '')} {remark}"
        said.append(next((name for name in FORMULAS if re.search(name, text, re.I)), ""))
    return said


def _recalculated(table: Table, rows: pd.DataFrame, tolerance: float) -> Answer:
    named = _formula(table, rows)
    areas = {int(name[2:]): exact(rows, name) for name in ALKANES}
    made = np.full(len(rows), np.nan)
    with np.errstate(invalid="ignore", divide="ignore"):
        for name, formula in FORMULAS.items():
            made = np.where(np.array(named) == name, formula(areas), made)
        away = np.abs(exact(rows, "CPI") - made) - rows["CPI_h"].to_numpy() - tolerance * made
    kept = column(rows, made=made)

    def tell(row: int) -> Finding:
        again = num(kept, row, "made")
        text = f"CPI {say(num(rows, row, 'CPI'))} was reported, {say(again)} follows from the n-alkanes by the named formula."
        more = {"formula": named[rows.index.get_loc(row)], "alternatives": ["other carbon range", "other formula"]}
        return Finding(row, "CPI", WARN, text, ("CPI", *ALKANES), dig(again, 3), tolerance, more=more)

    return answer(rows, tell, applies=reported(rows, "CPI"), known=~np.isnan(away), fires=away > 0)


def _maturity(rows: pd.DataFrame, bounds: tuple[float, float], tmax_mature: float, carbonate_max: float) -> Answer:
    value, tmax = exact(rows, "CPI"), exact(rows, "TMAX")
    with np.errstate(invalid="ignore"):
        limy = np.nan_to_num(exact(rows, "CARB")) > carbonate_max
        high, low = (value > bounds[1]) & (tmax > tmax_mature), (value < bounds[0]) & ~limy

    def tell(row: int) -> Finding:
        reads = num(rows, row, "CPI")
        why = f"with Tmax {say(num(rows, row, 'TMAX'))} degC" if reads > 1 else "is even-dominated"
        more = {"alternatives": ["fresh plant wax or contamination", "carbonate or evaporite source"]}
        return Finding(row, "CPI", WARN, f"CPI {say(reads)} {why}.", ("CPI", "TMAX"), reads, list(bounds), more=more)

    known = ~np.isnan(value) & (~np.isnan(tmax) | (value <= bounds[1]))
    return answer(rows, tell, applies=reported(rows, "CPI"), known=known, fires=high | low)


PREDOMINANCE = Rule(
    id="cpi_oep_recalc",
    family="isotopes_gc",
    title="Odd and even n-alkanes",
    tests="A reported carbon preference index follows from the n-alkanes by its named formula, and fits the maturity.",
    check=check_predominance,
    inputs=("CPI", *ALKANES),
    flags="CPI",
    formula="Bray & Evans over C24-C34, Marzi, or Philippi as named; CPI > 1.5 with Tmax > 440, or < 0.8, warns",
    message="CPI does not follow from the n-alkanes, or not fit the maturity",
    source=(
        "from memory of Bray & Evans 1961 (range C24-C34: petrobaike), Marzi et al. 1993, Philippi; exponent of Scalan & Smith 1970 "
        "read; a 2020 abstract in Org. Geochem.: comparable within one protocol only"
    ),
    must_not_fire="Without the formula's name (cannot be evaluated): pages disagree on the carbon range. Carbonates may be even-dominated.",
    example="The catalogue's n-alkanes give 1.996 (Bray & Evans), 1.723 (Marzi), 2.326 (Philippi), OEP 1.962 and 1.213.",
)
RULES = (PHYTANE, PREDOMINANCE)
