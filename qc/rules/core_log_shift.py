"""How far a core run must be moved to lie on the log: core gamma against wireline gamma."""

from typing import Any

import numpy as np
import pandas as pd

from qc.rules.gamma import Match, core_to_log
from qc.rules.rule import CANNOT_EVALUATE, FIRE, INFO, NOT_APPLICABLE, PASS, WARN, Answer, Finding, Rule
from qc.rules.spans import Floats, exact
from qc.rules.table import CORE_KINDS, Table

LAGS_SHOWN = 201
READINGS_MIN = 5


def check(
    table: Table, *, reach: float, resolution: float, r_min: float, margin_min: float, apart: float, length_min: float,
    shift_min: float, neighbours_max: float,
) -> Answer:  # fmt: skip
    """One check for each core run of a well with core gamma: its shift, and how it agrees with that of the run before."""
    rows = table.of("gamma")
    rows = rows[rows["kind"].isin(CORE_KINDS) & rows["top_m"].notna() & ~rows["depth_kind"].isin(["TVD", "logger"])]
    outcomes: list[tuple[int, str]] = []
    findings: list[Finding] = []
    for well, own in rows.groupby("well", sort=True):
        log = total_gamma(table, well)
        runs = table.cores[table.cores["well"] == well].sort_values("number")
        if log is None or runs.empty:
            outcomes.append((int(own.index[0]), CANNOT_EVALUATE))
            continue
        before: float | None = None
        run: Any
        for run in runs.itertuples():
            members = own[(own["top_m"] >= run.top_m) & (own["top_m"] <= run.base_m)].sort_values(
                "top_m", kind="stable"
            )
            if members.empty:
                continue
            fitted = _fit(members, log, length_min, {"reach": reach, "resolution": resolution, "apart": apart})
            outcome, finding = _judged(
                members, run, fitted, before, limits=(r_min, margin_min, shift_min, neighbours_max)
            )
            if fitted and fitted.accepted(r_min, margin_min):
                before = fitted.shift
            outcomes.append((int(members.index[0]), outcome))
            findings += [finding] if finding else []
    return Answer(
        pd.Series([one for _, one in outcomes], index=[row for row, _ in outcomes], dtype=object), findings
    )  # fmt: skip


def total_gamma(table: Table, well: Any) -> tuple[Floats, Floats] | None:
    """The total gamma curve of the well with the most values; the first by name among equals."""
    curves = table.curves[(table.curves["well"] == well) & (table.curves["quantity"] == "gamma")]
    sizes = [int((~np.isnan(np.asarray(values, dtype=float))).sum()) for values in curves["values"]]
    if not sizes or max(sizes) < 2:
        return None
    best = curves.iloc[int(np.argmax(sizes))]
    depth, values = (np.asarray(best[name], dtype=np.float64) for name in ("depths", "values"))
    order = np.argsort(depth, kind="stable")
    return depth[order], values[order]


def _fit(members: pd.DataFrame, log: tuple[Floats, Floats], length_min: float, how: dict[str, float]) -> Match | None:
    """The best shift of one run; None where the run is too short, or nothing can be correlated."""
    gamma = pd.Series(exact(members, "GR"), index=members["top_m"]).dropna().groupby(level=0).mean()
    depth: Floats = np.asarray(gamma.index, dtype=np.float64)
    if len(depth) < READINGS_MIN or depth[-1] - depth[0] < length_min:
        return None
    return core_to_log((depth, np.asarray(gamma, dtype=np.float64)), log, **how)


def _judged(
    members: pd.DataFrame, run: Any, fitted: Match | None, before: float | None, *, limits: tuple[float, float, float, float]
) -> tuple[str, Finding | None]:  # fmt: skip
    r_min, margin_min, shift_min, neighbours_max = limits
    if fitted is None or not fitted.accepted(r_min, margin_min):
        return NOT_APPLICABLE, None
    recorded = 0.0 if run.shift_m is None or np.isnan(run.shift_m) else float(run.shift_m)
    away = fitted.shift - recorded
    jump = before is not None and abs(fitted.shift - before) > neighbours_max
    if abs(away) < shift_min - 1e-9 and not jump:
        return PASS, None
    text = (
        f"Core {run.number:.0f} fits the log best when moved by {fitted.shift:+.2f} m (r {fitted.r:.3f}, next best {fitted.runner_up:.3f}); "
        f"the recorded shift is {recorded:+.2f} m."
    )
    if jump:
        text += f" The run above needs {before:+.2f} m."
    step = max(1, -(-len(fitted.lags) // LAGS_SHOWN))
    more = {
        "interval_m": [float(run.top_m), float(run.base_m)], "shift_m": round(fitted.shift, 3), "recorded_m": recorded,
        "lags_m": fitted.lags[::step].round(3).tolist(), "r": np.round(fitted.correlations[::step], 4).tolist(),
        "proposal": f"log depth = core depth {fitted.shift:+.2f} m; to be applied by a person, who keeps the reported depth",
        "alternatives": ["core pieces lost within the run: fit them apart", "potassium mud or another gamma in the log", "run recorded at a wrong depth"],
        "discriminating_test": "overlay of both curves at the shift; spectral gamma",
    }  # fmt: skip
    rows = tuple(int(row) for row in members.index)
    return FIRE, Finding(
        None, "GR", WARN if jump else INFO, text, ("GR",), round(away, 3), shift_min, rows=rows, more=more
    )


RULE = Rule(
    id="core_log_shift",
    family="depth",
    title="Core depth against log depth",
    tests="Core gamma of each run is correlated with wireline gamma over shifts of ±10 m.",
    check=check,
    inputs=("GR", "core runs and their shift", "wireline gamma"),
    flags="the core run",
    formula=(
        "r at each shift; accepted with r >= 0.7, at least 0.1 above any shift 1 m away or more, core of 5 m or more; |shift - recorded| "
        ">= 0.3 m: information; runs differing by > 3 m: warning"
    ),
    message="The core does not lie at its log depth",
    source="our default, no publication; differences of 10-30 ft in deep wells are named on a public glossary page",
    must_not_fire="On flat gamma or r below 0.7 (not applicable); nothing is ever shifted by it.",
    example=(
        "Log 60 62 61 80 120 118 85 64 60 58 75 95 70 61 60, core 61 79 121 117 86 63 61: r 0.999 at a shift of 2 samples, next "
        "best 0.837: accepted."
    ),
)
