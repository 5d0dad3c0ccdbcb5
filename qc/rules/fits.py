"""Lines through scattered points: Theil-Sen, Siegel, Deming, ordinary least squares, and a bootstrap.

Intercepts are ``median(y - m x)`` throughout; some libraries give ``median(y) - m median(x)`` instead, which is
another number (``joint_intercept`` here, kept beside it).
"""

import hashlib
from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from qc.rules.spans import Floats

PAIRS_IN_MEMORY = 2_000_000
WORK = 20_000_000  # pair weights a bootstrap may touch
RESAMPLES_MIN = 200
POINTS_RESAMPLED = 800  # of more, every k-th in order of x: the interval is then wider, never narrower
TAIL = 2.5  # per cent on either side of a 95 % interval


@dataclass(frozen=True)
class Line:
    slope: float
    intercept: float


def theil_sen(x: Floats, y: Floats) -> Line:
    """Median of the slopes of all pairs with different x; exact for any number of points.

    Memory is bounded: beyond ``PAIRS_IN_MEMORY`` slopes only those between two brackets around the median are kept,
    the others are counted. NaN where no two x differ.
    """
    slope = _median_slope(x, y)
    return Line(slope, float(np.median(y - slope * x)) if len(x) else float("nan"))


def joint_intercept(x: Floats, y: Floats, slope: float) -> float:
    """``median(y) - m median(x)``: the other convention."""
    return float(np.median(y) - slope * np.median(x))


def _slopes(x: Floats, y: Floats) -> Iterator[Floats]:
    """Slopes of all pairs, a point with all later ones at a time; never more than n numbers."""
    for i in range(len(x) - 1):
        dx = x[i + 1 :] - x[i]
        apart = dx != 0
        yield (y[i + 1 :] - y[i])[apart] / dx[apart]


