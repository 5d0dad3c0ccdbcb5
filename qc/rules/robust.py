"""Robust scale: median absolute deviation and modified z-scores (Iglewicz & Hoaglin 1993)."""

import numpy as np

from qc.rules.spans import Floats

NORMAL = 1.4826  # MAD to standard deviation for a normal distribution
MEAN_DEVIATION = 1.2533  # the same for the mean absolute deviation, used where the MAD is 0


def madn(values: Floats) -> float:
    """``1.4826 MAD``; where that is 0, ``1.2533 * mean absolute deviation``; NaN for no values."""
    values = values[~np.isnan(values)]
    if not len(values):
        return float("nan")
    away = np.abs(values - np.median(values))
    scale = NORMAL * float(np.median(away))
    return scale if scale > 0 else MEAN_DEVIATION * float(np.mean(away))


def modified_z(values: Floats) -> Floats:
    """``(x - median) / MADN``. All NaN where the scale is 0: not an infinite score, but no score."""
    scale = madn(values)
    if not scale > 0:
        return np.full(len(values), np.nan)
    return (values - np.nanmedian(values)) / scale
