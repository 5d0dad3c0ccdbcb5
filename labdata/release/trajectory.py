"""True vertical depth along a surveyed borehole."""

from collections.abc import Sequence

import numpy as np


def tvd_of(depths_md_m: Sequence[float | None], survey: Sequence[Sequence[float]]) -> list[float | None]:
    """True vertical depth [m] below the datum of each measured depth [m], by minimum curvature along the arc.

    ``survey``: stations (md [m], inclination, azimuth [degrees]) downward; the hole is taken as vertical from the
    datum if the first station lies deeper. None above the datum, below the last station and where depth is None.
    Source: Sawaryn and Thorogood 2005, SPE Drilling & Completion 20(1), 24-36.
    """
    stations = np.asarray(survey, dtype=float)
    if stations[0, 0] > 0:
        stations = np.vstack([[0.0, 0.0, stations[0, 2]], stations])
    md, tangents = stations[:, 0], _tangents(stations)
    angles = np.arccos(np.clip((tangents[:-1] * tangents[1:]).sum(axis=1), -1.0, 1.0))
    drops = [
        _drop(length, angle, tangents[i, 2], tangents[i + 1, 2], 1.0)
        for i, (length, angle) in enumerate(zip(np.diff(md), angles, strict=True))
    ]
    tops = md[0] + np.concatenate([[0.0], np.cumsum(drops)])
    found: list[float | None] = []
    for depth in depths_md_m:
        if depth is None or depth < md[0] or depth > md[-1]:
            found.append(None)
            continue
        i = min(int(np.searchsorted(md, depth, side="right")) - 1, len(md) - 2)
        share = (depth - md[i]) / (md[i + 1] - md[i])
        found.append(float(tops[i] + _drop(depth - md[i], angles[i], tangents[i, 2], tangents[i + 1, 2], share)))
    return found


def _tangents(stations: np.ndarray) -> np.ndarray:
    """Unit vectors (north, east, down) along the hole."""
    inclination, azimuth = np.radians(stations[:, 1]), np.radians(stations[:, 2])
    flat = np.sin(inclination)
    return np.column_stack([flat * np.cos(azimuth), flat * np.sin(azimuth), np.cos(inclination)])


def _drop(length: float, angle: float, down_here: float, down_next: float, share: float) -> float:
    """Vertical extent of the first ``length`` of an arc that turns by ``angle`` [rad]; ``share`` of it is covered."""
    if angle < 1e-9:
        return length * down_here
    down_there = (np.sin((1 - share) * angle) * down_here + np.sin(share * angle) * down_next) / np.sin(angle)
    turned = share * angle
    factor = 1.0 if turned < 1e-9 else 2 / turned * np.tan(turned / 2)
    return float(length / 2 * (down_here + down_there) * factor)
