"""Barite and potassium chloride of the drilling fluid in cuttings."""

import numpy as np
import pandas as pd

from qc.rules.mud import inside
from qc.rules.neighbours import around
from qc.rules.rule import INFO, WARN, Answer, Finding, Rule, fired, judge, merge, say
from qc.rules.spans import Bools, Floats, exact, num, reported
from qc.rules.table import Table

BARITE_PER_BARIUM = 1.6995
SULFUR_PER_BARIUM = 0.2335
BARIUM_OF_OXIDE = 0.8957  # Ba/BaO
POTASSIUM_OF_OXIDE = 0.8301  # 2K/K2O
PPM = 10_000  # ug/g per wt%
CUTTINGS = frozenset({"cuttings", "composite"})


def check(
    table: Table, *, barium_max: float, barite_warn: float, scores: float, factor: float, neighbours_min: int
) -> Answer:
    """For each elements row of cuttings: barium; and potassium against the neighbours where the fluid holds KCl."""
    rows = table.panel("elements", "BA", "BAO", "K", "K2O")
    if rows.empty:
        return Answer(pd.Series([], dtype=object))
    cuttings = rows["kind"].isin(CUTTINGS).to_numpy()
    return merge([
        _barium(table, rows, cuttings, barium_max, barite_warn=barite_warn),
        _potassium(table, rows, cuttings, (scores, factor), neighbours_min),
    ])  # fmt: skip


def as_element(rows: pd.DataFrame, element: str, oxide: str, share: float) -> Floats:
    """The element [ug/g], as such or from its oxide [wt%]."""
    own = exact(rows, element)
    return np.where(np.isnan(own), PPM * share * exact(rows, oxide), own)


def _barium(table: Table, rows: pd.DataFrame, cuttings: Bools, limit: float, *, barite_warn: float) -> Answer:
    barium = as_element(rows, "BA", "BAO", BARIUM_OF_OXIDE)
    with np.errstate(invalid="ignore"):
        fires = barium > limit
    applies = cuttings & (reported(rows, "BA") | reported(rows, "BAO"))
    outcome = judge(rows.index, applies=applies, known=~np.isnan(barium), fires=fires)
    own = pd.Series(barium, index=rows.index)
    cores = own[rows["kind"].isin({"core", "plug", "sidewall"}).to_numpy() & fires]
    baritic = set(zip(rows.loc[cores.index, "well"], rows.loc[cores.index, "unit"], strict=True))
    return Answer(
        outcome,
        [
            _barite(rows, row, float(own[row]), (limit, barite_warn), in_core=(rows.at[row, "well"], rows.at[row, "unit"]) in baritic)
            for row in fired(outcome)
        ],
    )  # fmt: skip


def _barite(rows: pd.DataFrame, row: int, barium: float, limit: tuple[float, float], *, in_core: bool) -> Finding:
    percent = barium / PPM
    barite, sulfur = BARITE_PER_BARIUM * percent, SULFUR_PER_BARIUM * percent
    much = barite > limit[1] and not in_core
    text = f"Barium {say(barium)} ug/g is as much as {barite:.3g} wt% of barite, with {sulfur:.3g} wt% of sulfur" + (
        ": it dilutes TOC and adds to sulfur." if much else "."
    )
    if in_core:
        text += " Core of the same unit is baritic too."
    more = {
        "barite_wt_percent": round(barite, 4), "sulfur_of_barite_wt_percent": round(sulfur, 4),
        "toc_factor": round(1 / (1 - min(barite, 99.0) / 100), 4),
        "alternatives": ["barite of the drilling fluid", "hydrothermal or biogenic barite in the rock (check core)"],
        "discriminating_test": "barium of core or of hand-picked cuttings of the unit",
    }  # fmt: skip
    analyte = "BA" if num(rows, row, "BA_id") >= 0 else "BAO"
    return Finding(row, analyte, WARN if much else INFO, text, (analyte,), round(barium, 2), limit[0], more=more)


def _potassium(
    table: Table, rows: pd.DataFrame, cuttings: Bools, limit: tuple[float, float], neighbours_min: int
) -> Answer:
    potassium = as_element(rows, "K", "K2O", POTASSIUM_OF_OXIDE)
    salty = np.zeros(len(rows), dtype=bool)
    for mud in table.muds[
        table.muds["additives"].astype(str).str.contains(r"\bkcl\b|potassium chloride", case=False)
    ].itertuples():
        salty |= inside(rows, mud.well, mud.top_m, mud.base_m)  # type: ignore[arg-type]
    near = around(rows, np.where(cuttings, potassium, np.nan), neighbours_min)
    median = near["median"].to_numpy()
    with np.errstate(invalid="ignore"):
        fires = (potassium > median + limit[0] * near["scale"].to_numpy()) & (potassium > limit[1] * median)
    applies = cuttings & salty & (reported(rows, "K") | reported(rows, "K2O")) & ~np.isnan(median)
    outcome = judge(rows.index, applies=applies, known=~np.isnan(potassium), fires=fires)
    facts = near.assign(potassium=potassium)
    return Answer(outcome, [_salt(rows, facts, row) for row in fired(outcome)])


def _salt(rows: pd.DataFrame, facts: pd.DataFrame, row: int) -> Finding:
    potassium, median = num(facts, row, "potassium"), num(facts, row, "median")
    text = (
        f"Potassium {say(potassium / PPM)} wt% stands above the neighbours' {say(median / PPM)} wt% in cuttings cut under a "
        "potassium chloride fluid."
    )
    more = {
        "neighbours_used": int(num(facts, row, "count")),
        "alternatives": ["potassium chloride left in the sample", "a bed richer in illite or feldspar"],
        "discriminating_test": "water wash and re-run; chlorine of the sample",
    }
    analyte = "K" if num(rows, row, "K_id") >= 0 else "K2O"
    return Finding(row, analyte, WARN, text, (analyte,), round(potassium, 1), round(median, 1), more=more)


RULE = Rule(
    id="mud_solids_elements",
    family="contamination",
    title="Solids of the drilling fluid in cuttings",
    tests="Barium of cuttings tells how much barite of the fluid they hold; potassium, under a potassium chloride fluid, its salt.",
    check=check,
    inputs=("BA", "BAO", "K", "K2O", "drilling fluid by depth"),
    flags="BA or K (the oxide where that is what was reported)",
    formula="Ba > 2000 ug/g; BaSO4 = 1.6995 Ba, S = 0.2335 Ba; warning above 3 wt% of barite; K > neighbours + 3 MADN under KCl",
    message="Cuttings hold solids of the drilling fluid",
    source="our default, no publication; factors are arithmetic on the formula of barite",
    must_not_fire="On core; above 3 wt% of barite it stays information where core of the unit is baritic too.",
    example="Ba 0.35 wt%: barite 0.595 wt%, sulfur 0.082 wt%, information.",
)
