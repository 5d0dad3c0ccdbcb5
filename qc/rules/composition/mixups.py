"""Element stored as oxide, ppm as per cent: found against the same rock measured otherwise, or against the rest of the column."""

from collections.abc import Iterator
from typing import Any

import numpy as np
import pandas as pd

from qc.rules.asking import PPM, dig, nothing, of_sets
from qc.rules.composition.stoichiometry import OXIDE_FACTOR
from qc.rules.panels import codes_of
from qc.rules.rule import CANNOT_EVALUATE, FIRE, NOT_APPLICABLE, PASS, REJECT, Answer, Finding, Rule, say
from qc.rules.spans import Floats, exact, num
from qc.rules.table import Table

Entry = tuple[int, str, Finding | None]


def check_oxides(table: Table, *, tolerance: float, pairs_min: float) -> Answer:
    """One check a source table and element of which the same samples have both element and oxide."""
    rows = table.panel("elements", *OXIDE_FACTOR, *(oxide for oxide, _ in OXIDE_FACTOR.values()))
    if rows.empty:
        return nothing()
    entries: list[Entry] = []
    for element, (oxide, _) in OXIDE_FACTOR.items():
        metal = _by_sample(rows, element)
        whole = exact(rows, oxide)
        ratio = whole / (metal / PPM)
        known = ~np.isnan(ratio)
        for _, group in rows.index[known].to_series().groupby(rows.loc[known, "table"].to_numpy()):
            entries.append(_oxide(rows, [int(row) for row in group], element, ratio, width=(tolerance, pairs_min)))
    return of_sets(entries)


def _by_sample(rows: pd.DataFrame, element: str) -> Floats:
    """The element of the row, else of another analysis of the sample; NaN where not above zero."""
    own = exact(rows, element)
    own = np.where(own > 0, own, np.nan)
    other = pd.Series(own, index=rows.index).groupby(rows["sample"]).transform("median").to_numpy()
    return np.where(np.isnan(own), other, own)


def _oxide(rows: pd.DataFrame, members: list[int], element: str, ratio: Floats, *, width: tuple[float, float]) -> Entry:
    oxide, factor = OXIDE_FACTOR[element]
    tolerance, pairs_min = width
    if len(members) < pairs_min:
        return members[0], NOT_APPLICABLE, None
    with np.errstate(divide="ignore"):
        decades = float(np.log10(np.median(ratio[rows.index.get_indexer(pd.Index(members))])))
    step = float(np.log10(factor))
    as_metal, as_oxide = abs(decades) <= tolerance, abs(decades - 2 * step) <= tolerance
    if not (as_metal or as_oxide):
        return members[0], PASS, None
    stored = (
        f"{oxide} holds the element {element.title()}" if as_metal else f"{element.title()} holds the oxide {oxide}"
    )
    text = (
        f"{oxide} / {element.title()} is {say(10**decades)} in {len(members)} samples where {say(factor)} follows from the "
        f"formula: it looks as if {stored}."
    )
    more = {
        "factor": factor,
        "alternatives": ["calibration of one of the two methods"],
        "discriminating_test": "ask the laboratory whether the column is element or oxide",
    }
    return members[0], FIRE, Finding(
        None, oxide, REJECT, text, (oxide, element), dig(10**decades), factor, rows=tuple(members), more=more
    )  # fmt: skip


OXIDES = Rule(
    id="element_oxide_mixup",
    family="composition",
    title="Element or oxide",
    tests="Where the same samples have both an element and its oxide, their ratio must be the one of the formula.",
    check=check_oxides,
    inputs=tuple(OXIDE_FACTOR),
    flags="CAO",
    formula="log10 of the median ratio within 0.03 of 0 (element stored as oxide) or of twice the factor (the reverse); n >= 3",
    message="An element is stored as its oxide, or the reverse",
    source="factors from IUPAC atomic masses; width 0.03: our default, no publication",
    must_not_fire="On fewer than three samples with both.",
    example="CaO / Ca of 1.00 instead of 1.399 in a batch fires: Ca was stored as CaO.",
)


