"""PI up and Tmax down against the neighbours: the classic stain."""

import numpy as np
import pandas as pd

from qc.rules.facts import made_or_reported, not_rock, production_index
from qc.rules.robust import MEAN_DEVIATION, NORMAL
from qc.rules.rule import WARN, Answer, Finding, Rule, fired, judge, say
from qc.rules.spans import Floats, exact, line
from qc.rules.table import Table

WINDOW = 10  # neighbours looked at: five above and five below, fewer where the unit is small


def check(table: Table, *, neighbours_min: int, scores: float, tmax_scale_min: float, pi_scale_min: float) -> Answer:
    """One check a row: both PI and Tmax depart from the running median of the neighbours in the unit."""
    rows = table.of("pyrolysis")
    facts = pd.DataFrame({"pi": production_index(rows), "tmax": exact(rows, "TMAX")}, index=rows.index)
    for name in ("pi_median", "pi_scale", "tmax_median", "tmax_scale"):
        facts[name] = np.nan
    facts["neighbours"] = 0.0
    for _, members in _units(rows, facts):
        _against_neighbours(facts, members, neighbours_min)
    pi_scale = facts["pi_scale"].clip(lower=pi_scale_min)
    tmax_scale = facts["tmax_scale"].clip(lower=tmax_scale_min)
    fires = (facts["pi"] > facts["pi_median"] + scores * pi_scale) & (
        facts["tmax"] < facts["tmax_median"] - scores * tmax_scale
    )
    known = facts[["pi", "tmax"]].notna().all(axis=1)
    enough = facts["neighbours"] >= neighbours_min
    outcome = judge(rows.index, applies=~not_rock(rows) & (enough | ~known), known=known, fires=fires)
    return Answer(outcome, [_finding(rows, line(facts, row), row) for row in fired(outcome)])


def _units(rows: pd.DataFrame, facts: pd.DataFrame) -> list[tuple[object, pd.Index]]:
    """Rows with PI, Tmax and depth of each well and formation, from the top down."""
    usable = rows[facts[["pi", "tmax"]].notna().all(axis=1) & rows["top_m"].notna()]
    ordered = usable.sort_values(["well", "unit", "top_m"], kind="stable")
    return [(key, group.index) for key, group in ordered.groupby(["well", "unit"], sort=True)]


def _against_neighbours(facts: pd.DataFrame, members: pd.Index, neighbours_min: int) -> None:
    """Median and MADN of the nearest neighbours (itself left out) beside each member of one unit."""
    size = len(members)
    if size <= neighbours_min:
        facts.loc[members, "neighbours"] = size - 1
        return
    width = min(WINDOW, size - 1)
    at = np.arange(size)
    start = np.clip(at - width // 2, 0, size - 1 - width)
    around = start[:, None] + np.arange(width + 1)[None, :]
    others = around[around != at[:, None]].reshape(size, width)
    for name in ("pi", "tmax"):
        values = facts.loc[members, name].to_numpy()[others]
        facts.loc[members, f"{name}_median"] = np.median(values, axis=1)
        facts.loc[members, f"{name}_scale"] = _scales(values)
    facts.loc[members, "neighbours"] = width


def _scales(values: Floats) -> Floats:
    """MADN along each line; the mean absolute deviation where it is 0."""
    away = np.abs(values - np.median(values, axis=1, keepdims=True))
    made = NORMAL * np.median(away, axis=1)
    return np.where(made > 0, made, MEAN_DEVIATION * np.mean(away, axis=1))


def _finding(rows: pd.DataFrame, fact: pd.Series, row: int) -> Finding:
    text = (
        f"PI {say(fact['pi'])} stands above its neighbours' {say(fact['pi_median'])} and Tmax {say(fact['tmax'])} °C below "
        f"their {say(fact['tmax_median'])} °C, as free or heavy oil would move both."
    )
    more = {
        "neighbours_used": int(fact["neighbours"]),
        "alternatives": [
            "stain or migrated oil",
            "oil-based fluid or additive",
            "natural bitumen",
            "a thin bed of other kerogen",
        ],
        "discriminating_test": "solvent extraction and re-run: Tmax rises and S2 falls if oil was in it",
    }
    medians = {"PI": round(float(fact["pi_median"]), 4), "TMAX": round(float(fact["tmax_median"]), 2)}
    analyte = made_or_reported(rows, row, "PI", "S1")
    return Finding(
        row, analyte, WARN, text, ("PI", "S1", "S2", "TMAX"),
        {"PI": round(float(fact["pi"]), 4), "TMAX": float(fact["tmax"])}, medians, more=more,
    )  # fmt: skip


RULE = Rule(
    id="pi_low_tmax_pair",
    family="contamination",
    title="PI high and Tmax low together",
    tests="Against its neighbours in the same unit a stained sample shows more S1 and an earlier S2 at once.",
    check=check,
    inputs=("S1", "S2", "PI", "TMAX"),
    flags="PI (S1 where PI is not reported)",
    formula="PI > median + 3 MADN and Tmax < median - 3 MADN of at least 7 neighbours; MADN(Tmax) at least 2 °C",
    message="PI is up and Tmax down against the neighbours",
    source="our default, no publication; physical basis from memory of Clementz 1979, AAPG Bulletin 63:2227",
    must_not_fire="With fewer than 7 neighbours in the unit.",
    example="Neighbours PI 0.08 ± 0.02, Tmax 441 ± 2; a sample of PI 0.31 and Tmax 424 fires.",
)
