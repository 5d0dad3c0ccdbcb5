"""The S2-TOC line of one unit: which samples it is drawn through, and the fit. Four rules read it."""

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

import numpy as np
import pandas as pd

from qc.rules import fits
from qc.rules.facts import not_rock, valid_tmax
from qc.rules.rule import INFO, REJECT, Answer
from qc.rules.spans import Floats, censored, exact
from qc.rules.table import Table

POINTS_SHOWN = 100
CONTAMINATION = (
    "free_oil_crossover", "s1_toc_line", "pi_high_for_maturity", "pi_low_tmax_pair", "oil_based_fluid_interval",
    "additive_signature", "caving_trend_outlier",
)  # fmt: skip
ARITHMETIC = ("index_recalc", "pyro_carbon_balance", "hi_ceiling", "pyro_value_range")


@dataclass(frozen=True)
class Fit:
    """One unit's line. ``rows`` are the samples drawn through; ``judged`` all exact ones, doubted ones too.

    ``reason`` says why nothing may be read from it; empty where it may. ``stated`` is False where no formation is
    known and the whole well stands for a unit.
    """

    unit: str
    kind: str
    well: int
    stated: bool
    rows: tuple[int, ...]
    judged: tuple[int, ...]
    excluded: Mapping[int, str]
    x: Floats
    y: Floats
    line: fits.Line
    reason: str = ""
    missing: bool = False
    unstable: bool = False
    checks: Mapping[str, float] = field(default_factory=dict)
    ends: fits.Bootstrap | None = None

    @property
    def usable(self) -> bool:
        return not self.reason

    @property
    def toc0(self) -> float:
        """TOC at which the line reaches S2 = 0."""
        return -self.line.intercept / self.line.slope if self.line.slope else float("nan")


def stained_rows(answers: Mapping[str, Answer]) -> set[int]:
    """Rows on which a contamination rule fired with more than information, and nobody dismissed it."""
    found: set[int] = set()
    for rule in CONTAMINATION:
        for finding in answers[rule].open if rule in answers else ():
            if finding.severity != INFO:
                found |= set(finding.rows) if finding.row is None else {finding.row}
    return found


def impossible_rows(answers: Mapping[str, Answer]) -> set[int]:
    """Rows whose S2 or TOC arithmetic shows to be wrong, unless that was dismissed."""
    return {
        finding.row
        for rule in ARITHMETIC
        for finding in (answers[rule].open if rule in answers else ())
        if finding.row is not None and finding.severity == REJECT
        if {"S2", "TOC"} & set(finding.more.get("suspects", ["S2"] if rule == "hi_ceiling" else [finding.analyte]))
    }


def fit_units(table: Table, limits: Mapping[str, float]) -> list[Fit]:
    """A fit for each uniform unit: well, formation and sample kind, in the order of the table."""
    rows = table.of("pyrolysis")
    rows = rows[~not_rock(rows) & ((rows["S2_id"] >= 0) | (rows["TOC_id"] >= 0))]
    stained, wrong = stained_rows(table.answers), impossible_rows(table.answers)
    tmax = pd.Series(valid_tmax(rows, limits["s2_min"]), index=rows.index)
    return [
        _fit(group, (stained, wrong), tmax, limits)
        for _, group in rows.groupby(["well", "unit", "kind"], sort=False)
    ]  # fmt: skip


def _fit(rows: pd.DataFrame, doubted: tuple[set[int], set[int]], tmax: pd.Series, limits: Mapping[str, float]) -> Fit:
    excluded = _excluded(rows, doubted, limits)
    used = rows[~rows.index.isin(excluded)]
    order = np.lexsort((used["S2"].to_numpy(), used["TOC"].to_numpy()))
    used = used.iloc[order]
    judged = rows.index[~rows.index.isin([row for row, why in excluded.items() if why not in {STAINED, WRONG}])]
    x, y = used["TOC"].to_numpy(dtype=float), used["S2"].to_numpy(dtype=float)
    made: dict[str, Any] = {
        "unit": str(rows["unit"].iloc[0]), "kind": str(rows["kind"].iloc[0]), "well": int(rows["well"].iloc[0]),
        "stated": bool(rows["unit"].iloc[0]), "rows": tuple(int(row) for row in used.index),
        "judged": tuple(int(row) for row in judged), "excluded": excluded, "x": x, "y": y,
    }  # fmt: skip
    reason, missing = _refusal(x, tmax[used.index], excluded, limits)
    if reason:
        return Fit(**made, line=fits.Line(np.nan, np.nan), reason=reason, missing=missing)
    return _drawn(made, x, y, limits)


STAINED = "a contamination rule fired on it"
WRONG = "its S2 or TOC is arithmetically impossible"


