"""Control charts as pure functions of a series: multirule, EWMA, CUSUM."""

from collections.abc import Sequence

import numpy as np

from qc.rules.spans import Floats

WARNING = "1-2s"
REJECTING = ("1-3s", "2-2s", "R-4s", "4-1s", "10-x")


def multirule(z: Floats, runs: Sequence[object] | None = None, *, by_range: bool = False) -> dict[str, list[int]]:
    """Rule -> places at which it fires, for z-scores in order of time; strict inequalities.

    1-2s warns and alone rejects nothing. R-4s needs two controls of one run (``runs``; None: each value its own run):
    one above +2 and another below -2; ``by_range`` takes the other printed reading, range above 4 s. A value on the
    mean breaks 10-x. Westgard et al. 1981, Clin. Chem. 27:493, as several public pages define the rules.
    """
    runs = list(range(len(z))) if runs is None else list(runs)
    found: dict[str, list[int]] = {
        "1-2s": [int(at) for at in np.flatnonzero(np.abs(z) > 2)],
        "1-3s": [int(at) for at in np.flatnonzero(np.abs(z) > 3)],
        "2-2s": _alike(z, 2, 2.0), "R-4s": _range(z, runs, by_range), "4-1s": _alike(z, 4, 1.0), "10-x": _alike(z, 10, 0.0),
    }  # fmt: skip
    return {rule: places for rule, places in found.items() if places}


def _alike(z: Floats, length: int, limit: float) -> list[int]:
    """Ends of stretches of ``length`` values all above +limit or all below -limit."""
    made = []
    for end in range(length, len(z) + 1):
        stretch = z[end - length : end]
        if (stretch > limit).all() or (stretch < -limit).all():
            made.append(end - 1)
    return made


def _range(z: Floats, runs: Sequence[object], by_range: bool) -> list[int]:
    made = []
    for at, run in enumerate(runs):
        members = np.array([z[other] for other in range(at + 1) if runs[other] == run])
        if len(members) < 2:
            continue
        apart = members.max() - members.min() > 4 if by_range else members.max() > 2 and members.min() < -2
        if apart:
            made.append(at)
    return made


def ewma(x: Floats, target: float, sd: float, *, weight: float = 0.3, width: float = 3.0) -> tuple[Floats, Floats]:
    """(averages, half-widths of the limits): ``w x + (1-w) before`` from the target on; exact half-widths for small t."""
    made, level = np.empty(len(x)), target
    for at, value in enumerate(x):
        level = weight * value + (1 - weight) * level
        made[at] = level
    times = np.arange(1, len(x) + 1)
    return made, width * sd * np.sqrt(weight / (2 - weight) * (1 - (1 - weight) ** (2 * times)))


def cusum(x: Floats, target: float, slack: float) -> tuple[Floats, Floats]:
    """(SH, SL): cumulative sums above target + slack and below target - slack."""
    high, low = np.empty(len(x)), np.empty(len(x))
    up = down = 0.0
    for at, value in enumerate(x):
        up, down = max(0.0, up + value - (target + slack)), max(0.0, down + (target - slack) - value)
        high[at], low[at] = up, down
    return high, low