def _median_slope(x: Floats, y: Floats) -> float:
    n = len(x)
    if n * (n - 1) // 2 <= PAIRS_IN_MEMORY:
        slopes = np.concatenate([np.empty(0), *_slopes(x, y)])
        return float(np.median(slopes)) if len(slopes) else float("nan")
    total = sum(len(part) for part in _slopes(x, y))
    low, high = _bracket(x, y)
    while True:
        below, kept = _between(x, y, low, high)
        wanted = [(total - 1) // 2 - below, total // 2 - below]
        if wanted[0] >= 0 and wanted[1] < len(kept):
            return float(np.mean(np.partition(kept, wanted)[wanted]))
        low, high = low - (high - low), high + (high - low)  # the sample misled: widen, which always ends


def _bracket(x: Floats, y: Floats) -> tuple[float, float]:
    """Two slopes around the median, from every k-th point."""
    step = max(1, len(x) // 1500)
    slopes = np.concatenate(list(_slopes(x[::step], y[::step])))
    low, high = np.percentile(slopes, [47.0, 53.0])
    margin = 1e-12 * max(abs(low), abs(high), 1.0)
    return float(low - margin), float(high + margin)


def _between(x: Floats, y: Floats, low: float, high: float) -> tuple[int, Floats]:
    """How many slopes are below ``low``, and those within [low, high]."""
    below, kept = 0, []
    for part in _slopes(x, y):
        below += int(np.count_nonzero(part < low))
        kept.append(part[(part >= low) & (part <= high)])
    return below, np.concatenate(kept)


def siegel(x: Floats, y: Floats) -> Line:
    """Repeated medians: the median over points of the median slope to all others. Robust to half the points."""
    medians = []
    for i in range(len(x)):
        dx = x - x[i]
        apart = dx != 0
        if apart.any():
            medians.append(float(np.median((y[apart] - y[i]) / dx[apart])))
    slope = float(np.median(medians)) if medians else float("nan")
    return Line(slope, float(np.median(y - slope * x)))


def deming(x: Floats, y: Floats, ratio: float) -> Line:
    """Errors in both; ``ratio`` = var(error of y)/var(error of x). Not robust."""
    sxx, syy = float(np.var(x, ddof=1)), float(np.var(y, ddof=1))
    sxy = float(np.cov(x, y, ddof=1)[0, 1])
    if sxy == 0:
        return Line(float("nan"), float("nan"))
    slope = (syy - ratio * sxx + np.sqrt((syy - ratio * sxx) ** 2 + 4 * ratio * sxy**2)) / (2 * sxy)
    return Line(float(slope), float(np.mean(y) - slope * np.mean(x)))


def ordinary(x: Floats, y: Floats) -> Line:
    """Least squares of y on x."""
    slope = float(np.cov(x, y, ddof=1)[0, 1] / np.var(x, ddof=1)) if np.ptp(x) > 0 else float("nan")
    return Line(slope, float(np.mean(y) - slope * np.mean(x)))


@dataclass(frozen=True)
class Bootstrap:
    """95 % intervals of slope, intercept and x-intercept ``-b/m``; ``resamples`` as drawn."""

    slope: tuple[float, float]
    intercept: tuple[float, float]
    crossing: tuple[float, float]
    resamples: int


def bootstrap(x: Floats, y: Floats, resamples: int) -> Bootstrap:
    """Theil-Sen of resampled points, seeded by the points themselves: the same data give the same interval.

    ``x``, ``y`` sorted by (x, y). All pair slopes are sorted once; a resample weighs them by how often both points
    were drawn. Fewer resamples are drawn for many points, so that the work stays below ``WORK``, and they are
    weighed in blocks of bounded size.
    """
    step = -(-len(x) // POINTS_RESAMPLED)
    x, y = x[::step], y[::step]
    slopes, ends = sorted_slopes(x, y)
    draws = max(min(resamples, RESAMPLES_MIN), min(resamples, WORK // max(len(slopes), 1)))
    drawn = np.random.default_rng(seed(x, y)).integers(0, len(x), (draws, len(x)))
    block = max(1, PAIRS_IN_MEMORY // max(len(slopes), 1))
    made = np.concatenate([resampled(x, y, slopes, ends, drawn[at : at + block]) for at in range(0, draws, block)])
    made = made[np.isfinite(made).all(axis=1)]
    if not len(made):
        unknown = (float("nan"), float("nan"))
        return Bootstrap(unknown, unknown, unknown, draws)
    low, high = np.percentile(made, [TAIL, 100 - TAIL], axis=0)
    intervals = [(float(start), float(end)) for start, end in zip(low, high, strict=True)]
    return Bootstrap(intervals[0], intervals[1], intervals[2], draws)


def sorted_slopes(x: Floats, y: Floats) -> tuple[Floats, tuple[np.ndarray, np.ndarray]]:
    """Slopes of all pairs with different x in rising order, and the two points of each."""
    left, right = np.triu_indices(len(x), 1)
    apart = x[left] != x[right]
    left, right = left[apart], right[apart]
    slopes = (y[right] - y[left]) / (x[right] - x[left])
    order = np.argsort(slopes, kind="stable")
    return slopes[order], (left[order], right[order])


def resampled(x: Floats, y: Floats, slopes: Floats, ends: tuple[np.ndarray, np.ndarray], drawn: np.ndarray) -> Floats:
    """Slope, intercept and crossing of each resample (a row of ``drawn``): weighted medians of the sorted slopes."""
    if not len(slopes):
        return np.full((len(drawn), 3), np.nan)
    times = _times(drawn, len(x))
    upto = times[ends[0]]
    upto *= times[ends[1]]
    np.cumsum(upto, axis=0, out=upto)
    total = upto[-1]
    middle = [np.minimum((upto <= at).sum(axis=0), len(slopes) - 1) for at in ((total - 1) // 2, total // 2)]
    slope = np.where(total > 0, (slopes[middle[0]] + slopes[middle[1]]) / 2, np.nan)
    intercept = np.median(y[drawn] - slope[:, None] * x[drawn], axis=1)
    with np.errstate(invalid="ignore", divide="ignore"):
        return np.stack([slope, intercept, -intercept / slope], axis=1)


def _times(drawn: np.ndarray, size: int) -> np.ndarray:
    """How often each point was drawn: a point a row, a resample a column, so that whole rows are taken together."""
    places = drawn + size * np.arange(len(drawn))[:, None]
    counts = np.bincount(places.ravel(), minlength=size * len(drawn)).reshape(len(drawn), size)
    return np.ascontiguousarray(counts.T, dtype=np.int32)


def seed(x: Floats, y: Floats) -> int:
    """A number made of the data, the same on every machine."""
    content = np.ascontiguousarray(np.stack([x, y]), dtype="<f8").tobytes()
    return int.from_bytes(hashlib.sha256(content).digest()[:8], "big")
