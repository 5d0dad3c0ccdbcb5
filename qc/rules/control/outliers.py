"""Outliers and consensus among replicates: Grubbs, Cochran, algorithm A, Horwitz. Pure functions of arrays."""

from dataclasses import dataclass

import numpy as np
from scipy import stats

from qc.rules.spans import Floats

CLIP = 1.5  # ISO 13528, algorithm A (read in three pages, e.g. PMC7084476)
START = 1.483
RESCALE = 1.134
ROUNDS = 200


def grubbs(values: Floats) -> tuple[float, int]:
    """(G, place) of the value farthest from the mean: ``max|x - mean| / s``; NaN where s is 0."""
    away = np.abs(values - values.mean())
    spread = float(np.std(values, ddof=1))
    place = int(np.argmax(away))
    return (float(away[place]) / spread if spread > 0 else float("nan")), place


def grubbs_critical(n: int, alpha: float = 0.05, *, two_sided: bool = False) -> float:
    """Critical G for n values: ``(n-1)/sqrt(n) sqrt(t^2/(n-2+t^2))``, t at alpha/n, or alpha/2n two-sided."""
    t = stats.t.isf(alpha / (2 * n if two_sided else n), n - 2)
    return float((n - 1) / np.sqrt(n) * np.sqrt(t**2 / (n - 2 + t**2)))


def cochran(groups: Floats) -> tuple[float, int]:
    """(C, place) of the group of the largest variance: ``s2max / sum of s2``; groups (p, n) of equal size."""
    variances = np.var(groups, axis=1, ddof=1)
    whole, place = float(variances.sum()), int(np.argmax(variances))
    return (float(variances[place]) / whole if whole > 0 else float("nan")), place


def cochran_critical(p: int, n: int, alpha: float) -> float:
    """Critical C for p groups of n: ``1 / (1 + (p-1)/F(alpha/p; n-1, (p-1)(n-1)))``. ISO 5725-2, from memory."""
    f = stats.f.isf(alpha / p, n - 1, (p - 1) * (n - 1))
    return float(1 / (1 + (p - 1) / f))


@dataclass(frozen=True)
class Consensus:
    """Robust mean and deviation, with (mean, deviation) of every round; NaN deviation where half the values are alike."""

    mean: float
    deviation: float
    rounds: tuple[tuple[float, float], ...]


def algorithm_a(values: Floats) -> Consensus:
    """Robust mean and standard deviation by clipping at 1.5 s* until the third significant figure stands (ISO 13528)."""
    mean = float(np.median(values))
    deviation = START * float(np.median(np.abs(values - mean)))
    log = [(mean, deviation)]
    if not deviation > 0:
        return Consensus(mean, float("nan"), tuple(log))
    for _ in range(ROUNDS):
        clipped = np.clip(values, mean - CLIP * deviation, mean + CLIP * deviation)
        made, spread = float(clipped.mean()), RESCALE * float(np.std(clipped, ddof=1))
        log.append((made, spread))
        still = abs(made - mean) < 1e-6 * abs(made) and abs(spread - deviation) < 1e-6 * spread
        mean, deviation = made, spread
        if still:
            break
    return Consensus(mean, deviation, tuple(log))


def horwitz(fraction: float) -> float:
    """Predicted relative standard deviation between laboratories [%] at a mass fraction: ``2^(1 - 0.5 log10 C)``."""
    return float(2 ** (1 - 0.5 * np.log10(fraction)))


def thompson(fraction: float) -> float:
    """The same with Thompson's ends: 22 % below 1.2e-7, ``sigma = 0.01 C^0.5`` above 0.138 (from memory)."""
    if fraction < 1.2e-7:
        return 22.0
    return 100 * 0.01 * float(np.sqrt(fraction)) / fraction if fraction > 0.138 else horwitz(fraction)


def horrat(observed: float, fraction: float) -> float:
    """Observed relative standard deviation [%] over the predicted one; 0.5 to 2 is acceptable (IUPAC Gold Book 08078)."""
    return observed / thompson(fraction)


def repeatability(pairs: Floats) -> float:
    """Repeatability standard deviation of k pairs (k, 2): ``sqrt(sum of squared differences / 2k)``."""
    away = pairs[:, 0] - pairs[:, 1]
    return float(np.sqrt(np.sum(away**2) / (2 * len(away))))


def relative_difference(one: float, other: float) -> float:
    """Relative percent difference ``100 |x1 - x2| / ((x1 + x2) / 2)``, as San Joaquin County's laboratory pages define it.

    One public plan prints the denominator with a minus sign: a misprint, not copied.
    """
    return 100 * abs(one - other) / ((one + other) / 2)
