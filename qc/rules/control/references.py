"""Reference materials against their certificates, isotope reference materials against their scale, blanks against limits."""

import re
from typing import Any

import numpy as np
import pandas as pd

from qc.rules.control.brackets import each, finding
from qc.rules.facts import says
from qc.rules.panels import METHODS
from qc.rules.rule import CANNOT_EVALUATE, FIRE, NOT_APPLICABLE, PASS, REJECT, WARN, Answer, Rule, say
from qc.rules.table import Table

# permil VPDB: CIAAW table, Coplen et al. 2006; LSVEC historic
CARBON_SCALE = {
    "NBS22": -30.03, "NBS19": 1.95, "LSVEC": -46.6, "USGS24": -16.05, "IAEACH6": -10.45, "IAEACH7": -32.15, "USGS40": -26.39,
    "NBS18": -5.01,
}  # fmt: skip
AMOUNTS = frozenset({"TOC", "TIC", "TC", "TS", "S1", "S2", "S3"})


def recovery(value: float, certified: float) -> float:
    """Recovery [%]."""
    return 100 * value / certified


def normalised_error(value: float, certified: float, uncertainty: float, certified_uncertainty: float) -> float:
    """E_n of expanded uncertainties; |E_n| <= 1 is satisfactory (ISO 13528, from memory)."""
    return (value - certified) / float(np.hypot(uncertainty, certified_uncertainty))


def two_point(raw: float, measured: tuple[float, float], true: tuple[float, float]) -> float:
    """A raw delta on the scale that two reference materials make."""
    return true[0] + (raw - measured[0]) * (true[1] - true[0]) / (measured[1] - measured[0])


def check_recovery(table: Table, *, tmax_away: float, **limits: float) -> Answer:
    """One check a reference material and well that it brackets: recovery within the limits of the analyte."""
    controls = table.controls
    fails = [_fails(controls.loc[place], tmax_away, limits) for place in controls.index]

    def judge(place: int) -> tuple[str, Any]:
        control: Any = controls.loc[place]
        failed = fails[place]
        if control["role"] != "reference" or control["method"] == "isotopes":
            return NOT_APPLICABLE, None
        if failed is None:
            return CANNOT_EVALUATE, None
        near = controls[(controls["table"] == control["table"]) & (controls["analyte"] == control["analyte"])]
        twice = bool(failed) and _neighbour_fails(near, place, fails)

        def tell(rows: tuple[int, ...]) -> Any:
            made = recovery(control["value"], control["certified"]) if control["certified"] else float("nan")
            text = (
                f"{control['analyte']} {say(control['value'])} where the certificate has {say(control['certified'])} "
                f"({say(made)} %)" + (", and so does the next one." if twice else ".")
            )
            low, high = _bounds(str(control["analyte"]), limits)
            limit = tmax_away if control["analyte"] == "TMAX" else [low, high]
            more = {"alternatives": ["wrong lot of the material chosen", "calibration", "swapped boats"]}
            return finding(control, rows, REJECT if twice else WARN, text, computed=round(made, 2), limit=limit, **more)

        return (FIRE if failed else PASS), tell

    return each(table, judge)


def _bounds(analyte: str, limits: dict[str, float]) -> tuple[float, float]:
    width = limits.get(f"{analyte.casefold()}_away", limits["other_away"])
    return 100 - width, 100 + width


def _fails(control: pd.Series, tmax_away: float, limits: dict[str, float]) -> bool | None:
    """None where value or certificate is unknown."""
    value, certified = float(control["value"]), float(control["certified"])
    if np.isnan(value) or np.isnan(certified) or control["q"] in {"<", ">"} or certified == 0:
        return None
    if control["analyte"] == "TMAX":
        return abs(value - certified) > tmax_away
    low, high = _bounds(str(control["analyte"]), limits)
    return not low <= recovery(value, certified) <= high


def _neighbour_fails(near: pd.DataFrame, place: int, fails: list[bool | None]) -> bool:
    ordered = list(near.sort_values("line", kind="stable").index)
    at = ordered.index(place)
    return any(fails[other] for other in ordered[max(0, at - 1) : at] + ordered[at + 1 : at + 2])


RECOVERY = Rule(
    id="crm_recovery",
    family="lab_control",
    title="Reference materials read as certified",
    tests="A reference material reads its certified value; results that a failing one brackets are named.",
    check=check_recovery,
    inputs=("TOC", "S1", "S2", "S3", "TMAX"),
    flags="TOC",
    formula="recovery 100 x/x_ref outside TOC 95-105, S2 93-107, S1 80-120, S3 75-125 %, Tmax +- 2 degC; two in a row are a candidate for rejection",
    message="A reference material does not read its certified value",
    source="limits: our default, no publication; E_n from memory of ISO 13528",
    must_not_fire="Without a certificate of the lot (cannot be evaluated): values come from the certificate, never from the rule.",
    example="S2 12.60 of 12.43 is 101.4 %, z 0.68 at s 0.25: passes.",
)


