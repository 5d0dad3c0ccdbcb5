"""Drilling additives by their signs against the neighbours; by mixing where the project has analysed them."""

from collections.abc import Mapping
from typing import Any

import numpy as np
import pandas as pd

from qc.rules.additives import MIXED, Material, best_first, materials, mixture, quantities, sign_in_words
from qc.rules.facts import hydrogen_index, not_rock, positive, production_index, valid_tmax
from qc.rules.mud import inside
from qc.rules.neighbours import around
from qc.rules.rule import WARN, Answer, Finding, Rule, fired, judge
from qc.rules.spans import Floats, exact, num, word
from qc.rules.table import Table

ELEMENTS = ("BA", "CL", "CR", "CU", "K", "PB", "S", "TI", "ZN")
OF_PEAKS = {"HI": "S2", "OSI": "S1", "PI": "S1", "OI": "S3"}
MATERIALS_LISTED = 4
OF_S1 = ("OSI", "PI")
Signs = Mapping[str, Mapping[str, np.ndarray]]


def check(
    table: Table, *, signs_min: int, scores: float, factor: float, neighbours_min: int, hydrocarbon_min: float, osi_min: float,
    tmax_away_min: float, relative: float, s2_min: float,
) -> Answer:  # fmt: skip
    """One check for each pyrolysis row with neighbours enough: signs of the best-supported material in two quantities."""
    rows = table.of("pyrolysis")
    rows = rows[~not_rock(rows) & rows["kind"].ne("outcrop")]
    values = _values(table, rows, hydrocarbon_min, s2_min)
    near = {name: around(rows, one, neighbours_min) for name, one in values.items()}
    held = _signs(values, near, {"scores": scores, "factor": factor, "tmax": tmax_away_min, "relative": relative})
    with np.errstate(invalid="ignore"):
        little = ~(values["OSI"] >= osi_min)
    for name in OF_S1:
        held[name]["raised"] &= ~little  # free oil too little to be a fluid's
    counts = np.stack([_count(material, held) for material in materials()]) if len(rows) else np.zeros((1, 0))
    enough = np.stack([one["count"].to_numpy() >= neighbours_min for one in near.values()]).any(axis=0)
    known = (~np.isnan(np.stack([values[name] for name in ("TOC", "S1", "S2")]))).any(axis=0)
    outcome = judge(rows.index, applies=enough | ~known, known=known, fires=counts.max(axis=0) >= signs_min)
    place = {int(row): at for at, row in enumerate(rows.index)}
    findings = [
        _finding(table, rows, row, counts[:, place[row]], held=held, at=place[row], near=near, relative=relative)
        for row in fired(outcome)
    ]
    return Answer(outcome, findings)


def _values(table: Table, rows: pd.DataFrame, hydrocarbon_min: float, s2_min: float) -> dict[str, Floats]:
    """Each quantity that a sign reads, a row; ratios by TOC, so that rich rock is not taken for an additive."""
    toc, s1 = positive(exact(rows, "TOC")), exact(rows, "S1")
    with np.errstate(invalid="ignore"):
        noisy = ~(s1 + exact(rows, "S2") >= hydrocarbon_min)
    made = {
        "TOC": exact(rows, "TOC"), "S1": np.where(noisy, np.nan, s1), "S2": exact(rows, "S2"), "S3": exact(rows, "S3"),
        "HI": np.where(noisy, np.nan, hydrogen_index(rows)), "OI": 100 * exact(rows, "S3") / toc,
        "OSI": np.where(noisy, np.nan, 100 * s1 / toc), "PI": np.where(noisy, np.nan, production_index(rows)),
        "TMAX": valid_tmax(rows, s2_min), "RO": exact(rows, "RO"),
    }  # fmt: skip
    return made | {name: _element(table, rows, name) for name in ELEMENTS}


def _element(table: Table, rows: pd.DataFrame, name: str) -> Floats:
    """An element of the same sample; NaN where none was measured."""
    measured = table.panel("elements", name)
    if measured.empty:
        return np.full(len(rows), np.nan)
    by_sample = pd.Series(exact(measured, name), index=measured["sample"]).dropna()
    found = rows["sample"].map(by_sample[~by_sample.index.duplicated()])
    return np.asarray(found, dtype=np.float64)


def _signs(values: Mapping[str, Floats], near: Mapping[str, pd.DataFrame], limits: Mapping[str, float]) -> Signs:
    """Quantity -> raised, lowered, departs and the value with its neighbours' median."""
    made: dict[str, dict[str, np.ndarray]] = {}
    for name in quantities():
        value, median = values[name], near[name]["median"].to_numpy()
        scale = np.maximum(near[name]["scale"].to_numpy(), limits["relative"] * np.abs(median))
        with np.errstate(invalid="ignore"):
            made[name] = {
                "raised": (value > median + limits["scores"] * scale) & (value > limits["factor"] * median),
                "lowered": (value < median - limits["scores"] * scale) & (value * limits["factor"] < median),
                "departs": np.abs(value - median) > limits["tmax"],
                "value": value, "median": median,
            }  # fmt: skip
    return made


def holds(sign: Mapping[str, Any], held: Signs) -> np.ndarray:
    """Where a sign holds. A range counts only where the neighbours' median lies outside it."""
    of = held[sign["of"]]
    if "from" in sign:
        value, median = of["value"], of["median"]
        with np.errstate(invalid="ignore"):
            outside = (median < sign["from"]) | (median > sign["to"])
            return (value >= sign["from"]) & (value <= sign["to"]) & outside
    return of["raised" if sign.get("raised") else "lowered" if sign.get("lowered") else "departs"]


