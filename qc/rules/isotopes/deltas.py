"""Isotope values: possible, with a declared scale, on the right scale, and the whole the sum of its fractions."""

import re
from typing import Any

import numpy as np
import pandas as pd

from qc.rules.asking import answer, column, dig, nothing, of_sets
from qc.rules.rule import FIRE, INFO, NOT_APPLICABLE, PASS, REJECT, WARN, Answer, Finding, Rule, merge, say
from qc.rules.spans import exact, num, reported
from qc.rules.table import Table

ORGANIC = ("D13C_ORG", "D13C_OIL", "D13C_SAT", "D13C_ARO", "D13C_RESIN", "D13C_ASPH")
LIMITS = dict.fromkeys(ORGANIC, "organic") | {
    "D13C_CARB": "carbonate", "D13C_C1": "methane", "D13C_CO2": "co2", "D34S": "sulfur",
}  # fmt: skip
FRACTIONS = {"D13C_SAT": "F_SAT", "D13C_ARO": "F_ARO", "D13C_RESIN": "F_RESIN", "D13C_ASPH": "F_ASPH"}
CARBON = (*ORGANIC, "D13C_CARB", "D13C_C1", "D13C_C2", "D13C_C3", "D13C_NC4", "D13C_CO2")
SCALES = re.compile(r"v[- ]?pdb(?:[- ]?lsvec)?|\bpdb\b|v[- ]?smow|v[- ]?cdt|\bcdt\b", re.I)


def check_range(table: Table, *, reject_slack: float, **limits: float) -> Answer:
    """One check a delta value: inside what its material can have, and inside what it usually has."""
    rows = table.panel("isotopes", *LIMITS)
    if rows.empty:
        return nothing()
    return merge(
        [_range(rows, name, kind, limits, reject_slack) for name, kind in LIMITS.items() if reported(rows, name).any()]
    )


def _range(rows: pd.DataFrame, name: str, kind: str, limits: dict[str, float], slack: float) -> Answer:
    value = exact(rows, name)
    hard = [limits[f"{kind}_hard_low"] - slack, limits[f"{kind}_hard_high"] + slack]
    usual = [limits.get(f"{kind}_low", hard[0]), limits.get(f"{kind}_high", hard[1])]
    with np.errstate(invalid="ignore"):
        beyond = (value < hard[0]) | (value > hard[1])
        fires = beyond | (value < usual[0]) | (value > usual[1])
    made = column(rows, beyond=beyond)

    def tell(row: int) -> Finding:
        reads, far = num(rows, row, name), bool(made.at[row, "beyond"])
        bounds = hard if far else usual
        text = f"{name} {say(reads)} permil is outside {bounds[0]:g} to {bounds[1]:g} of {kind} matter."
        if far and hard[0] <= -reads <= hard[1]:
            text += " Was the sign lost?"
        more = {
            "alternatives": ["sign lost", "other scale", "other material"],
            "discriminating_test": "ask for the raw value and scale",
        }
        return Finding(row, name, REJECT if far else WARN, text, (name,), reads, bounds, more=more)

    own = rows[f"{name}_row"].to_numpy() == rows.index.to_numpy()
    return answer(rows, tell, applies=reported(rows, name) & own, known=~np.isnan(value), fires=fires)


RANGE = Rule(
    id="d13c_range",
    family="isotopes_gc",
    title="Isotope values are possible",
    tests="Each delta value lies within what its material can have, and usually has.",
    check=check_range,
    inputs=tuple(LIMITS),
    flags="D13C_ORG",
    formula="organic -45 to -15 (usual -35 to -20), carbonate +-15 (usual +-6), methane -120 to -10, CO2 -70 to +30, d34S -50 to +60",
    message="An isotope value is not possible, or not usual",
    source="from memory of general compilations",
    must_not_fire="On a value whose scale is not the usual one; a lost sign is asked for, not assumed.",
    example="Kerogen +28.4 is a candidate for rejection (sign).",
)


