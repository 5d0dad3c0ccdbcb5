"""True vertical depth of samples along a surveyed borehole."""

from collections.abc import Sequence

import numpy as np

from qc.rules.survey import dogleg, path, ratio_factor

STRAIGHT = 1e-9  # rad


def tvd_of(depths_md_m: Sequence[float | None], survey: Sequence[Sequence[float]]) -> list[float | None]:
    """True vertical depth [m] below the datum of each measured depth [m], by minimum curvature along the arc.

    ``survey``: stations (md [m], inclination, azimuth [degrees]) downward; the hole is taken as vertical from the
    datum if the first station lies deeper. None above the datum, below the last station and where depth is None.
    Source: Sawaryn and Thorogood 2005, SPE Drilling & Completion 20(1), 24-36.
    """
    stations = np.asarray(survey, dtype=float)
    if stations[0, 0] > 0:
        stations = np.vstack([[0.0, 0.0, stations[0, 2]], stations])
    known = np.array([np.nan if depth is None else depth for depth in depths_md_m], dtype=float)
    inside = (known >= stations[0, 0]) & (known <= stations[-1, 0])
    found = np.full(len(known), np.nan)
    if len(stations) > 1:
        found[inside] = _along(known[inside], stations)
    elif inside.any():
        found[inside] = known[inside]
    return [None if np.isnan(tvd) else float(tvd) for tvd in found]


def _along(md: np.ndarray, stations: np.ndarray) -> np.ndarray:
    """TVD at depths between the first and the last station: the arc of each piece, cut at the depth."""
    lengths, inc, azi = stations[:, 0], np.radians(stations[:, 1]), np.radians(stations[:, 2])
    tops = lengths[0] + path(*stations.T)[0]
    piece = np.clip(np.searchsorted(lengths, md, side="right") - 1, 0, len(lengths) - 2)
    covered = md - lengths[piece]
    share = covered / np.diff(lengths)[piece]
    beta = dogleg(inc[:-1], azi[:-1], inc[1:], azi[1:])[piece]
    here, there = np.cos(inc[piece]), np.cos(inc[piece + 1])
    bent = beta > STRAIGHT
    safe = np.where(bent, beta, 1.0)
    turned = (np.sin((1 - share) * safe) * here + np.sin(share * safe) * there) / np.sin(safe)
    down = np.where(bent, turned, here)
    return tops[piece] + covered / 2 * (here + down) * ratio_factor(share * beta)
