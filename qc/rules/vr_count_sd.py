"""How many reflectance readings, how spread, and whether the mean lies among them."""

import numpy as np
import pandas as pd
from scipy import stats

from qc.rules.rule import REJECT, WARN, Answer, Finding, Rule, fired, judge, merge, say
from qc.rules.spans import exact, num, reported
from qc.rules.table import Table


def half_width(sd: float, n: float) -> float:
    """95 % half-width of the mean, t s/sqrt(n); NaN for n < 2."""
    return float(stats.t.ppf(0.975, n - 1) * sd / np.sqrt(n)) if n >= 2 else float("nan")


def check(table: Table, *, n_min: int, n_desirable: int, sd_floor: float, sd_slope: float) -> Answer:
    """For each reflectance: enough readings; a spread of one population, where SD is reported; mean between extremes."""
    rows = table.of("reflectance")
    n, sd, ro = exact(rows, "RO_N"), exact(rows, "RO_SD"), exact(rows, "RO")
    with np.errstate(invalid="ignore"):
        few = n < n_desirable
        limit = np.maximum(sd_floor, sd_floor + sd_slope * (ro - 0.5))
        wide = sd > limit
        astray = (ro < exact(rows, "RO_MIN")) | (ro > exact(rows, "RO_MAX"))
    counted = judge(rows.index, applies=reported(rows, "RO"), known=~np.isnan(n), fires=few)
    spread = judge(rows.index, applies=reported(rows, "RO_SD"), known=~np.isnan(sd) & ~np.isnan(ro), fires=wide)
    ends = reported(rows, "RO") & (reported(rows, "RO_MIN") | reported(rows, "RO_MAX"))
    inside = judge(rows.index, applies=ends, known=~np.isnan(ro), fires=astray)
    limits = pd.Series(limit, index=rows.index)
    return merge([
        Answer(counted, [_few(rows, row, n_min, n_desirable) for row in fired(counted)]),
        Answer(spread, [_wide(rows, row, float(limits[row])) for row in fired(spread)]),
        Answer(inside, [_astray(rows, row) for row in fired(inside)]),
    ])  # fmt: skip


def _few(rows: pd.DataFrame, row: int, n_min: int, n_desirable: int) -> Finding:
    n, sd = num(rows, row, "RO_N"), num(rows, row, "RO_SD")
    limit = n_min if n < n_min else n_desirable
    text = f"Ro {say(num(rows, row, 'RO'))} % is the mean of {say(n)} readings, fewer than {say(limit)}"
    half = half_width(sd, n)
    if np.isfinite(half):
        text += f" (95 % half-width ±{half:.3f})"
    more = {
        "half_width_95": None if np.isnan(half) else round(half, 4),
        "alternatives": [
            "lean sample: the readings are all there are",
            "readings of more than one population left out",
        ],
        "discriminating_test": "more readings on a concentrate; histogram of the readings",
    }
    severity = REJECT if n < n_min else WARN
    return Finding(row, "RO", severity, text + ".", ("RO", "RO_N", "RO_SD"), float(n), limit, more=more)


def _wide(rows: pd.DataFrame, row: int, limit: float) -> Finding:
    sd = num(rows, row, "RO_SD")
    text = f"The readings of Ro {say(num(rows, row, 'RO'))} % spread by {say(sd)} %, more than {say(limit)} % of one population."
    more = {
        "alternatives": ["two populations: caved, reworked or bitumen", "poor polish"],
        "discriminating_test": "histogram of the readings",
    }
    return Finding(row, "RO_SD", WARN, text, ("RO", "RO_SD", "RO_N"), float(sd), round(limit, 4), more=more)


def _astray(rows: pd.DataFrame, row: int) -> Finding:
    low, high = num(rows, row, "RO_MIN"), num(rows, row, "RO_MAX")
    ro = num(rows, row, "RO")
    side, end = ("below its lowest", low) if ro < low else ("above its highest", high)
    text = f"The mean Ro {say(ro)} % lies {side} reading, {say(end)} %."
    more = {"alternatives": ["slip in the mean, lowest or highest reading", "columns of two samples mixed"],
            "discriminating_test": "ask the laboratory for the readings"}  # fmt: skip
    limit = [None if np.isnan(end) else float(end) for end in (low, high)]
    return Finding(row, "RO", REJECT, text, ("RO", "RO_MIN", "RO_MAX", "RO_N"), ro, limit, more=more)


RULE = Rule(
    id="vr_count_sd",
    family="maturity",
    title="Enough reflectance readings, of one population",
    tests="A mean reflectance needs readings enough, spread as one population is, and must lie between its own extremes.",
    check=check,
    inputs=("RO", "RO_N", "RO_SD", "RO_MIN", "RO_MAX"),
    flags="RO (RO_SD where the spread is too wide)",
    formula="n < 5: candidate for rejection; n < 20: warning; SD > 0.10 + 0.08 (Ro - 0.5), at least 0.10; mean outside min-max",
    message="Too few readings, or not of one population",
    source=(
        "ASTM D7708 and Barker & Pawlewicz 1993 (from memory); lower limit and SD: our default, no publication; mean outside "
        "its extremes: arithmetic"
    ),
    must_not_fire="On a difference of 0.1 % between laboratories: their reproducibility is 0.12-0.54 %.",
    example="n = 20, s = 0.06: ±0.028. n = 5: ±0.074, warning. n = 4: candidate for rejection.",
)
