"""Hartigan's dip test of one mode (Hartigan & Hartigan 1985, Annals of Statistics 13:70)."""

from functools import cache

import numpy as np

from qc.rules.spans import Floats

DRAWS = 400  # uniform samples that a dip is ranked among
SEED = 1985
Touch = np.ndarray


def dip(values: Floats) -> float:
    """Distance of the empirical distribution from the nearest one with a single mode: 1/(2n) at least, 1/4 at most."""
    x, counts = np.unique(values, return_counts=True)
    step = counts / counts.sum()
    rise = np.cumsum(step)
    largest = 1 / len(values)
    while len(x) > 1:
        minorant, low = _minorant(x, rise - step)
        majorant, high = _majorant(x, rise)
        left, right, gap = _modal(majorant - minorant, low, high)
        if gap <= largest:
            break
        largest = max(
            largest, float((rise - minorant)[: left + 1].max()), float((majorant - rise + step)[right:].max())
        )
        if left == 0 and right == len(x) - 1:
            break
        x, rise, step = x[left : right + 1], rise[left : right + 1], step[left : right + 1]
    return largest / 2


def _modal(gaps: Floats, low: Touch, high: Touch) -> tuple[int, int, float]:
    """Ends of the modal interval, where the majorant stands farthest above the minorant, and how far."""
    if gaps[high].max() > gaps[low].max():
        right = high[gaps[high] == gaps[high].max()][-1]
        return int(low[low <= right][-1]), int(right), float(gaps[high].max())
    left = low[gaps[low] == gaps[low].max()][0]
    return int(left), int(high[high >= left][0]), float(gaps[low].max())


def _minorant(x: Floats, y: Floats) -> tuple[Floats, Touch]:
    """Greatest convex function below the points, at each of them, and where it touches."""
    kept: list[int] = []
    for place in range(len(x)):
        while len(kept) > 1 and _slope(x, y, kept[-2], kept[-1]) >= _slope(x, y, kept[-1], place):
            kept.pop()
        kept.append(place)
    return np.interp(x, x[kept], y[kept]), np.array(kept)


def _majorant(x: Floats, y: Floats) -> tuple[Floats, Touch]:
    """Least concave function above the points."""
    made, kept = _minorant(x, -y)
    return -made, kept


def _slope(x: Floats, y: Floats, one: int, other: int) -> float:
    return float((y[other] - y[one]) / (x[other] - x[one]))


@cache
def _drawn(size: int) -> Floats:
    """Dips of uniform samples, rising."""
    stream = np.random.default_rng([SEED, size])
    return np.sort([dip(stream.uniform(size=size)) for _ in range(DRAWS)])


def p_value(values: Floats) -> float:
    """Share of uniform samples of the same size with a dip at least as large; the same on every machine."""
    drawn = _drawn(len(values))
    above = len(drawn) - int(np.searchsorted(drawn, dip(values) - 1e-12, side="left"))
    return (above + 1) / (len(drawn) + 1)