def check_units(
    table: Table,
    *,
    tolerance: float,
    neighbours_min: float,
    spread_max: float,
    ti_max: float,
    p2o5_max: float,
    v_max: float,
) -> Answer:
    """One check a value of an element column against the rest of its column, and against what rock can hold."""
    codes = codes_of("elements")
    rows = table.panel("elements", *codes)
    if rows.empty:
        return nothing()
    ceilings = {"TI": ti_max * PPM, "P2O5": p2o5_max, "V": v_max * PPM}
    entries: list[Entry] = []
    for code in codes:
        value = np.where(rows[f"{code}_row"].to_numpy() == rows.index.to_numpy(), exact(rows, code), np.nan)
        for members, numbers in _columns(rows, value):
            entries += _column(
                rows,
                code,
                members,
                numbers,
                width=(tolerance, neighbours_min, spread_max),
                ceiling=ceilings.get(code, np.inf),
            )
    return of_sets(entries)


def _columns(rows: pd.DataFrame, value: Floats) -> Iterator[tuple[Floats, Floats]]:
    """(rows, values) of each source table, of the values that are known and above zero."""
    with np.errstate(invalid="ignore"):
        kept = value > 0
    if not kept.any():
        return
    tables = rows["table"].to_numpy()[kept]
    index, values = rows.index.to_numpy()[kept], value[kept]
    for one in np.unique(tables):
        yield index[tables == one], values[tables == one]


def _column(
    rows: pd.DataFrame,
    code: str,
    members: Floats,
    numbers: Floats,
    *,
    width: tuple[float, float, float],
    ceiling: float,
) -> list[Entry]:
    tolerance, neighbours_min, spread_max = width
    logs = np.log10(numbers)
    made: list[Entry] = []
    enough = len(members) > neighbours_min
    order = np.sort(logs)
    for row, value, log in zip(members, numbers, logs, strict=True):
        if value > ceiling:
            made.append((int(row), FIRE, _finding(rows, code, int(row), value, steps=None, limit=ceiling)))
            continue
        if not enough:
            made.append((int(row), CANNOT_EVALUATE, None))
            continue
        low = order[1] if log == order[0] else order[0]
        high = order[-2] if log == order[-1] else order[-1]
        steps = [] if high - low > spread_max or low <= log <= high else [
            step for step in (-4, -3, 3, 4) if low - tolerance <= log - step <= high + tolerance
        ]  # fmt: skip
        found = _finding(rows, code, int(row), value, steps=steps, limit=(10**low, 10**high)) if steps else None
        made.append((int(row), FIRE if found else PASS, found))
    return made


def _finding(rows: pd.DataFrame, code: str, row: int, value: float, *, steps: list[int] | None, limit: Any) -> Finding:
    if steps is None:
        text = f"{code} {say(value)} is more than rock holds ({say(limit)})."
        return Finding(
            row,
            code,
            REJECT,
            text,
            (code,),
            float(value),
            float(limit),
            more={"alternatives": ["unit slip", "ore-grade sample"]},
        )
    text = (
        f"{code} {say(value)} stands {steps[0]:+d} decades from the rest of its column ({say(limit[0])} to {say(limit[1])}): "
        "another unit (ppm, per cent, g/kg)."
    )
    more = {
        "decades": steps[0], "suggested": dig(value / 10.0 ** steps[0], 6),
        "alternatives": ["ore-grade or barren sample"], "discriminating_test": "ask for the unit of this cell",
    }  # fmt: skip
    return Finding(
        row, code, REJECT, text, (code,), float(num(rows, row, code)), [dig(one, 4) for one in limit], more=more
    )


UNITS = Rule(
    id="ppm_pct_mixup",
    family="composition",
    title="Parts per million or per cent",
    tests="A value three or four decades from all others of its column is in another unit; so is one that rock cannot hold.",
    check=check_units,
    inputs=("TI", "V", "P2O5"),
    flags="V",
    formula="value x 10^3 or 10^4 (or / ) within 0.05 decades of the range of the column; Ti > 5 wt%, P2O5 > 40 wt%, V > 5 wt%",
    message="A value is in another unit than its column",
    source="our default, no publication",
    must_not_fire="On columns that spread over more than 1.5 decades themselves, and on real ore grades.",
    example="V 0.045 where the column reads 380 to 460 is four decades low and fires.",
)
RULES = (OXIDES, UNITS)
