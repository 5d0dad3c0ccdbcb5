"""Duplicates of one sample against each other, and the spread of pairs of one table."""

from collections.abc import Iterator, Mapping
from typing import Any

import numpy as np
import pandas as pd

from qc.rules.asking import dig, of_sets
from qc.rules.control.outliers import cochran, cochran_critical, relative_difference, repeatability
from qc.rules.panels import METHODS, codes_of, unit_of
from qc.rules.rule import CANNOT_EVALUATE, FIRE, INFO, NOT_APPLICABLE, PASS, WARN, Answer, Finding, Rule, say
from qc.rules.spans import num
from qc.rules.table import Table

RELATIVE = ("TOC", "S1", "S2", "S3", "HI")
ABSOLUTE = ("TMAX", "RO", "PHI", "RHOG")
LOGARITHM = ("KAIR", "KLINK")
PAIRED = {"pyrolysis": ("TOC", "S1", "S2", "S3", "HI", "TMAX"), "carbon": ("TOC",), "reflectance": ("RO",)}
Pair = tuple[pd.DataFrame, str, int, int]


def pairs(table: Table) -> Iterator[Pair]:
    """(rows, analyte, first row, later row) of analyses of one sample by one method, where both have the analyte."""
    twins = table.rows[table.rows.duplicated(["sample", "method"], keep=False)]
    for method, group in twins.groupby("method", sort=True):
        rows = group
        codes = PAIRED.get(str(method), ())
        if method in METHODS:
            codes = tuple(code for code in codes_of(str(method)) if f"{code}_id" in table.panels[str(method)])
            rows = table.panel(str(method), *codes).loc[group.index]
        for _, members in rows.groupby("sample", sort=False).indices.items():
            order = rows.index[members]
            for code in codes:
                own = [int(row) for row in order if num(rows, row, f"{code}_row") == row]
                yield from ((rows, code, own[0], later) for later in own[1:])


def limit_of(analyte: str, numbers: Mapping[str, float]) -> tuple[str, float] | None:
    """(kind of difference, limit) of an analyte; None where duplicates of it are not judged."""
    if analyte in RELATIVE:
        return "%", numbers[f"{analyte.casefold()}_relative"]
    if analyte in ABSOLUTE:
        return "", numbers[f"{analyte.casefold()}_away"]
    if analyte in LOGARITHM:
        return "decades", numbers["log_permeability"]
    unit = unit_of(analyte)
    return (
        ("%", numbers["trace_relative"] if unit == "ug/g" else numbers["oxide_relative"])
        if unit in {"ug/g", "wt%"}
        else None
    )


def check(table: Table, *, near_limit: float, near_limit_allowed: float, s2_min: float, **numbers: float) -> Answer:
    """One check a pair of duplicates and analyte: within the relative limit, or the absolute one near the reporting limit."""
    entries = []
    limits: dict[tuple[int, str], float] = {}
    for rows, analyte, one, other in pairs(table):
        kind = limit_of(analyte, numbers)
        if kind is None or (rows.at[one, "method"] == "minerals"):
            continue
        entries.append(
            _pair(
                rows,
                analyte,
                (one, other),
                kind,
                {"near": near_limit, "allowed": near_limit_allowed, "s2_min": s2_min, **numbers},
                limits,
            )
        )
    return of_sets(entries)


def _pair(rows: Any, analyte: str, members: tuple[int, int], kind: tuple[str, float], numbers: Any, limits: Any) -> Any:  # noqa: PLR0917
    one, other = members
    first, second = num(rows, one, analyte), num(rows, other, analyte)
    if any(rows.at[row, f"{analyte}_q"] for row in members) or np.isnan(first + second):
        return other, CANNOT_EVALUATE, None
    if analyte == "TMAX" and not min(num(rows, one, "S2"), num(rows, other, "S2")) > numbers["s2_min"]:
        return other, NOT_APPLICABLE, None
    least = _reporting_limit(rows, analyte, one, numbers, limits)
    difference, allowed, how = abs(first - second), kind[1], kind[0]
    if how == "%":
        if not (np.isnan(least)) and min(first, second) < numbers["near"] * least:
            allowed, how = numbers["allowed"] * least, ""
        elif first + second <= 0:
            return other, CANNOT_EVALUATE, None
        else:
            difference = relative_difference(first, second)
    elif how == "decades":
        if min(first, second) <= 0:
            return other, CANNOT_EVALUATE, None
        difference = abs(float(np.log10(first / second)))
    if difference <= allowed + 1e-9:
        return other, PASS, None
    text = f"Duplicates read {analyte} {say(first)} and {say(second)}: {say(difference)} {how} apart, limit {say(allowed)}."
    more = {
        "alternatives": ["inhomogeneous sample", "swapped samples", "typing slip"],
        "discriminating_test": "a third determination",
    }
    return (
        other,
        FIRE,
        Finding(
            other,
            analyte,
            WARN,
            " ".join(text.split()),
            (analyte,),
            dig(difference),
            dig(allowed),
            rows=(one,),
            more=more,
        ),
    )


