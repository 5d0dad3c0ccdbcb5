"""Cuttings and core of one formation that do not agree."""

from dataclasses import dataclass

import numpy as np
import pandas as pd

from qc.rules.facts import core, hydrogen_index, not_rock, valid_tmax
from qc.rules.robust import madn
from qc.rules.rule import FIRE, NOT_APPLICABLE, PASS, WARN, Answer, Finding, Rule, say
from qc.rules.spans import Floats, exact
from qc.rules.table import Table

VALUES_SHOWN = 60


@dataclass(frozen=True)
class Compared:
    """Medians of cuttings and core, their difference and twice its standard error."""

    cuttings: float
    core: float
    away: float
    error: float


def compare(cuttings: Floats, cores: Floats) -> Compared:
    error = 2 * float(np.sqrt(madn(cuttings) ** 2 / len(cuttings) + madn(cores) ** 2 / len(cores)))
    middle = float(np.median(cuttings)), float(np.median(cores))
    return Compared(*middle, middle[0] - middle[1], error)


def check(
    table: Table, *, apart_max: float, samples_min: int, toc_relative: float, hi_relative: float, tmax_away: float, s2_min: float
) -> Answer:  # fmt: skip
    """One check a quantity (TOC, HI, Tmax) for each formation with enough cuttings and core within 5 m of each other."""
    rows = table.of("pyrolysis")
    rows = rows[~not_rock(rows) & rows["unit"].ne("") & rows["top_m"].notna()]
    values = {"TOC": exact(rows, "TOC"), "HI": hydrogen_index(rows), "TMAX": valid_tmax(rows, s2_min)}
    least = {"TOC": (toc_relative, True), "HI": (hi_relative, True), "TMAX": (tmax_away, False)}
    own = rows.assign(**{f"_{name}": one for name, one in values.items()}, _core=core(rows))
    outcomes: list[tuple[int, str]] = []
    findings: list[Finding] = []
    for _, unit in own.groupby(["well", "unit"], sort=True):
        cuttings, cores = unit[unit["kind"] == "cuttings"], unit[unit["_core"]]
        if cuttings.empty or cores.empty:
            continue
        cuttings, cores = near(cuttings, cores, apart_max), near(cores, cuttings, apart_max)
        for name, limit in least.items():
            outcome, finding = _judged(name, cuttings, cores, samples_min, limit)
            outcomes.append((int(unit.index[0]), outcome))
            findings += [finding] if finding else []
    return Answer(
        pd.Series([one for _, one in outcomes], index=[row for row, _ in outcomes], dtype=object), findings
    )  # fmt: skip


def near(rows: pd.DataFrame, others: pd.DataFrame, apart_max: float) -> pd.DataFrame:
    """Rows with one of the others no farther than ``apart_max`` from their interval [m]."""
    depth = np.sort(others["top_m"].to_numpy(dtype=float))
    top = rows["top_m"].to_numpy(dtype=float)
    base = np.where(rows["base_m"].isna(), top, rows["base_m"].to_numpy(dtype=float))
    ends = np.where(others["base_m"].isna(), others["top_m"], others["base_m"]).astype(float)
    reach = float(np.max(ends - others["top_m"].to_numpy(dtype=float))) if len(others) else 0.0
    first = np.searchsorted(depth, top - apart_max - reach)
    last = np.searchsorted(depth, base + apart_max, side="right")
    return rows[last > first]


def _judged(
    name: str, cuttings: pd.DataFrame, cores: pd.DataFrame, samples_min: int, limit: tuple[float, bool]
) -> tuple[str, Finding | None]:
    """Outcome of one quantity of one formation."""
    one, other = cuttings[f"_{name}"].dropna(), cores[f"_{name}"].dropna()
    if min(len(one), len(other)) < samples_min:
        return NOT_APPLICABLE, None
    made = compare(one.to_numpy(), other.to_numpy())
    least = limit[0] * abs(made.core) if limit[1] else limit[0]
    if abs(made.away) <= max(made.error, least):
        return PASS, None
    unit = str(cuttings["unit"].iloc[0])
    text = (
        f"In {unit} the median {name} of {len(one)} cuttings is {say(made.cuttings)}, of {len(other)} core samples within reach "
        f"{say(made.core)}: they differ by {say(abs(made.away))}, more than {say(max(made.error, least))}."
    )
    more = {
        "cuttings": np.sort(one.to_numpy())[:VALUES_SHOWN].round(4).tolist(),
        "core": np.sort(other.to_numpy())[:VALUES_SHOWN].round(4).tolist(),
        "alternatives": ["cavings or drilling additives in the cuttings", "core taken in a thin rich bed that cuttings average over", "lag of the cuttings"],
        "discriminating_test": "thickness-weighted mean of the core; hand-picked cuttings",
    }  # fmt: skip
    rows = tuple(int(row) for row in (*one.index, *other.index))
    analyte = name
    return FIRE, Finding(
        None,
        analyte,
        WARN,
        text,
        ("TOC", "S2", "TMAX"),
        round(made.away, 4),
        round(made.error, 4),
        rows=rows,
        more=more,
    )


RULE = Rule(
    id="cuttings_core_bias",
    family="contamination",
    title="Cuttings and core agree",
    tests="Medians of TOC, HI and Tmax of cuttings and of core in one formation, no more than 5 m apart, are compared.",
    check=check,
    inputs=("TOC", "S2", "TMAX", "sample kind", "formation", "top"),
    flags="TOC, HI or Tmax of the cuttings",
    formula="|median cuttings - median core| > 2 sqrt(MADN²/n + MADN²/n) and > 20 % (TOC, HI) or 4 °C; at least 5 each",
    message="Cuttings and core of one formation disagree",
    source="our default, no publication",
    must_not_fire="With fewer than 5 of either; thin beds: compare with the thickness-weighted mean of the core.",
    example="Cuttings TOC 1.9 (MADN 0.4, n 8), core 3.0 (MADN 0.5, n 12): 1.10 > 0.404 and 37 %, fires.",
)
