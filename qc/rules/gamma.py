"""Series down a hole laid against each other: resampling, smoothing, and correlation by shift."""

from dataclasses import dataclass

import numpy as np

from qc.rules.spans import Bools, Floats


@dataclass(frozen=True)
class Match:
    """The best shift [m; positive where the second series lies deeper] and how sure it is."""

    shift: float
    r: float
    runner_up: float
    lags: Floats
    correlations: Floats

    def accepted(self, r_min: float, margin_min: float) -> bool:
        return self.r >= r_min and self.r - self.runner_up >= margin_min


def sliding(short: Floats, long: Floats) -> Floats:
    """Pearson r of ``short`` with each stretch of its length in ``long``; NaN values of either are left out.

    NaN where either has no spread in the stretch.
    """
    size = len(short)
    if size > len(long):
        return np.empty(0)
    windows = np.lib.stride_tricks.sliding_window_view(long, size)
    known = ~np.isnan(windows) & ~np.isnan(short)
    count = known.sum(axis=1)
    x, y = np.where(known, short, 0.0), np.where(known, windows, 0.0)
    with np.errstate(invalid="ignore", divide="ignore"):
        dx = np.where(known, x - (x.sum(axis=1) / count)[:, None], 0.0)
        dy = np.where(known, y - (y.sum(axis=1) / count)[:, None], 0.0)
        spread = np.sqrt((dx**2).sum(axis=1) * (dy**2).sum(axis=1))
        made = (dx * dy).sum(axis=1) / np.where(spread > 0, spread, np.nan)
    return np.where(count >= size / 2, made, np.nan)


def match(correlations: Floats, lags: Floats, apart: float) -> Match | None:
    """The best of the correlations; its runner-up is the best at least ``apart`` metres away. None where all are unknown."""
    if not len(correlations) or np.isnan(correlations).all():
        return None
    best = int(np.nanargmax(correlations))
    far = np.abs(lags - lags[best]) >= apart - 1e-9
    others = correlations[far & ~np.isnan(correlations)]
    runner_up = float(others.max()) if len(others) else -1.0
    return Match(float(lags[best]), float(correlations[best]), runner_up, lags, correlations)


def resample(depth: Floats, values: Floats, at: Floats, gap_max: float) -> Floats:
    """Linear between neighbours no more than ``gap_max`` apart; NaN in wider gaps and beyond the ends."""
    known = ~np.isnan(values)
    depth, values = depth[known], values[known]
    if len(depth) < 2:
        return np.full(len(at), np.nan)
    made = np.interp(at, depth, values, left=np.nan, right=np.nan)
    return np.where(_in_gap(depth, at, gap_max), np.nan, made)


def _in_gap(depth: Floats, at: Floats, gap_max: float) -> Bools:
    place = np.clip(np.searchsorted(depth, at, side="right"), 1, len(depth) - 1)
    exact = np.isclose(depth[np.clip(place, 0, len(depth) - 1)], at) | np.isclose(depth[place - 1], at)
    return (depth[place] - depth[place - 1] > gap_max + 1e-9) & ~exact


def smooth(values: Floats, width: int) -> Floats:
    """Running mean of ``width`` values (made odd), over what is known of them."""
    half = width // 2
    if half < 1:
        return values
    known = ~np.isnan(values)
    kernel = np.ones(2 * half + 1)
    total = np.convolve(np.where(known, values, 0.0), kernel, mode="same")
    count = np.convolve(known.astype(float), kernel, mode="same")
    with np.errstate(invalid="ignore", divide="ignore"):
        return np.where(known, total / count, np.nan)


def core_to_log(
    core: tuple[Floats, Floats], log: tuple[Floats, Floats], *, reach: float, resolution: float, apart: float
) -> Match | None:
    """Shift of a core's gamma onto the log: (depth, value) of each, depths rising.

    Both are resampled to the finer of the two spacings, the core smoothed to the resolution of the log.
    """
    steps = [np.median(np.diff(depth)) for depth, _ in (core, log)]
    step = float(max(min(steps), 0.02))
    places = np.arange(0, np.floor((core[0][-1] - core[0][0]) / step + 1e-9) + 1)
    around = round(reach / step)
    short = resample(*core, core[0][0] + step * places, gap_max=3 * steps[0])
    far = np.arange(-around, len(places) + around)
    long = resample(*log, core[0][0] + step * far, gap_max=3 * steps[1])
    lags: Floats = np.asarray(step * np.arange(-around, around + 1), dtype=np.float64)
    return match(sliding(smooth(short, round(resolution / step)), long), lags, apart)
