"""Depths without a datum, and two reports that measure from different ones."""

import itertools
from typing import Any

import numpy as np
import pandas as pd

from qc.rules.rule import CANNOT_EVALUATE, FIRE, INFO, NOT_APPLICABLE, PASS, WARN, Answer, Finding, Rule, say
from qc.rules.spans import Floats, line
from qc.rules.table import Table

OFFSETS_SHOWN = 50


def check(table: Table, *, tolerance: float, samples_min: int, share_min: float) -> Answer:
    """One check a well that its depths have a datum and a kind, and one for each two reports that share sample numbers."""
    samples = table.rows[table.rows["top_m"].notna() & table.rows["kind"].ne("outcrop")]
    outcomes: list[tuple[int, str]] = []
    findings: list[Finding] = []
    for _, own in samples.groupby("well", sort=True):
        fact = line(table.wells, int(own["well"].iloc[0]))
        made = [_stated(own, fact), *_mixed(own, fact, tolerance, (samples_min, share_min))]
        outcomes += [(row, outcome) for row, outcome, _ in made]
        findings += [finding for _, _, finding in made if finding]
    if not outcomes:
        rows = table.samples()
        return Answer(pd.Series(NOT_APPLICABLE, index=rows.index, dtype=object))
    return Answer(pd.Series([one for _, one in outcomes], index=[row for row, _ in outcomes], dtype=object), findings)


Made = tuple[int, str, Finding | None]


def _stated(own: pd.DataFrame, fact: pd.Series) -> Made:
    """Whether the well has a datum with an elevation, and its samples a kind of depth."""
    first = int(own.index[0])
    lacking = [
        name
        for name, absent in (
            ("kind of datum", not fact["datum_kind"]),
            ("elevation of the datum", np.isnan(fact["datum_m"])),
        )
        if absent
    ]
    unkind = int(own["depth_kind"].eq("").sum())
    if not lacking and not unkind:
        return first, PASS, None
    severity = WARN if lacking else INFO
    said = [f"no {' and no '.join(lacking)} is recorded"] if lacking else []
    if unkind:
        said.append(
            f"{unkind} of {len(own)} depths do not say whether they are driller's, logger's, core or true vertical"
        )
    more = {
        "alternatives": ["the datum stands on the well sheet and was not entered"],
        "discriminating_test": "well completion report: datum, its elevation, and the depth reference of each report",
    }
    rows = tuple(int(row) for row in own.index)
    text = f"Depths of {fact['name']}: {'; '.join(said)}."
    return first, FIRE, Finding(None, "", severity, text, (), unkind, lacking, rows=rows, more=more)


def _mixed(own: pd.DataFrame, fact: pd.Series, tolerance: float, enough: tuple[int, float]) -> list[Made]:
    """One outcome for each two reports with sample numbers in common."""
    named = own[own["label"].str.contains(r"\d", regex=True)]
    depths = {
        report: part.drop_duplicates("label").set_index("label") for report, part in named.groupby("report", sort=True)
    }
    made: list[Made] = []
    for one, other in itertools.combinations(depths, 2):
        shared = depths[one].index.intersection(depths[other].index)
        away = (depths[one].loc[shared, "top_m"] - depths[other].loc[shared, "top_m"]).to_numpy(dtype=float)
        if len(shared) < enough[0] or np.abs(np.median(away)) <= tolerance:
            continue
        where = (named["report"] == other) & named["label"].isin(shared)
        rows = tuple(int(row) for row in named.index[where])
        made.append((rows[0], *judged((one, other), away, rows, fact, tolerance=tolerance, share_min=enough[1])))
    return made


def judged(
    reports: tuple[Any, Any], away: Floats, rows: tuple[int, ...], fact: pd.Series, *, tolerance: float, share_min: float
) -> tuple[str, Finding | None]:  # fmt: skip
    """Whether the offset between two reports is a difference of datums of the well."""
    median = float(np.median(away))
    steady = float(np.mean(np.abs(away - median) <= tolerance)) >= share_min
    if not steady:
        return PASS, None
    datum, ground = float(fact["datum_m"]), float(fact["ground_m"])
    steps = {"datum to ground level": datum - ground, "datum to mean sea level": datum}
    known = {name: step for name, step in steps.items() if not np.isnan(step)}
    if not known:
        return CANNOT_EVALUATE, None
    hits = [name for name, step in known.items() if abs(abs(median) - abs(step)) <= tolerance + 1e-9]
    if not hits:
        return PASS, None
    text = (
        f"The same {len(away)} samples stand {say(abs(median))} m {'deeper' if median > 0 else 'shallower'} in report {reports[0]} "
        f"than in report {reports[1]}: just the step from {' or from '.join(hits)}."
    )
    more = {
        "offsets_m": [round(float(one), 3) for one in np.sort(away)[:OFFSETS_SHOWN]], "reports": [str(one) for one in reports],
        "steps_m": {name: round(step, 3) for name, step in known.items()},
        "alternatives": ["core shifted to the log in one of the two"],
        "discriminating_test": "ask both laboratories from which datum they measure",
    }  # fmt: skip
    limit = [round(known[name], 3) for name in hits]
    return FIRE, Finding(None, "", WARN, text, (), round(median, 3), limit, rows=rows, more=more)


RULE = Rule(
    id="datum_missing_or_mixed",
    family="depth",
    title="Depths from one stated datum",
    tests="The well records its datum; two reports of the same samples must not differ by a step between datums.",
    check=check,
    inputs=("depth kind", "datum, its elevation", "ground elevation", "sample label", "top"),
    flags="the well, or the samples of the second report",
    formula="datum absent; median depth difference of at least 3 shared samples = datum - ground or = datum elevation, ± 0.2 m",
    message="The datum is missing, or two reports use different ones",
    source="our default, no publication",
    must_not_fire="Where datum and ground have the same elevation.",
    example="KB 28.5 m; report A 3200.0, report B 3171.5 for the same samples: offset 28.5, fires.",
)