def check_blank(table: Table, *, share_of_lowest: float, corrected_times: float) -> Answer:
    """One check a blank and well that it brackets: below the reporting limit and a tenth of the lowest sample."""
    controls = table.controls

    def judge(place: int) -> tuple[str, Any]:
        control: Any = controls.loc[place]
        analyte, method = str(control["analyte"]), str(control["method"])
        if control["role"] != "blank" or not (analyte in AMOUNTS or method == "elements"):
            return NOT_APPLICABLE, None
        if control["q"] in {"<", "~"} or np.isnan(control["value"]):
            return (PASS if control["q"] == "<" else CANNOT_EVALUATE), None
        frame = table.panel(method, analyte) if method in METHODS else table.rows
        held = frame[(frame["table"] == control["table"]) & (frame["method"] == method) & (frame[f"{analyte}_id"] >= 0)]
        below = (held[f"{analyte}_q"] == "<").to_numpy()
        limit = float(held[analyte][below].min()) if below.any() else np.nan
        lowest = float(held[analyte][~below].min()) if (~below).any() else np.nan
        value = float(control["value"])
        corrected = says(held, r"blank[- ]corrected").any() and value < corrected_times * limit
        fires = (value > limit or value > share_of_lowest * lowest) and not corrected

        def tell(rows: tuple[int, ...]) -> Any:
            bounds = [None if np.isnan(one) else round(one, 6) for one in (limit, share_of_lowest * lowest)]
            text = f"the blank reads {analyte} {say(value)}; limit {say(limit)}, lowest sample {say(lowest)}."
            more = {"alternatives": ["carry-over", "contaminated crucibles"]}
            return finding(control, rows, WARN, text, computed=value, limit=bounds, **more)

        return (FIRE if fires else PASS), tell

    return each(table, judge)


BLANK = Rule(
    id="blank_level",
    family="lab_control",
    title="Blanks are empty",
    tests="A blank is below the reporting limit and below a tenth of the lowest reported sample of its table.",
    check=check_blank,
    inputs=tuple(sorted(AMOUNTS)),
    flags="S1",
    formula="blank > reporting limit, or > 10 % of the lowest reported sample",
    message="A blank is not empty",
    source="our default, no publication",
    must_not_fire="Where values are blank-corrected (said in the remark) and the blank is below three times the limit.",
    example="S1 blank 0.06 with limit 0.02 fires.",
)


def material(name: str) -> str:
    """``IAEA-CH-6`` -> ``IAEACH6``."""
    return re.sub(r"[^A-Z0-9]", "", name.upper())


def check_isotopes(table: Table, *, warn_away: float, reject_away: float) -> Answer:
    """One check an isotope reference material and well that it brackets, against the value of the scale."""
    controls = table.controls

    def judge(place: int) -> tuple[str, Any]:
        control: Any = controls.loc[place]
        if not str(control["analyte"]).startswith("D13C") or control["role"] != "reference":
            return NOT_APPLICABLE, None
        target = CARBON_SCALE.get(material(str(control["material"])), float(control["certified"]))
        value = float(control["value"])
        if np.isnan(target) or np.isnan(value):
            return CANNOT_EVALUATE, None
        away = abs(value - target)

        def tell(rows: tuple[int, ...]) -> Any:
            text = f"reads {value:.2f} permil where the scale has {target:.2f}."
            more = {"target": target, "alternatives": ["one-point normalisation", "wrong material", "other scale"]}
            severity = REJECT if away > reject_away else WARN
            return finding(control, rows, severity, text, computed=round(value - target, 3), limit=warn_away, **more)

        return (FIRE if away > warn_away else PASS), tell

    return each(table, judge)


ISOTOPES = Rule(
    id="isotope_rm_check",
    family="isotopes_gc",
    title="Isotope reference materials read their scale",
    tests="A carbon isotope reference material measured with the samples reads its consensus value.",
    check=check_isotopes,
    inputs=("D13C_ORG", "D13C_CARB"),
    flags="D13C_ORG",
    formula="|x - target| > 0.20 permil warns, > 0.40 is a candidate for rejection",
    message="An isotope reference material does not read its value",
    source="targets: CIAAW table, Coplen et al. 2006; limits: our default, no publication",
    must_not_fire="Where no value of the material is known (cannot be evaluated).",
    example="NBS 22 read as -29.80 is 0.23 off -30.03 and fires.",
)
RULES = (RECOVERY, BLANK, ISOTOPES)