def _excluded(rows: pd.DataFrame, doubted: tuple[set[int], set[int]], limits: Mapping[str, float]) -> dict[int, str]:
    """Samples that the line is not drawn through, each with its reason."""
    reasons = [
        (rows["S2_rej"] | rows["TOC_rej"], "S2 or TOC was rejected"),
        (np.isnan(rows["S2"]) | np.isnan(rows["TOC"]), "S2 or TOC is missing"),
        (censored(rows, "S2") | censored(rows, "TOC"), "S2 or TOC is a bound, not a value"),
        ((rows["TOC"] <= 0) | (rows["S2"] < 0), "TOC or S2 is not possible"),
        (exact(rows, "TOC") > limits["coal_toc"], "coal"),
        (rows.index.isin(doubted[1]), WRONG),
        (rows.index.isin(doubted[0]), STAINED),
    ]
    found: dict[int, str] = {}
    for mask, why in reasons:
        for row in rows.index[np.asarray(mask, dtype=bool)]:
            found.setdefault(int(row), why)
    return found


def _refusal(x: Floats, tmax: pd.Series, excluded: Mapping[int, str], limits: Mapping[str, float]) -> tuple[str, bool]:
    """Why the unit is not fitted, and whether that is for want of an input."""
    n, stained = len(x), sum(why == STAINED for why in excluded.values())
    known = tmax.dropna()
    if n < limits["samples_info"]:
        return f"{n} samples, {limits['samples_info']:.0f} are needed", False
    if stained > limits["contaminated_max"] * (n + stained):
        return f"contamination unresolved on {stained} of {n + stained} samples", False
    if x.max() / x.min() < limits["toc_ratio_min"]:
        return f"TOC spans a factor of {x.max() / x.min():.1f}, {limits['toc_ratio_min']:.0f} is needed", False
    if np.count_nonzero(x < limits["lean_toc"]) < limits["lean_samples_min"]:
        return f"fewer than {limits['lean_samples_min']:.0f} samples below {limits['lean_toc']:.0f} wt% TOC", False
    if len(known) < limits["tmax_samples_min"]:
        return f"{len(known)} valid Tmax: a maturity gradient cannot be ruled out", True
    spread = float(np.subtract(*np.percentile(known, [75, 25])))
    if spread > limits["tmax_iqr_max"]:
        return f"Tmax spreads over {spread:.1f} °C (inter-quartile): a maturity gradient", False
    return "", False


def _drawn(made: dict[str, Any], x: Floats, y: Floats, limits: Mapping[str, float]) -> Fit:
    line = fits.theil_sen(x, y)
    others = {"siegel": fits.siegel(x, y), "deming": fits.deming(x, y, limits["deming_ratio"])}
    apart = max((abs(other.slope / line.slope - 1) for other in others.values()), default=0.0) if line.slope else np.inf
    checks = {
        "slope_siegel": others["siegel"].slope, "intercept_siegel": others["siegel"].intercept,
        "slope_deming": others["deming"].slope, "slope_ordinary": fits.ordinary(x, y).slope,
        "intercept_ordinary": fits.ordinary(x, y).intercept,
        "intercept_joint_medians": fits.joint_intercept(x, y, line.slope), "slopes_apart": float(apart),
    }  # fmt: skip
    unstable = not apart <= limits["instability_max"] or not line.slope > 0
    # the interval decides only where the line misses the origin; it is costly, so it is not drawn elsewhere
    misses = line.slope > 0 and (line.intercept > 0 or -line.intercept / line.slope >= limits["toc0_min"])
    ends = fits.bootstrap(x, y, int(limits["resamples"])) if misses else None
    return Fit(**made, line=line, unstable=unstable, checks=checks, ends=ends)


def evidence(fit: Fit, table: Table) -> dict[str, Any]:
    """The fit as evidence: numbers, interval, and the points to draw (thinned where there are many)."""
    step = max(1, -(-len(fit.x) // POINTS_SHOWN))
    ends = fit.ends
    excluded = [f"{table.name(row)}: {why}" for row, why in list(fit.excluded.items())[:12]]
    drawn: dict[str, Any] = {
        "x": [round(float(value), 3) for value in fit.x[::step]],
        "y": [round(float(value), 3) for value in fit.y[::step]],
        "n": len(fit.x), "points_shown": len(fit.x[::step]),
        "slope": round(fit.line.slope, 4), "intercept": round(fit.line.intercept, 4),
        "intercept_convention": "median(y - m x)", "toc0": round(fit.toc0, 4), "hi_star": round(100 * fit.line.slope, 1),
        **{name: round(float(value), 4) for name, value in fit.checks.items()},
    }  # fmt: skip
    if ends:
        drawn["ci95"] = {name: [round(end, 4) for end in getattr(ends, name)] for name in ("slope", "intercept")}
        drawn["ci95"]["toc0"] = [round(end, 4) for end in ends.crossing]
        drawn["resamples"] = ends.resamples
    unit = {"formation": fit.unit or "not stated", "kind": fit.kind}
    return {"fit": drawn, "unit": unit, "excluded": excluded, "excluded_count": len(fit.excluded)}
