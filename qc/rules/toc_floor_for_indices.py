"""Indices of lean rock are not for interpretation."""

import numpy as np
import pandas as pd

from qc.rules.rule import WARN, Answer, Finding, Rule, fired, judge, merge, say
from qc.rules.spans import Floats, exact, num, reported, span, word
from qc.rules.table import Table

TOPS = {"HI": "S2", "OI": "S3", "OSI": "S1"}


def relative_uncertainty(s2: Floats, toc: Floats, u_s2: Floats, u_toc: Floats) -> Floats:
    """Of 100 S2/TOC, from the uncertainties of both; NaN where either is 0 or unknown."""
    with np.errstate(invalid="ignore", divide="ignore"):
        made = np.sqrt((u_s2 / s2) ** 2 + (u_toc / toc) ** 2)
    return np.where(np.isfinite(made), made, np.nan)


def check(
    table: Table, *, toc_min: float, toc_warn: float, relative_max: float, s2_uncertainty: float,
    s2_uncertainty_relative: float, toc_uncertainty: float, toc_uncertainty_relative: float,
) -> Answer:  # fmt: skip
    """One check for each reported HI, OI and OSI. The warning is on the index, never on TOC or S2."""
    rows = table.of("pyrolysis")
    s2, toc = exact(rows, "S2"), exact(rows, "TOC")
    u_s2 = np.fmax(s2_uncertainty, s2_uncertainty_relative * s2)
    u_toc = np.fmax(toc_uncertainty, toc_uncertainty_relative * toc)
    spread = relative_uncertainty(s2, toc, u_s2, u_toc)
    lean, decided = span(rows, "TOC").below(toc_warn)
    facts = pd.DataFrame({"spread": spread, "toc": toc}, index=rows.index)
    answers = []
    for index in TOPS:
        with np.errstate(invalid="ignore"):
            vague = (spread > relative_max) & (index == "HI")
        known = decided & (~np.isnan(spread) if index == "HI" else True)
        outcome = judge(rows.index, applies=reported(rows, index), known=known, fires=lean | vague)
        findings = [_finding(rows, row, index, facts, (toc_min, toc_warn, relative_max)) for row in fired(outcome)]
        answers.append(Answer(outcome, findings))
    return merge(answers)


def _finding(
    rows: pd.DataFrame, row: int, index: str, facts: pd.DataFrame, limits: tuple[float, float, float]
) -> Finding:
    toc_min, toc_warn, relative_max = limits
    toc, spread, value = num(rows, row, "TOC"), num(facts, row, "spread"), num(rows, row, index)
    shown = f"{word(rows, row, 'TOC_q')}{say(toc)}"
    more: dict[str, object] = {
        "alternatives": ["a lean carbonate low in clay may be valid down to about 0.2 wt% if duplicates agree"],
        "discriminating_test": "duplicate pyrolysis and TOC; use the S2-TOC plot of the unit instead of single indices",
    }
    if not np.isnan(spread):
        more["relative_uncertainty"] = round(float(spread), 4)
        more["interval"] = [round(float(value * (1 - spread)), 1), round(float(value * (1 + spread)), 1)]
    if toc < toc_min:
        text = f"{index} is not for interpretation: TOC {shown} wt% is below {say(toc_min)}"
    elif toc < toc_warn or word(rows, row, "TOC_q") == "<":
        text = f"{index} is doubtful: TOC {shown} wt% is below {say(toc_warn)}"
    else:
        text = f"{index} is uncertain by {100 * spread:.1f} %, more than {100 * relative_max:.0f} %"
    lean = toc < toc_warn
    computed, limit = (toc, toc_min if toc < toc_min else toc_warn) if lean else (spread, relative_max)
    return Finding(
        row, index, WARN, text + ".", (index, TOPS[index], "TOC"), round(float(computed), 4), limit, more=more
    )


RULE = Rule(
    id="toc_floor_for_indices",
    family="validity",
    title="Enough TOC for an index",
    tests="HI, OI and OSI divide by TOC; where TOC is small or the uncertainty of the ratio large they say little.",
    check=check,
    inputs=("TOC", "S2", "HI", "OI", "OSI"),
    flags="the index",
    formula="TOC < 0.3 (not for interpretation), < 0.5 (doubtful), or sqrt((u2/S2)^2 + (uT/TOC)^2) > 0.15 for HI",
    message="The index is not for interpretation at this TOC",
    source="our default, no publication; in the spirit of Peters 1986, AAPG Bulletin 70:318 (from memory)",
    must_not_fire="Where the index was not reported; never on TOC or S2 themselves.",
    example="S2 0.30 ± 0.05, TOC 0.30 ± 0.03: 0.194, fires. S2 8.62 ± 5 %, TOC ± 3 %: 0.058, passes.",
)
