"""PI too high for the maturity."""

import numpy as np
import pandas as pd

from qc.rules.facts import made_or_reported, not_rock, production_index, sandstone, valid_tmax
from qc.rules.rule import WARN, Answer, Finding, Rule, fired, judge, say
from qc.rules.spans import Floats, exact, line, num, span
from qc.rules.table import Table

STAGES = ("immature", "early mature", "peak mature", "late mature")


def stage(values: Floats, limits: tuple[float, float, float]) -> Floats:
    """0..3 from a maturity measure with lower bounds inclusive; NaN where it is unknown."""
    return np.where(
        np.isnan(values), np.nan, np.searchsorted(limits, np.nan_to_num(values), side="right").astype(float)
    )


def check(
    table: Table, *, hydrocarbon_min: float, pi_immature: float, pi_early: float, pi_peak: float, pi_late: float,
    tmax_early: float, tmax_peak: float, tmax_late: float, ro_early: float, ro_peak: float, ro_late: float, s2_min: float,
) -> Answer:  # fmt: skip
    """One check for each row with S1 + S2 of at least ``hydrocarbon_min``: PI against the most its stage may show.

    The stage is from a valid Tmax, else from reflectance.
    """
    rows = table.of("pyrolysis")
    pi = production_index(rows)
    by_tmax = stage(valid_tmax(rows, s2_min), (tmax_early, tmax_peak, tmax_late))
    by_ro = stage(exact(rows, "RO"), (ro_early, ro_peak, ro_late))
    stages = np.where(np.isnan(by_tmax), by_ro, by_tmax)
    ceilings = np.array([pi_immature, pi_early, pi_peak, pi_late])
    limit = np.where(np.isnan(stages), np.nan, ceilings[np.nan_to_num(stages).astype(int)])
    little, enough_known = (span(rows, "S1") + span(rows, "S2")).below(hydrocarbon_min)
    with np.errstate(invalid="ignore"):
        fires = (pi > limit) & enough_known
    known = enough_known & ~np.isnan(pi) & ~np.isnan(limit)
    outcome = judge(rows.index, applies=~little & ~not_rock(rows) & ~sandstone(rows), known=known, fires=fires)
    facts = pd.DataFrame({"pi": pi, "limit": limit, "stage": stages, "by_tmax": ~np.isnan(by_tmax)}, index=rows.index)
    return Answer(outcome, [_finding(rows, line(facts, row), row) for row in fired(outcome)])


def _finding(rows: pd.DataFrame, fact: pd.Series, row: int) -> Finding:
    measure = f"Tmax {say(num(rows, row, 'TMAX'))} °C" if fact["by_tmax"] else f"Ro {say(num(rows, row, 'RO'))} %"
    name = STAGES[int(fact["stage"])]
    text = f"PI {say(fact['pi'])} is above {say(fact['limit'])}, the most expected of {name} rock ({measure})."
    more = {
        "scheme": "stages of Peters & Cassa 1994 (from memory); other published PI windows differ",
        "stage": name,
        "alternatives": [
            "migrated oil or stain",
            "oil-based drilling fluid or additive",
            "reservoir rock",
            "Tmax lowered by heavy bitumen",
        ],
        "discriminating_test": "solvent extraction and re-run; gas chromatography of the extract",
    }
    analyte = made_or_reported(rows, row, "PI", "S1")
    return Finding(
        row,
        analyte,
        WARN,
        text,
        ("PI", "S1", "S2", "TMAX", "RO"),
        round(float(fact["pi"]), 4),
        float(fact["limit"]),
        more=more,
    )


RULE = Rule(
    id="pi_high_for_maturity",
    family="contamination",
    title="PI fits the maturity",
    tests="PI rises through the oil window; a high PI in rock that is not mature enough points to oil from elsewhere.",
    check=check,
    inputs=("S1", "S2", "PI", "TMAX", "RO"),
    flags="PI (S1 where PI is not reported)",
    formula="PI = S1/(S1+S2) > 0.20 at Tmax < 435; > 0.30 at 435-445; > 0.50 at 445-450; > 0.60 from 450",
    message="PI is too high for the maturity",
    source=(
        "our default, no publication, built on Peters & Cassa 1994, AAPG Memoir 60 ch. 5 table 5.3, and Peters 1986 (from "
        "memory); AAPG Wiki «Production Index (PI)» gives 0.10 and 0.30"
    ),
    must_not_fire="Where S1+S2 is below 0.5 mg/g; in reservoir rock.",
    example="PI 0.442 at Tmax 428 fires.",
)
