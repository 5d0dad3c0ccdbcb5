"""Gas: order of carbon isotopes, sums; fractions of extracts: sums and the line between waxy and marine."""

from typing import TypeVar

import numpy as np
import pandas as pd

from qc.rules.asking import answer, column, count, dig, nothing
from qc.rules.facts import says
from qc.rules.rule import INFO, WARN, Answer, Finding, Rule, merge, say
from qc.rules.spans import Floats, exact, num, reported
from qc.rules.table import Table

Number = TypeVar("Number", float, Floats)

ORDER = ("D13C_C1", "D13C_C2", "D13C_C3", "D13C_NC4")
GASES = (
    "GAS_C1",
    "GAS_C2",
    "GAS_C3",
    "GAS_IC4",
    "GAS_NC4",
    "GAS_IC5",
    "GAS_NC5",
    "GAS_C6P",
    "GAS_CO2",
    "GAS_N2",
    "GAS_H2S",
)
SARA = ("F_SAT", "F_ARO", "F_RESIN", "F_ASPH")


def bernard(methane: float, ethane: float, propane: float) -> float:
    """C1/(C2+C3); > 1000 with d13C1 < -60 microbial, < 100 with > -50 thermogenic (from memory)."""
    return methane / (ethane + propane)


def canonical_variable(saturated: Number, aromatic: Number) -> Number:
    """CV = -2.53 d13C(sat) + 2.22 d13C(aro) - 11.65; above 0.47 waxy, else marine (Sofer 1984, from memory)."""
    return -2.53 * saturated + 2.22 * aromatic - 11.65


def check_order(table: Table, *, reversal: float, sum_low: float, sum_high: float) -> Answer:
    """One check a gas with two carbon isotopes or more: they grow heavier with carbon number."""
    rows = table.panel("isotopes", *ORDER, *GASES)
    if rows.empty:
        return nothing()
    deltas = np.column_stack([exact(rows, name) for name in ORDER])
    with np.errstate(invalid="ignore"):
        steps = deltas[:, :-1] - deltas[:, 1:]
        worst = np.nanmax(np.where(np.isnan(steps), -np.inf, steps), axis=1)
    total = np.nansum(np.column_stack([exact(rows, name) for name in GASES]), axis=1)
    bad_sum = (count(rows, GASES) > 2) & ((total < sum_low) | (total > sum_high))
    made = column(rows, worst=worst, bad=bad_sum)

    def tell(row: int) -> Finding:
        text = f"A heavier gas is {say(num(made, row, 'worst'))} permil lighter in carbon than the one before it."
        more = {
            "gas_sum": dig(float(total[rows.index.get_loc(row)]), 2),
            "alternatives": ["mixing", "thermochemical sulfate reduction", "late mature shale gas", "swapped columns"],
        }
        return Finding(
            row,
            "D13C_C1",
            WARN if made.at[row, "bad"] else INFO,
            text,
            (*ORDER, *GASES),
            dig(num(made, row, "worst"), 3),
            reversal,
            more=more,
        )

    applies = count(rows, ORDER) >= 2
    return answer(rows, tell, applies=applies, known=~np.isinf(worst), fires=worst > reversal)


GAS_ORDER = Rule(
    id="gas_isotope_order",
    family="isotopes_gc",
    title="Gas isotopes in order",
    tests="Thermogenic gas grows heavier in carbon from methane to butane; reversals are named.",
    check=check_order,
    inputs=ORDER,
    flags="D13C_C1",
    formula="d13C of C1 < C2 < C3 < nC4; reversal > 1 permil informs, warns where the gas does not add up",
    message="Carbon isotopes of the gases are reversed",
    source="general practice, from memory; fields revised from more than 20 000 gases: Milkov & Etiope 2018, abstract",
    must_not_fire="As a fault: mixing, sulfate reduction and late mature shale reverse the order.",
    example="C1 -30, C2 -33: reversed by 3 permil, information.",
)