def _reporting_limit(rows: pd.DataFrame, analyte: str, row: int, numbers: Mapping[str, float], limits: dict) -> float:
    """Lowest limit stated in the column of the table, else the shipped one of the analyte; NaN where neither is known."""
    key = (int(num(rows, row, "table")), analyte)
    if key not in limits:
        column = rows[(rows["table"] == key[0]) & (rows[f"{analyte}_q"] == "<")][analyte]
        limits[key] = float(column.min()) if len(column) else numbers.get(f"{analyte.casefold()}_limit", float("nan"))
    return limits[key]


RPD = Rule(
    id="duplicate_rpd",
    family="lab_control",
    title="Duplicates agree",
    tests="Two analyses of one sample agree within a relative limit, near the reporting limit within an absolute one.",
    check=check,
    inputs=("TOC", "S1", "S2", "S3", "TMAX"),
    flags="TOC",
    formula=(
        "RPD = 100 |x1-x2| / ((x1+x2)/2) above TOC 10, S1 25, S2 10, S3 30, HI 15, oxides 5, traces 15 %; Tmax 3 degC (S2 > 0.5), "
        "Ro 0.06, porosity 0.5, grain density 0.01, log10 k 0.08; where either is below 5 limits |difference| <= 2 limits"
    ),
    message="Duplicates disagree",
    source="RPD: San Joaquin County laboratory QA pages; near-limit rule: duplicate note of a commercial laboratory; limits: our default, no publication",
    must_not_fire="Near the reporting limit the absolute rule holds instead of the relative one.",
    example="TOC 4.02 and 4.55: 12.37 % fires; 2.31 and 2.35: 1.72 % passes.",
)


def check_variance(table: Table, *, straggler: float, outlier: float, pairs_min: float) -> Answer:
    """One check a source table and analyte with enough pairs: no pair has too large a share of the (relative) variance."""
    held: dict[tuple[int, str], list[Pair]] = {}
    for rows, analyte, one, other in pairs(table):
        if (
            not any(rows.at[row, f"{analyte}_q"] for row in (one, other))
            and min(num(rows, one, analyte), num(rows, other, analyte)) > 0
        ):
            held.setdefault((int(num(rows, other, "table")), analyte), []).append((rows, analyte, one, other))
    return of_sets(
        [
            _table(members, straggler, outlier, pairs_min)
            for _, members in sorted(held.items(), key=lambda item: item[0])
        ]
    )


def _table(members: list[Pair], straggler: float, outlier: float, pairs_min: float) -> Any:
    _, analyte, _, later = members[0]
    used: dict[int, Pair] = {}
    for member in members:
        used.setdefault(member[2], member)  # equal groups: one pair a sample
    kept = list(used.values())
    if len(kept) < pairs_min:
        return later, NOT_APPLICABLE, None
    values = np.array([[num(rows, one, analyte), num(rows, other, analyte)] for rows, _, one, other in kept])
    share, place = cochran(np.log(values))
    if np.isnan(share):
        return later, CANNOT_EVALUATE, None
    critical = {alpha: cochran_critical(len(kept), 2, alpha) for alpha in (straggler, outlier)}
    if share <= critical[straggler]:
        return later, PASS, None
    _, _, one, other = kept[place]
    worst = share > critical[outlier]
    text = (
        f"Of {len(kept)} pairs of {analyte} the one of {say(values[place][0])} and {say(values[place][1])} has {share:.0%} of the "
        f"variance: {'outlier' if worst else 'straggler'} by Cochran's test."
    )
    more = {"repeatability_sd": dig(repeatability(values)), "alternatives": ["swapped samples", "inhomogeneous sample"]}
    return (
        later,
        FIRE,
        Finding(
            other,
            analyte,
            WARN if worst else INFO,
            text,
            (analyte,),
            dig(share),
            dig(critical[straggler]),
            rows=(one,),
            more=more,
        ),
    )


VARIANCE = Rule(
    id="cochran_variance",
    family="lab_control",
    title="No pair spreads more than the others",
    tests="Among the duplicate pairs of a table no pair has an outlying variance; relative differences, as variance grows with level.",
    check=check_variance,
    inputs=("TOC", "S1", "S2"),
    flags="TOC",
    formula="C = largest variance / sum of variances of ln x > critical at 5 % informs (straggler), at 1 % warns (outlier)",
    message="A duplicate pair spreads more than the others",
    source="from memory of ISO 5725-2; critical values as the University of Washington tabulates them",
    must_not_fire="On groups of unequal size: one pair a sample is used.",
    example="Eight pairs of TOC with 4.02 and 4.55: C 0.955 > 0.794 as differences; an outlier.",
)
RULES = (RPD, VARIANCE)
