"""Median and scale of the nearest samples of the same unit, the sample itself left out."""

import numpy as np
import pandas as pd

from qc.rules.robust import MEAN_DEVIATION, NORMAL
from qc.rules.spans import Floats

WINDOW = 10  # five above and five below, fewer where the unit is small


def around(rows: pd.DataFrame, values: Floats, minimum: int, *, window: int = WINDOW) -> pd.DataFrame:
    """For each row ``median``, ``scale`` (MADN) and ``count`` of its nearest neighbours with a value, in depth.

    Neighbours are of the same well, unit and sample kind; where no unit is known there are none. NaN where they are fewer than ``minimum``, and for a row
    without a value.
    """
    made = pd.DataFrame({"median": np.nan, "scale": np.nan, "count": 0}, index=rows.index)
    known = pd.DataFrame({"value": values, "top": rows["top_m"]}, index=rows.index)[rows["unit"].ne("")].dropna()
    keys = ["well", "unit", "kind"]
    for _, members in rows.loc[known.index].sort_values([*keys, "top_m"], kind="stable").groupby(keys, sort=True):
        size = len(members)
        width = min(window, size - 1)
        made.loc[members.index, "count"] = width
        if width < max(minimum, 1):
            continue
        others = known.loc[members.index, "value"].to_numpy()[_places(size, width)]
        made.loc[members.index, "median"] = np.median(others, axis=1)
        made.loc[members.index, "scale"] = scales(others)
    return made


def _places(size: int, width: int) -> np.ndarray:
    """Places of the ``width`` nearest others of each of ``size`` members in order of depth."""
    at = np.arange(size)
    start = np.clip(at - width // 2, 0, size - 1 - width)
    near = start[:, None] + np.arange(width + 1)[None, :]
    return near[near != at[:, None]].reshape(size, width)


def scales(values: Floats) -> Floats:
    """MADN along each line; from the mean absolute deviation where it is 0."""
    away = np.abs(values - np.median(values, axis=1, keepdims=True))
    made = NORMAL * np.median(away, axis=1)
    return np.where(made > 0, made, MEAN_DEVIATION * np.mean(away, axis=1))
