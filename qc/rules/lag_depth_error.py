"""Cuttings that stand deeper than the log says: lag not taken off."""

from typing import Any

import numpy as np
import pandas as pd

from qc.rules.core_log_shift import LAGS_SHOWN, total_gamma
from qc.rules.facts import not_rock
from qc.rules.gamma import Match, match
from qc.rules.rule import CANNOT_EVALUATE, FIRE, NOT_APPLICABLE, PASS, WARN, Answer, Finding, Rule, say
from qc.rules.spans import Floats, exact
from qc.rules.table import Table

STEPS_AN_INTERVAL = 4


def annular_volume(hole_in: float, pipe_in: float, depth_m: float) -> float:
    """Volume between hole and pipe [m³]."""
    inch = 0.0254
    return float(np.pi / 4 * ((hole_in * inch) ** 2 - (pipe_in * inch) ** 2) * depth_m)


def lag_minutes(volume_m3: float, pump_m3_min: float) -> float:
    """Time that cuttings take to the surface [min]."""
    return volume_m3 / pump_m3_min


def depth_error(rate_m_h: float, lag_min: float) -> float:
    """How much too deep uncorrected cuttings are booked [m]."""
    return rate_m_h * lag_min / 60


def check(table: Table, *, samples_min: int, r_min: float, margin_min: float, intervals_max: int) -> Answer:
    """One check for each well with enough cuttings: TOC, else carbonate, against gamma of the log at shallower depths."""
    rows = table.of("pyrolysis", "carbon")
    rows = rows[rows["kind"].eq("cuttings") & rows["top_m"].notna() & ~not_rock(rows)]
    outcomes: dict[int, str] = {}
    findings: list[Finding] = []
    for well, own in rows.groupby("well", sort=True):
        first = int(own.index[0])
        name = "TOC" if np.isfinite(exact(own, "TOC")).sum() >= samples_min else "CARB"
        members = own[np.isfinite(exact(own, name))].sort_values("top_m", kind="stable").drop_duplicates("sample")
        length = float((members["base_m"] - members["top_m"]).median()) if len(members) else np.nan
        if len(members) < samples_min or not length > 0:
            outcomes[first] = NOT_APPLICABLE
            continue
        log = total_gamma(table, well)
        if log is None:
            outcomes[first] = CANNOT_EVALUATE
            continue
        fitted = shift(members, exact(members, name) * (1 if name == "TOC" else -1), log, length, intervals_max)
        outcomes[first], finding = _judged(members, name, length, fitted, (r_min, margin_min))
        findings += [finding] if finding else []
    return Answer(pd.Series(outcomes, dtype=object), findings)


def shift(
    members: pd.DataFrame, values: Floats, log: tuple[Floats, Floats], length: float, intervals_max: int
) -> Match | None:
    """How much deeper the cuttings stand than gamma of the log does [m]; positive is too deep."""
    lags = (
        length
        / STEPS_AN_INTERVAL
        * np.arange(-intervals_max * STEPS_AN_INTERVAL, intervals_max * STEPS_AN_INTERVAL + 1)
    )
    top = members["top_m"].to_numpy(dtype=float)
    base = np.where(members["base_m"].isna(), top + length, members["base_m"].to_numpy(dtype=float))
    correlations: Floats = np.array(
        [_r(values, interval_means(log, top - lag, base - lag)) for lag in lags], dtype=np.float64
    )
    return match(correlations, np.asarray(lags, dtype=np.float64), apart=2 * length)


def interval_means(log: tuple[Floats, Floats], top: Floats, base: Floats) -> Floats:
    """Mean of the curve in each interval; NaN where it has no value."""
    known = ~np.isnan(log[1])
    depth, total = log[0][known], np.concatenate([[0.0], np.cumsum(log[1][known])])
    first, last = np.searchsorted(depth, top, side="left"), np.searchsorted(depth, base, side="left")
    count = last - first
    return np.where(count > 0, (total[last] - total[first]) / np.maximum(count, 1), np.nan)


def _r(one: Floats, other: Floats) -> float:
    """Pearson r of what both know; NaN where that is less than half, or has no spread."""
    known = ~np.isnan(one) & ~np.isnan(other)
    if known.sum() < max(len(one) / 2, 3) or np.ptp(one[known]) == 0 or np.ptp(other[known]) == 0:
        return float("nan")
    return float(np.corrcoef(one[known], other[known])[0, 1])


def _judged(
    members: pd.DataFrame, name: str, length: float, fitted: Match | None, limits: tuple[float, float]
) -> tuple[str, Finding | None]:
    if fitted is None or fitted.r < limits[0]:
        return NOT_APPLICABLE, None
    unshifted = float(fitted.correlations[len(fitted.lags) // 2])
    if fitted.shift <= length + 1e-9 or fitted.r - unshifted < limits[1]:
        return PASS, None
    text = (
        f"{name} of {len(members)} cuttings follows gamma of the log best {say(fitted.shift)} m shallower (r {fitted.r:.2f}, unshifted "
        f"{unshifted:.2f}): more than one sample of {say(length)} m."
    )
    step = max(1, -(-len(fitted.lags) // LAGS_SHOWN))
    more: dict[str, Any] = {
        "lags_m": fitted.lags[::step].round(3).tolist(), "r": np.round(fitted.correlations[::step], 4).tolist(),
        "alternatives": ["lag not taken off, or with a wrong hole volume (washed-out hole)", "recycled cuttings", "logger's against driller's depth"],
        "discriminating_test": "lag table of the mud logger: hole and pipe size, pump rate, rate of penetration",
    }  # fmt: skip
    rows = tuple(int(row) for row in members.index)
    return FIRE, Finding(
        None, name, WARN, text, (name,), round(fitted.shift, 3), round(length, 3), rows=rows, more=more
    )


RULE = Rule(
    id="lag_depth_error",
    family="depth",
    title="Cuttings stand at the depth of their rock",
    tests="TOC of cuttings (else carbonate, turned round) is correlated with gamma of the log at shifts of up to 5 samples.",
    check=check,
    inputs=("TOC", "CARB", "top", "base", "wireline gamma"),
    flags="TOC of the well's cuttings",
    formula="shift of the best r (>= 0.7, at least 0.1 better than unshifted) deeper than one sample interval; at least 20 samples",
    message="Cuttings stand systematically too deep",
    source="our default, no publication; lag = annular volume / pump rate, error = rate of penetration x lag: arithmetic",
    must_not_fire="With fewer than 20 cuttings, or r below 0.7 (not applicable); washed-out hole and recycled cuttings look alike.",
    example="8.5 in hole, 5 in pipe, 3000 m: 71.8 m³; at 2.0 m³/min 35.9 min; at 20 m/h 12.0 m too deep.",
)