def check_scale(table: Table) -> Answer:
    """One check a source table and isotope analyte: header, unit or remark names the scale."""
    names = (*CARBON, "D18O_CARB", "D34S")
    rows = table.panel("isotopes", *names)
    if rows.empty:
        return nothing()
    entries: list[Any] = []
    number: Any
    for number, group in rows.groupby("table", sort=True):
        said = " ".join({str(remark) for remark in group["remark"]})
        for name in names:
            held = group[group[f"{name}_id"] >= 0]
            if held.empty:
                continue
            header = table.headers.get((int(number), int(held[f"{name}_col"].iloc[0])), "")
            first = int(held.index[0])
            named = bool(SCALES.search(header) or SCALES.search(said))
            entries.append((first, PASS, None) if named else (first, FIRE, _undeclared(held, name, header)))
    return of_sets(entries)


def _undeclared(rows: pd.DataFrame, name: str, header: str) -> Finding:
    text = f"No scale is named for {name} (header «{header}»): VPDB and VPDB-LSVEC differ by up to 0.3 permil near -45."
    more = {"discriminating_test": "ask for the scale and the reference materials used"}
    return Finding(None, name, WARN, text, (name,), header, None, rows=tuple(int(row) for row in rows.index), more=more)


SCALE = Rule(
    id="isotope_scale_declared",
    family="isotopes_gc",
    title="The isotope scale is named",
    tests="The header, unit or remark of an isotope column names its scale.",
    check=check_scale,
    inputs=("D13C_ORG", "D13C_CARB", "D18O_CARB", "D34S"),
    flags="D13C_ORG",
    formula="none of VPDB, VPDB-LSVEC, VSMOW, VCDT in header, unit or remark",
    message="No scale is named for isotope values",
    source="IAEA NBS 22 page; outcome of the 2024 IAEA experts' meeting (PMC12022467): two carbon scales are in force",
    must_not_fire="Where the scale stands in header, unit or remark. Unlike scales of two laboratories are no fault.",
    example="A column headed d13C (permil) fires; d13C VPDB passes.",
)


def check_balance(table: Table, *, tolerance: float, sum_tolerance: float) -> Answer:
    """Checks a sample with the carbon isotopes of its fractions: their weighted mean is the whole; their order is usual."""
    rows = table.panel("isotopes", "D13C_OIL", *FRACTIONS, *FRACTIONS.values())
    if rows.empty:
        return nothing()
    deltas = np.column_stack([exact(rows, name) for name in FRACTIONS])
    shares = np.column_stack([exact(rows, name) for name in FRACTIONS.values()]) / 100
    made_whole = np.nansum(deltas * shares, axis=1)
    closed = np.abs(np.nansum(shares, axis=1) - 1) <= sum_tolerance
    complete = closed & ~(np.isnan(deltas) & (np.nan_to_num(shares) > 0)).any(axis=1)
    away = exact(rows, "D13C_OIL") - made_whole
    made = column(rows, balance=made_whole, away=away)
    applies = (
        reported(rows, "D13C_OIL")
        & np.any([reported(rows, name) for name in FRACTIONS], axis=0)
        & ~np.isnan(shares).all(axis=1)
    )

    def tell(row: int) -> Finding:
        text = f"Fractions make {say(num(made, row, 'balance'))} permil, the whole reads {say(num(rows, row, 'D13C_OIL'))}."
        more = {
            "alternatives": ["light ends lost", "fraction swapped"],
            "discriminating_test": "repeat whole and fractions in one run",
        }
        return Finding(
            row,
            "D13C_OIL",
            WARN,
            text,
            ("D13C_OIL", *FRACTIONS, *FRACTIONS.values()),
            dig(num(made, row, "away"), 3),
            tolerance,
            more=more,
        )

    with np.errstate(invalid="ignore"):
        whole = answer(
            rows, tell, applies=applies, known=complete & ~np.isnan(away), fires=complete & (np.abs(away) > tolerance)
        )
    return merge([whole, _order(rows)])