def check_sofer(table: Table, *, waxy_above: float) -> Answer:
    """One check a sample with saturated and aromatic carbon isotopes: a label where it plots as waxy."""
    rows = table.panel("isotopes", "D13C_SAT", "D13C_ARO")
    if rows.empty:
        return nothing()
    made = column(rows, cv=canonical_variable(exact(rows, "D13C_SAT"), exact(rows, "D13C_ARO")))

    def tell(row: int) -> Finding:
        cv = num(made, row, "cv")
        text = f"Canonical variable {cv:.3f}: plots as waxy (terrigenous); a label, no fault."
        return Finding(row, "D13C_SAT", INFO, text, ("D13C_SAT", "D13C_ARO"), dig(cv, 3), waxy_above)

    applies = reported(rows, "D13C_SAT") & reported(rows, "D13C_ARO")
    return answer(rows, tell, applies=applies, known=~made["cv"].isna(), fires=made["cv"] > waxy_above)


SOFER = Rule(
    id="sofer_cv",
    family="isotopes_gc",
    title="Waxy or marine by carbon isotopes",
    tests="The canonical variable of saturated and aromatic carbon isotopes labels oils as waxy or marine.",
    check=check_sofer,
    inputs=("D13C_SAT", "D13C_ARO"),
    flags="D13C_SAT",
    formula="CV = -2.53 d13C(sat) + 2.22 d13C(aro) - 11.65 > 0.47",
    message="Carbon isotopes plot as waxy",
    source="from memory of Sofer 1984",
    must_not_fire="As a fault: it is a label; biodegradation and sulfate reduction move it.",
    example="-28.5 and -27.0 give 0.515; -29.0 and -28.6 give -1.772.",
)


def check_sums(table: Table, *, sara_low: float, sara_high: float, gas_low: float, gas_high: float) -> Answer:
    """One check a set of fractions and one a gas analysis: each adds up."""
    rows = table.panel("gc", *SARA, *GASES)
    if rows.empty:
        return nothing()
    lost = says(rows, r"light ends|topped|evaporat")
    fractions = np.all([reported(rows, name) for name in SARA], axis=0)
    gas = reported(rows, "GAS_C1") & reported(rows, "GAS_C2")
    return merge(
        [_sum(rows, SARA, fractions & ~lost, (sara_low, sara_high)), _sum(rows, GASES, gas, (gas_low, gas_high))]
    )


def _sum(rows: pd.DataFrame, parts: tuple[str, ...], applies: np.ndarray, bounds: tuple[float, float]) -> Answer:
    values = np.column_stack([exact(rows, name) for name in parts])
    missing = np.column_stack([reported(rows, name) for name in parts]) & np.isnan(values)
    made = column(rows, total=np.nansum(values, axis=1))

    def tell(row: int) -> Finding:
        total = num(made, row, "total")
        given = tuple(name for name in parts if num(rows, row, f"{name}_id") >= 0)
        more = {
            "alternatives": ["light ends lost", "air in the gas", "typing slip"],
            "discriminating_test": "ask for the recovery",
        }
        text = f"The parts add up to {say(total)} %, outside {bounds[0]:g} to {bounds[1]:g}."
        return Finding(row, parts[0], WARN, text, given, dig(total, 3), list(bounds), more=more)

    known = ~missing.any(axis=1)
    fires = ((made["total"] < bounds[0]) | (made["total"] > bounds[1])).to_numpy() & known
    return answer(rows, tell, applies=applies, known=known, fires=fires)


SUMS = Rule(
    id="sum_checks",
    family="isotopes_gc",
    title="Fractions and gases add up",
    tests="The four fractions of an extract, and the components of a gas, add up to the whole.",
    check=check_sums,
    inputs=(*SARA, *GASES),
    flags="F_SAT",
    formula="saturated + aromatic + resin + asphaltene outside 90-105 %; gas outside 99.0-101.0 mol%",
    message="Fractions or gases do not add up",
    source="our default, no publication",
    must_not_fire="Where loss of light ends is stated in the remark.",
    example="Fractions of 93.6 and a gas of 99.7 pass.",
)
RULES = (GAS_ORDER, SOFER, SUMS)
