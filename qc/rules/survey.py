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


def at_depth(md: Floats, inclination_deg: Floats, azimuth_deg: Floats, wanted: Floats) -> Floats:
    """TVD at the measured depths ``wanted``, along the arc between stations; straight on above the first and below the last.

    The well is vertical down to a first station below its datum.
    """
    inc, azi = np.radians(inclination_deg), np.radians(azimuth_deg)
    stations = md[0] + path(md, inclination_deg, azimuth_deg)[0]
    place = np.clip(np.searchsorted(md, wanted, side="right") - 1, 0, len(md) - 2)
    beta = dogleg(inc[:-1], azi[:-1], inc[1:], azi[1:])[place]
    share = (wanted - md[place]) / (md[place + 1] - md[place])
    bent = beta > SMALL
    safe = np.where(bent, beta, 1.0)
    # direction at the share s of an arc: (sin((1-s)b) t1 + sin(s b) t2) / sin b, a great circle between the two tangents
    step = md[place + 1] - md[place]
    first, last = np.cos(inc[place]), np.cos(inc[place + 1])
    arc = (first * (np.cos((1 - share) * safe) - np.cos(safe)) + last * (1 - np.cos(share * safe))) / np.sin(safe)
    tvd = stations[place] + step * np.where(bent, arc / safe, share * (first + last) / 2)
    tvd = np.where(wanted > md[-1], stations[-1] + (wanted - md[-1]) * np.cos(inc[-1]), tvd)
    return np.where(wanted < md[0], wanted, tvd)
