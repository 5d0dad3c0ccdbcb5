"""Reported true vertical depths against those that the deviation survey gives."""

from typing import Any

import numpy as np
import pandas as pd

from qc.rules.rule import CANNOT_EVALUATE, FIRE, INFO, NOT_APPLICABLE, PASS, REJECT, WARN, Answer, Finding, Rule, say
from qc.rules.survey import at_depth, dogleg
from qc.rules.table import Table

STATIONS_SHOWN = 100


def check(table: Table, *, tolerance: float, tolerance_relative: float, gap_max: float, bend_min: float) -> Answer:
    """One check for each survey, and one for each sample that is reported in measured and in true vertical depth."""
    rows = table.rows[table.rows["top_m"].notna() & table.rows["kind"].ne("outcrop")]
    outcomes: list[tuple[int, str]] = []
    findings: list[Finding] = []
    for well, own in rows.groupby("well", sort=True):
        stations = table.survey[table.survey["well"] == well].sort_values("md_m", kind="stable")
        made = [_survey(own, stations, gap_max, bend_min), *_samples(own, stations, (tolerance, tolerance_relative))]
        outcomes += [(row, outcome) for row, outcome, _ in made]
        findings += [finding for _, _, finding in made if finding]
    if not outcomes:
        return Answer(pd.Series(NOT_APPLICABLE, index=table.samples().index, dtype=object))
    return Answer(pd.Series([one for _, one in outcomes], index=[row for row, _ in outcomes], dtype=object), findings)


Made = tuple[int, str, Finding | None]


def _survey(own: pd.DataFrame, stations: pd.DataFrame, gap_max: float, bend_min: float) -> Made:
    """Measured depth of the stations must rise, and a bend needs stations close enough."""
    first, rows = int(own.index[0]), tuple(int(row) for row in own.index)
    if len(stations) < 2:
        return first, NOT_APPLICABLE, None
    md = stations["md_m"].to_numpy(dtype=float)
    inc, azi = (np.radians(stations[name].to_numpy(dtype=float)) for name in ("inclination_deg", "azimuth_deg"))
    steps = np.diff(md)
    bend = np.degrees(dogleg(inc[:-1], azi[:-1], inc[1:], azi[1:]))
    wide = (steps > gap_max) & (bend > bend_min)
    more: dict[str, Any] = {
        "stations": stations[["md_m", "inclination_deg", "azimuth_deg"]].to_numpy(dtype=float)[:STATIONS_SHOWN].tolist(),
        "discriminating_test": "the survey file of the contractor",
    }  # fmt: skip
    if (steps <= 0).any():
        at = float(md[1:][steps <= 0][0])
        more["alternatives"] = ["two surveys joined", "station entered twice"]
        text = f"The survey has two stations at {at:.1f} m."
        return first, FIRE, Finding(None, "", WARN, text, (), at, None, rows=rows, more=more)
    if wide.any():
        place = int(np.flatnonzero(wide)[0])
        more["alternatives"] = ["stations left out of the file"]
        text = (
            f"Between {md[place]:.0f} and {md[place + 1]:.0f} m the hole bends by {bend[place]:.1f}° without a station."
        )
        return first, FIRE, Finding(None, "", INFO, text, (), float(steps[place]), gap_max, rows=rows, more=more)
    return first, PASS, None


def _samples(own: pd.DataFrame, stations: pd.DataFrame, tolerance: tuple[float, float]) -> list[Made]:
    """Samples whose number stands at a true vertical depth in one table and at a measured depth in another."""
    named = own[own["label"].str.contains(r"\d", regex=True)].drop_duplicates(["label", "depth_kind"])
    vertical = named[named["depth_kind"] == "TVD"]
    measured = named[named["depth_kind"] != "TVD"].drop_duplicates("label").set_index("label")["top_m"]
    made: list[Made] = []
    for row in vertical.index:
        label, tvd = str(vertical.at[row, "label"]), float(vertical.at[row, "top_m"])  # type: ignore[arg-type]
        if label in measured.index:
            made.append(_pair(int(row), label, (float(measured[label]), tvd), stations, tolerance))
        else:
            made.append((int(row), CANNOT_EVALUATE, None))
    return made


def _pair(
    row: int, label: str, depths: tuple[float, float], stations: pd.DataFrame, tolerance: tuple[float, float]
) -> Made:
    md, tvd = depths
    limit = tolerance[0] + tolerance[1] * md
    more = {
        "md_m": md,
        "alternatives": ["measured and true vertical depth mixed up", "another survey was used", "sidetrack"],
        "discriminating_test": "recompute from the survey of the contractor",
    }
    if tvd > md + limit:
        text = f"Sample {label} has a true vertical depth of {tvd:.2f} m, below its measured depth {md:.2f} m."
        return row, FIRE, Finding(row, "", REJECT, text, (), tvd, md, more=more)
    if len(stations) < 2:
        return row, CANNOT_EVALUATE, None
    md_m, inclination, azimuth = (
        stations[name].to_numpy(dtype=float) for name in ("md_m", "inclination_deg", "azimuth_deg")
    )
    computed = float(at_depth(md_m, inclination, azimuth, np.array([md]))[0])
    if abs(tvd - computed) <= limit:
        return row, PASS, None
    text = (
        f"Sample {label} at {md:.2f} m has a reported true vertical depth of {tvd:.2f} m; the survey gives {computed:.2f} m "
        f"(± {say(limit)})."
    )
    return row, FIRE, Finding(row, "", WARN, text, (), round(computed, 3), round(limit, 3), more=more)


RULE = Rule(
    id="md_tvd_consistency",
    family="depth",
    title="Measured and true vertical depth agree",
    tests="True vertical depth is recomputed by minimum curvature, along the arc between stations, and compared with the reported one.",
    check=check,
    inputs=("top", "depth kind", "deviation survey"),
    flags="the sample in true vertical depth, or the survey",
    formula="TVD > MD; |TVD reported - TVD computed| > 0.5 m + 0.1 % MD; stations not rising; gap > 100 m in a bend: information",
    message="Measured and true vertical depth disagree",
    source="our default, no publication; minimum curvature: drillingformulas.com «Minimum Curvature Method»",
    must_not_fire="Where no sample is reported in both depths, and no survey is recorded.",
    example="3500 ft I15 A20 to 3600 ft I25 A45: 94.01 ft of TVD; 100 ft, the hole taken as vertical, fires.",
)
