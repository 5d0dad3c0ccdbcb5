"""Pyrolysable carbon cannot exceed total organic carbon."""

import numpy as np
import pandas as pd

from qc.rules.facts import not_rock
from qc.rules.rule import REJECT, WARN, Answer, Finding, Rule, fired, judge, say
from qc.rules.spans import line, span
from qc.rules.table import Table


def full_cycle_carbon(s1: float, s2: float, s3: float, s3_co: float = 0.0, s3_co_prime: float = 0.0) -> float:
    """Pyrolysable carbon [wt%] by the full-cycle convention; peaks [mg/g], 0 where not measured.

    From memory of Behar, Beaumont & Penteado 2001, OGST 56:111.
    """
    return (0.83 * (s1 + s2) + s3 * 12 / 44 + (s3_co + s3_co_prime / 2) * 12 / 28) / 10


def check(
    table: Table,
    *,
    carbon_per_hydrocarbon: float,
    toc_uncertainty: float,
    toc_uncertainty_relative: float,
    coverage: float,
) -> Answer:
    """One check a pyrolysis row: RC = TOC - PC must not be below minus ``coverage`` uncertainties of TOC."""
    rows = table.of("pyrolysis")
    pc = (span(rows, "S1") + span(rows, "S2")).times(carbon_per_hydrocarbon)
    rc = span(rows, "TOC") - pc
    toc = rows["TOC"].to_numpy()
    floor = -coverage * np.maximum(toc_uncertainty, toc_uncertainty_relative * toc)
    fires, known = rc.below(floor)
    outcome = judge(rows.index, applies=~not_rock(rows), known=known, fires=fires)
    findings = [
        _finding(rows, row, carbon_per_hydrocarbon, float(floor[rows.index.get_loc(row)])) for row in fired(outcome)
    ]
    return Answer(outcome, findings)


def _finding(rows: pd.DataFrame, row: int, factor: float, floor: float) -> Finding:
    one = line(rows, row)
    pc = factor * (one["S1"] + one["S2"])
    full = full_cycle_carbon(one["S1"], one["S2"], float(np.nan_to_num(one["S3"])))
    split = one["TOC_row"] != row and one["TOC_row"] >= 0
    text = (
        f"S1 and S2 hold {say(pc)} wt% carbon, more than the TOC of {say(one['TOC'])} wt%: "
        f"{say(one['TOC'] - pc)} wt% would be left (limit {say(floor)})"
    )
    if split:
        text += "; TOC is from another analysis, perhaps of another split"
    more = {
        "pc_two_peak": round(float(pc), 4),
        "pc_full_cycle": round(float(full), 4),
        "peaks_used": ["S1", "S2"] + ([] if np.isnan(one["S3"]) else ["S3"]),
        "alternatives": [
            "TOC slip or TOC of another split",
            "decimal slip in S1 or S2",
            "extract or isolate, not rock",
        ],
        "discriminating_test": "repeat TOC and pyrolysis on one split",
    }
    severity = WARN if split else REJECT
    return Finding(
        row,
        "TOC",
        severity,
        text + ".",
        ("TOC", "S1", "S2", "S3"),
        round(float(one["TOC"] - pc), 4),
        round(floor, 4),
        more=more,
    )


RULE = Rule(
    id="pyro_carbon_balance",
    family="arithmetic",
    title="Pyrolysed carbon fits into TOC",
    tests="The carbon in S1 and S2 is compared with TOC: residual carbon cannot be negative beyond the uncertainty.",
    check=check,
    inputs=("S1", "S2", "S3", "TOC"),
    flags="TOC",
    formula=(
        "PC = 0.083 (S1+S2); RC = TOC - PC; fires when RC < -2 u, u = max(0.03, 3 % of TOC). Full-cycle PC = "
        "{0.83 (S1+S2) + S3 12/44 + ...}/10 is shown beside it."
    ),
    message="The peaks hold more carbon than the reported TOC",
    source=(
        "two-peak convention from memory of Espitalié et al. 1985; full-cycle convention from memory of Behar, Beaumont "
        "& Penteado 2001, OGST 56:111; uncertainty: our default, no publication"
    ),
    must_not_fire=(
        "On oils, extracts, bitumen and kerogen isolates. Where TOC was measured on another split it warns and names both."
    ),
    example="TOC 1.00, S1 0.50, S2 12.60: PC 1.087, RC -0.087, fires. TOC 2.15, S1 0.35, S2 8.62: RC 1.405, passes.",
)
