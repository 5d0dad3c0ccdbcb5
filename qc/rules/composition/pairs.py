"""The same rock by two methods: two element tables, and elements against minerals."""

from itertools import combinations

import numpy as np
import pandas as pd

from qc.rules.asking import answer, column, dig, first, nothing, of_sets, wt
from qc.rules.composition.stoichiometry import FLOORS, LIME_IN, OXIDE_FACTOR
from qc.rules.fits import theil_sen
from qc.rules.panels import codes_of
from qc.rules.rule import FIRE, NOT_APPLICABLE, PASS, WARN, Answer, Finding, Rule, merge, say
from qc.rules.spans import exact, num, reported
from qc.rules.table import Table

REFRACTORY = frozenset({"ZR", "HF", "CR", "TI", "ZRO2", "CR2O3", "TIO2"})


def check_pairs(table: Table, *, slope_low: float, slope_high: float, pairs_min: float) -> Answer:
    """One check an element and pair of source tables that share samples."""
    codes = codes_of("elements")
    held = table.panels.get("elements")
    if held is None or table.rows.loc[held.index, "sample"].is_unique:
        return nothing()
    rows = table.panel("elements", *codes)
    entries = []
    for one, other in combinations(sorted(set(rows["table"]), key=lambda number: _order(rows, number)), 2):
        left, right = rows[rows["table"] == one], rows[rows["table"] == other]
        for code in codes:
            entries += _pair(left, right, code, slopes=(slope_low, slope_high), pairs_min=pairs_min)
    return of_sets(entries)


def _order(rows: pd.DataFrame, number: int) -> tuple[bool, int]:
    """Fluorescence first: it needs no digestion."""
    of = rows[rows["table"] == number].iloc[0]
    return "xrf" not in f"{of['file']} {of['sheet']}".casefold(), number


def _pair(left: pd.DataFrame, right: pd.DataFrame, code: str, *, slopes: tuple[float, float], pairs_min: float) -> list:
    x, y = (
        pd.Series(exact(rows, code), index=rows["sample"]).dropna().groupby(level=0).first() for rows in (left, right)
    )
    shared = x.index.intersection(y.index)
    if not len(shared):
        return []
    rows = tuple(int(row) for row in right.index[right["sample"].isin(shared)])
    if len(shared) < pairs_min:
        return [(rows[0], NOT_APPLICABLE, None)]
    low, high = slopes
    slope = theil_sen(np.asarray(x[shared], dtype=np.float64), np.asarray(y[shared], dtype=np.float64)).slope
    if np.isnan(slope) or low <= slope <= high:
        return [(rows[0], NOT_APPLICABLE if np.isnan(slope) else PASS, None)]
    text = f"{code} of the second table is {say(slope)} times that of the first over {len(shared)} shared samples."
    if code in REFRACTORY and slope < low:
        text += " The element sits in resistant minerals: incomplete digestion."
    more = {
        "tables": [f"{rows_['file'].iloc[0]} {rows_['sheet'].iloc[0]}" for rows_ in (left, right)],
        "alternatives": ["calibration", "incomplete digestion", "unit or oxide"],
        "discriminating_test": "a certified material by both methods",
    }
    return [(rows[0], FIRE, Finding(None, code, WARN, text, (code,), dig(slope), [low, high], rows=rows, more=more))]


PAIRS = Rule(
    id="method_pair_bias",
    family="composition",
    title="Two methods agree",
    tests="Where the same samples were measured for an element in two tables, the robust slope between them is near 1.",
    check=check_pairs,
    inputs=("ZR", "TI", "CR"),
    flags="ZR",
    formula="Theil-Sen slope outside 0.9-1.1 over 10 or more shared samples",
    message="Two methods disagree on an element",
    source="our default, no publication",
    must_not_fire="On fewer than ten shared samples.",
    example="Zr by digestion is 0.62 times Zr by fluorescence: fires, incomplete digestion.",
)


def check_minerals(table: Table, *, difference: float, difference_relative: float) -> Answer:
    """One check an oxide of a mineral row whose sample has it: what the minerals hold is what was measured."""
    oxides = ("CAO", *FLOORS)
    metals = {oxide: metal for metal, (oxide, _) in OXIDE_FACTOR.items() if oxide in oxides}
    minerals = (*LIME_IN, *{name for parts in FLOORS.values() for name in parts})
    rows = table.panel("minerals", *minerals, *oxides, *metals.values())
    if rows.empty:
        return nothing()
    answers = []
    for oxide in oxides:
        parts = LIME_IN if oxide == "CAO" else FLOORS[oxide]
        predicted = np.sum([share * np.nan_to_num(exact(rows, name)) for name, share in parts.items()], axis=0)
        measured = first(exact(rows, oxide), OXIDE_FACTOR[metals[oxide]][1] * wt(rows, metals[oxide]))
        limit = np.maximum(difference, difference_relative * measured)
        made = column(rows, predicted=predicted, measured=measured, limit=limit)
        answers.append(_reconcile(rows, made, oxide, metals[oxide], tuple(parts)))
    return merge(answers)


def _reconcile(rows: pd.DataFrame, made: pd.DataFrame, oxide: str, metal: str, parts: tuple[str, ...]) -> Answer:
    away = made["predicted"] - made["measured"]
    fires = (away.abs() if oxide == "CAO" else away) > made["limit"]  # clay adds to the others: a floor only
    needed = ("CALCITE", "DOLOMITE") if oxide == "CAO" else parts[:1]
    known = np.all([~np.isnan(exact(rows, name)) for name in needed], axis=0) & ~made["measured"].isna().to_numpy()

    def tell(row: int) -> Finding:
        text = f"The minerals hold {say(num(made, row, 'predicted'))} wt% {oxide}, {say(num(made, row, 'measured'))} was measured."
        more = {
            "alternatives": ["mineral over- or understated", "different splits", "element slip"],
            "discriminating_test": "both methods on one split",
        }
        computed, limit = num(made, row, "predicted") - num(made, row, "measured"), num(made, row, "limit")
        return Finding(row, parts[0], WARN, text, (*parts, oxide, metal), dig(computed, 3), dig(limit, 3), more=more)

    applies = (reported(rows, oxide) | reported(rows, metal)) & np.any(
        [reported(rows, name) for name in needed], axis=0
    )
    return answer(rows, tell, applies=applies, known=known, fires=fires.to_numpy() & known)


MINERALS = Rule(
    id="xrd_xrf_reconcile",
    family="composition",
    title="Minerals make the elements",
    tests="Lime that follows from the minerals must be the lime measured; silica, magnesia and potash must cover their minerals.",
    check=check_minerals,
    inputs=("CALCITE", "DOLOMITE", "CAO", "SIO2", "MGO", "K2O"),
    flags="CALCITE",
    formula=(
        "CaO = 0.5603 calcite + 0.3041 dolomite + 0.556 apatite + 0.4119 anhydrite + 0.3257 gypsum; fires when predicted and "
        "measured differ by more than max(1.5 wt%, 15 %); SiO2, MgO, K2O only when predicted is more"
    ),
    message="Minerals and elements of one sample do not fit",
    source="calcite CaO 56.03: SSHADE; apatite: webmineral; others by formula; limits: our default, no publication",
    must_not_fire="Without calcite, dolomite and lime of the same sample.",
    example="Calcite 30, dolomite 10 predict 19.85: measured 20.4 passes, 14.2 fires.",
)
RULES = (PAIRS, MINERALS)