def _order(rows: pd.DataFrame) -> Answer:
    saturated, aromatic, resin = (exact(rows, name) for name in ("D13C_SAT", "D13C_ARO", "D13C_RESIN"))
    with np.errstate(invalid="ignore"):
        fires = (saturated > aromatic) | (aromatic > resin)

    def tell(row: int) -> Finding:
        text = "The fractions are not in the usual order: saturated lighter than aromatic lighter than resin."
        return Finding(row, "D13C_ARO", INFO, text, ("D13C_SAT", "D13C_ARO", "D13C_RESIN"))

    applies = reported(rows, "D13C_SAT") & reported(rows, "D13C_ARO")
    return answer(rows, tell, applies=applies, known=~np.isnan(saturated + aromatic), fires=fires)


BALANCE = Rule(
    id="fraction_mass_balance",
    family="isotopes_gc",
    title="The whole is the sum of its fractions",
    tests="The carbon isotopes of an oil or extract are the weighted mean of those of its fractions.",
    check=check_balance,
    inputs=("D13C_OIL", *FRACTIONS),
    flags="D13C_OIL",
    formula="|whole - sum of f delta| > 0.5 permil, sum of f = 1 +- 0.02; order saturated < aromatic < resin broken informs",
    message="Isotopes of fractions and whole do not balance",
    source="mass balance; limits: our default, no publication",
    must_not_fire="Without the shares of the fractions.",
    example="0.55 x -29.0 + 0.25 x -28.0 + 0.15 x -27.8 + 0.05 x -27.5 = -28.495; whole -28.5 passes.",
)


def vsmow(vpdb: float) -> float:
    """Oxygen delta on VSMOW from VPDB: ``1.03092 d + 30.92`` (Brand et al. 2014, from memory; older 30.91)."""
    return 1.03092 * vpdb + 30.92


def check_oxygen(table: Table, *, expected_low: float, expected_high: float, samples_min: float) -> Answer:
    """One check a source table with oxygen of carbonate: its median is not that of the other scale."""
    rows = table.panel("isotopes", "D18O_CARB")
    if rows.empty:
        return nothing()
    entries: list[Any] = []
    number: Any
    for number, group in rows[~np.isnan(exact(rows, "D18O_CARB"))].groupby("table", sort=True):
        header = table.headers.get((int(number), int(group["D18O_CARB_col"].iloc[0])), "")
        first, members = int(group.index[0]), tuple(int(row) for row in group.index)
        if len(group) < samples_min or re.search(r"smow", header, re.I):
            entries.append((first, NOT_APPLICABLE, None))
            continue
        median = float(group["D18O_CARB"].median())
        low, high = vsmow(expected_low), vsmow(expected_high)
        if not low <= median <= high:
            entries.append((first, PASS, None))
            continue
        text = f"Median d18O is {median:.2f} permil in {len(members)} carbonates: VSMOW values under a VPDB name?"
        more = {"on_vpdb": dig((median - 30.92) / 1.03092, 2), "discriminating_test": "ask for the scale"}
        entries.append(
            (
                first,
                FIRE,
                Finding(
                    None,
                    "D18O_CARB",
                    WARN,
                    text,
                    ("D18O_CARB",),
                    dig(median, 2),
                    [dig(low, 2), dig(high, 2)],
                    rows=members,
                    more=more,
                ),
            )
        )
    return of_sets(entries)


OXYGEN = Rule(
    id="oxygen_scale_slip",
    family="isotopes_gc",
    title="Oxygen on the scale it is called",
    tests="The median oxygen delta of carbonates in a table is not about 31 permil above what carbonates have on VPDB.",
    check=check_oxygen,
    inputs=("D18O_CARB",),
    flags="D18O_CARB",
    formula="d18O(VSMOW) = 1.03092 d18O(VPDB) + 30.92; median within what -12 to 3 permil VPDB become on VSMOW",
    message="Oxygen values are on another scale than named",
    source="from memory of Brand et al. 2014 (older 30.91); expected range: our default, no publication",
    must_not_fire="Where the header says VSMOW, and on fewer than three samples.",
    example="-4.5 permil VPDB is 26.28 on VSMOW.",
)
RULES = (RANGE, SCALE, BALANCE, OXYGEN)
