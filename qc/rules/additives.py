"""The table of additives and their signs (additives.toml), and how much of a measured additive would explain a sample."""

import re
import tomllib
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import cache
from pathlib import Path
from typing import Any

import numpy as np

from qc.rules.spans import Floats

MIXED = ("TOC", "S1", "S2", "S3")  # these mix in proportion to mass
COVERAGE = 2.0  # standard uncertainties in the interval shown


@dataclass(frozen=True)
class Material:
    """One additive: words of the mud record, its signs, what else shows it and the test that would."""

    name: str
    record: tuple[str, ...]
    signs: tuple[Mapping[str, Any], ...]
    other: str
    test: str
    needs: str = ""
    mark: str = "MEM"
    source: str = ""

    def recorded(self, additives: str) -> bool:
        return any(re.search(word, additives, re.IGNORECASE) for word in self.record)


@cache
def materials() -> tuple[Material, ...]:
    listed = tomllib.loads((Path(__file__).parent / "additives.toml").read_text(encoding="utf-8"))["materials"]
    return tuple(Material(**{**one, "record": tuple(one["record"]), "signs": tuple(one["signs"])}) for one in listed)


def quantities() -> tuple[str, ...]:
    """Every quantity that a sign reads, in a fixed order."""
    return tuple(sorted({sign["of"] for material in materials() for sign in material.signs}))


def sign_in_words(sign: Mapping[str, Any]) -> str:
    if "from" in sign:
        return f"{sign['of']} in {sign['from']:g}-{sign['to']:g}"
    return f"{sign['of']} {'raised' if sign.get('raised') else 'lowered' if sign.get('lowered') else 'out of line'}"


@dataclass(frozen=True)
class Mixture:
    """Share of one additive [fraction of mass] that explains a sample best, its interval and what stays unexplained.

    ``misfit`` is the root mean square of the residuals in their own uncertainties: near 1 or below is a good fit.
    """

    additive: str
    share: float
    low: float
    high: float
    misfit: float
    quantities: tuple[str, ...]

    def record(self) -> dict[str, Any]:
        return {
            "additive": self.additive, "share_wt_percent": round(100 * self.share, 3),
            "interval_wt_percent": [round(100 * self.low, 3), round(100 * self.high, 3)], "misfit": round(self.misfit, 3),
            "from": list(self.quantities),
        }  # fmt: skip


def mixture(name: str, sample: Floats, rock: Floats, additive: Floats, scale: Floats) -> Mixture | None:
    """Weighted least squares of ``sample = (1 - f) rock + f additive`` over the quantities ``MIXED``.

    ``scale`` is the standard uncertainty of each quantity of the rock. None where fewer than two quantities are known
    everywhere, or rock and additive are alike. The share is kept within [0, 1]; the interval is ``COVERAGE`` standard
    uncertainties, widened by the misfit.
    """
    known = ~np.isnan(np.stack([sample, rock, additive, scale])).any(axis=0) & (scale > 0)
    if known.sum() < 2:
        return None
    away, span, weight = (sample - rock)[known], (additive - rock)[known], 1 / scale[known] ** 2
    information = float(np.sum(weight * span**2))
    if information <= 0:
        return None
    share = float(np.clip(np.sum(weight * span * away) / information, 0.0, 1.0))
    left = away - share * span
    misfit = float(np.sqrt(np.sum(weight * left**2) / max(int(known.sum()) - 1, 1)))
    spread = COVERAGE * max(misfit, 1.0) / np.sqrt(information)
    used = tuple(name for name, held in zip(MIXED, known, strict=True) if held)
    return Mixture(name, share, max(share - spread, 0.0), min(share + spread, 1.0), misfit, used)


def best_first(mixtures: Sequence[Mixture]) -> list[Mixture]:
    """Those that explain the sample best first; shares of nothing left out."""
    return sorted((one for one in mixtures if one.share > 0), key=lambda one: (one.misfit, one.additive))
