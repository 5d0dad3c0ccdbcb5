"""True vertical depth by minimum curvature."""

import numpy as np

from qc.rules.spans import Floats

SMALL = 1e-4  # rad; below it the series 1 + b^2/12 is exact to double precision


def dogleg(inc1: Floats, azi1: Floats, inc2: Floats, azi2: Floats) -> Floats:
    """Angle between two directions; all in radians."""
    cosine = np.cos(inc2 - inc1) - np.sin(inc1) * np.sin(inc2) * (1 - np.cos(azi2 - azi1))
    return np.arccos(np.clip(cosine, -1.0, 1.0))


def ratio_factor(beta: Floats) -> Floats:
    """``(2/b) tan(b/2)``, 1 for a straight piece."""
    safe = np.where(beta > SMALL, beta, 1.0)
    return np.where(beta > SMALL, 2 / safe * np.tan(safe / 2), 1 + beta**2 / 12)


def path(md: Floats, inclination_deg: Floats, azimuth_deg: Floats) -> tuple[Floats, Floats, Floats]:
    """(TVD, north, east) at each station, in the unit of ``md``, measured from the first station.

    Example published on drillingformulas.com («Minimum Curvature Method»): 3500 ft I15 A20 to 3600 ft I25 A45 gives
    N 27.22, E 19.45, TVD 94.01 ft. The page prints a ratio factor of 1.00408; its own figures need 1.00428.
    """
    inc, azi = np.radians(inclination_deg), np.radians(azimuth_deg)
    half = np.diff(md) / 2 * ratio_factor(dogleg(inc[:-1], azi[:-1], inc[1:], azi[1:]))
    steps = (np.cos(inc), np.sin(inc) * np.cos(azi), np.sin(inc) * np.sin(azi))
    tvd, north, east = (np.concatenate([[0.0], np.cumsum(half * (step[:-1] + step[1:]))]) for step in steps)
    return tvd, north, east