def _count(material: Material, held: Signs) -> np.ndarray:
    """In how many different quantities a sign of the material holds, a row; 0 where the one it needs does not."""
    of: dict[str, np.ndarray] = {}
    for sign in material.signs:
        of[sign["of"]] = of.get(sign["of"], False) | holds(sign, held)
    total = np.sum(list(of.values()), axis=0)
    return np.where(of[material.needs], total, 0) if material.needs else total


def _recorded(table: Table, rows: pd.DataFrame, row: int) -> str | None:
    """Additives that the mud record names at the sample; None where there is no record."""
    muds = table.muds[table.muds["well"] == num(rows, row, "well")]
    at = rows.loc[[row]]
    said = [
        f"{mud.kind!s} {mud.additives or ''!s}"
        for mud in muds.itertuples()
        if inside(at, mud.well, mud.top_m, mud.base_m).any()  # type: ignore[arg-type]
    ]
    return "; ".join(said) if said else None


def _finding(
    table: Table, rows: pd.DataFrame, row: int, counts: np.ndarray, *, held: Signs, at: int,
    near: Mapping[str, pd.DataFrame], relative: float,
) -> Finding:  # fmt: skip
    record = _recorded(table, rows, row)
    used = [material.recorded(record or "") for material in materials()]
    order = sorted(range(len(counts)), key=lambda one: (-counts[one], not used[one], one))
    best = materials()[order[0]]
    said = [sign_in_words(sign) for sign in best.signs if holds(sign, held)[at]]
    mixtures = [one.record() for one in best_first(_mixtures(table, rows, row, near, relative))]
    note = _about_record(used[order[0]], record)
    text = f"{' and '.join(said)} against the neighbours, as {best.name} would show ({note})."
    if mixtures:
        one = mixtures[0]
        text += f" {one['share_wt_percent']:.2g} wt% of {one['additive']} would explain it best."
    others = [materials()[one].name for one in order[1:] if counts[one] >= 2][:MATERIALS_LISTED]
    more = {
        "signs": said, "material": best.name, "source_of_signs": f"{best.mark}: {best.source or 'from memory'}",
        "other_signs": best.other, "mud_record": record, "mixtures": mixtures,
        "alternatives": [*others, "natural bitumen or migrated oil", "a bed of another lithology or kerogen"],
        "discriminating_test": best.test,
    }  # fmt: skip
    first = next(sign["of"] for sign in best.signs if holds(sign, held)[at])
    analyte = OF_PEAKS.get(first, first)
    inputs = ("TOC", "S1", "S2", "S3", "TMAX", *(one for one in ELEMENTS if not np.isnan(held[one]["value"][at])))
    return Finding(row, analyte, WARN, text, inputs, int(counts[order[0]]), None, more=more)


def _about_record(used: bool, record: str | None) -> str:
    if used:
        return "the mud record names it at this depth"
    return "the mud record does not name it at this depth" if record is not None else "no mud record"


def _mixtures(
    table: Table, rows: pd.DataFrame, row: int, near: Mapping[str, pd.DataFrame], relative: float
) -> list[Any]:
    """How much of each additive that the project has analysed would explain the sample, the neighbours being the rock."""
    additives = table.of("pyrolysis")
    additives = additives[additives["kind"] == "additive"].drop_duplicates("sample")
    own = rows.loc[[row]]
    sample = np.array([exact(own, name)[0] for name in MIXED])
    rock = np.array([near[name].at[row, "median"] for name in MIXED], dtype=float)
    spread = np.array([near[name].at[row, "scale"] for name in MIXED], dtype=float)
    scale = np.hypot(spread, relative * np.abs(rock))
    made = []
    for other in additives.index:
        measured = np.array([exact(additives.loc[[other]], name)[0] for name in MIXED])
        made.append(mixture(word(additives, int(other), "label") or "additive", sample, rock, measured, scale))
    return [one for one in made if one]


RULE = Rule(
    id="additive_signature",
    family="contamination",
    title="Signs of drilling fluids and additives",
    tests=(
        "Signs of the usual additives are looked for against the neighbours in the unit; the best-supported one is named, the mud "
        "record beside it. Where the project has analysed an additive, two-end-member mixing says how much would explain the sample."
    ),
    check=check,
    inputs=("TOC", "S1", "S2", "S3", "TMAX", "RO", "elements", "drilling fluid by depth", "analyses of additives"),
    flags="the value whose sign is strongest",
    formula=(
        "at least 2 quantities out of the neighbours' range as the material would move them (raised: more than 3 MADN and 1.5 times; "
        "a range counts where the neighbours' median lies outside it); sample = (1 - f) rock + f additive over TOC, S1, S2, S3"
    ),
    message="The sample looks as if it held a drilling additive",
    source=(
        "signs from memory, walnut hulls and gilsonite from the USGS programmed pyrolysis method (Dreier & Warden 2021); limits: "
        "our default, no publication"
    ),
    must_not_fire="With fewer than 5 neighbours. A material that the mud record does not name is said to be so.",
    example="TOC 0.5 among limestone: TOC 1.4, OI 330, Tmax 352, fibre pill in the mud record: fires, fibre against losses.",
)
