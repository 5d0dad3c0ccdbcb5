"""Porosity follows from densities; saturations fill the pores."""

import numpy as np

from qc.rules.asking import answer, column, dig, nothing
from qc.rules.facts import says
from qc.rules.rule import REJECT, WARN, Answer, Finding, Rule, say
from qc.rules.spans import exact, num, reported, span
from qc.rules.table import Table


def porosity_of(bulk: float, grain: float) -> float:
    """Porosity [%] from bulk and grain density; as printed in the core porosity basics of spec2000."""
    return 100 * (1 - bulk / grain)


def check_porosity(table: Table, *, tolerance: float, porosity_max: float) -> Answer:
    """One check a plug with porosity: it is within bounds, and the one that its densities make."""
    rows = table.panel("core", "PHI", "RHOB", "RHOG")
    if rows.empty:
        return nothing()
    phi, bulk, grain = (span(rows, name, rounded=True) for name in ("PHI", "RHOB", "RHOG"))
    with np.errstate(divide="ignore", invalid="ignore"):
        made_low, made_high = 100 * (1 - bulk.hi / grain.lo), 100 * (1 - bulk.lo / grain.hi)
    value = rows["PHI"].to_numpy()
    wet = says(rows, r"\b(?:wet|saturated) (?:bulk )?density|stress(?:ed|-corrected)|overburden")
    with np.errstate(invalid="ignore"):
        beyond = (value < 0) | (phi.lo > porosity_max)
        heavy = bulk.lo > grain.hi
        apart = ((phi.lo > made_high + tolerance) | (phi.hi < made_low - tolerance)) & ~wet
    made = column(rows, beyond=beyond, heavy=heavy)
    densities = reported(rows, "RHOB") & reported(rows, "RHOG")

    def tell(row: int) -> Finding:
        reads, rho_b, rho_g = (num(rows, row, name) for name in ("PHI", "RHOB", "RHOG"))
        implied = porosity_of(rho_b, rho_g)
        if made.at[row, "beyond"]:
            return Finding(
                row, "PHI", REJECT, f"Porosity {say(reads)} % cannot be.", ("PHI",), reads, [0.0, porosity_max]
            )
        if made.at[row, "heavy"]:
            text = f"Bulk density {say(rho_b)} is above grain density {say(rho_g)} g/cm3."
            return Finding(row, "RHOB", REJECT, text, ("RHOB", "RHOG"), rho_b, rho_g)
        assumed = rho_b / (1 - reads / 100)
        text = (
            f"Bulk {say(rho_b)} and grain {say(rho_g)} g/cm3 make a porosity of {say(implied)} %, {say(reads)} was reported; "
            f"it follows from a grain density of {say(assumed)}."
        )
        more = {
            "implied_grain_density": dig(assumed, 3),
            "alternatives": ["grain density assumed, not measured", "wet bulk density", "porosity under stress"],
            "discriminating_test": "ask for grain volume, pore volume and bulk volume",
        }
        return Finding(row, "PHI", WARN, text, ("PHI", "RHOB", "RHOG"), dig(reads - implied, 2), tolerance, more=more)

    applies = reported(rows, "PHI") & (densities | beyond) | (densities & heavy)
    known = ~np.isnan(made_low + exact(rows, "PHI") + exact(rows, "RHOB") + exact(rows, "RHOG"))
    return answer(rows, tell, applies=applies & (~wet | beyond), known=known, fires=beyond | heavy | apart)


POROSITY = Rule(
    id="porosity_density_consistency",
    family="core_analysis",
    title="Porosity follows from the densities",
    tests="Porosity must be the one that bulk and grain density make, and between 0 and 60 %.",
    check=check_porosity,
    inputs=("PHI", "RHOB", "RHOG"),
    flags="PHI",
    formula="porosity = 100 (1 - bulk/grain); |difference| > 0.5 beyond rounding warns; bulk > grain, or outside 0-60, is a candidate for rejection",
    message="Porosity does not follow from the densities",
    source="formula: spec2000, core porosity basics; limit of 0.5: our default, no publication",
    must_not_fire="On wet bulk densities and stress-corrected porosities (said in the remark).",
    example="Bulk 2.43, grain 2.66: 8.65 %; a reported 10.3 fires, 10.33 results if 2.71 was assumed.",
)


def check_saturation(table: Table, *, warn_away: float, reject_away: float) -> Answer:
    """One check a plug with saturations: they fill the pores, none is negative or more than all."""
    names = ("SO", "SW", "SG")
    rows = table.panel("core", *names)
    if rows.empty:
        return nothing()
    spans = [span(rows, name) for name in names]
    values = np.column_stack([rows[name].to_numpy() for name in names])
    whole = spans[0] + spans[1] + spans[2]
    two = spans[0] + spans[1]
    difference = says(rows, r"oil (?:saturation )?by (?:weight )?difference")
    with np.errstate(invalid="ignore"):
        single = (values[:, 1] > 100) | (values[:, 0] < 0)
        off = ((whole.lo > 100 + warn_away) | (whole.hi < 100 - warn_away)) & ~difference
        over = two.lo > 100 + warn_away
    total = np.where(whole.known, values.sum(axis=1), values[:, 0] + values[:, 1])
    made = column(rows, total=total, single=single)

    def tell(row: int) -> Finding:
        sum_ = num(made, row, "total")
        severity = WARN
        if made.at[row, "single"]:
            text = f"Water saturation {say(num(rows, row, 'SW'))} %, oil saturation {say(num(rows, row, 'SO'))} %: one of them cannot be."
        else:
            severity = REJECT if abs(sum_ - 100) > reject_away else WARN
            text = f"The saturations add up to {say(sum_)} %."
        more = {
            "alternatives": ["crystal water of clay or gypsum in a retort", "gas volume not measured", "typing slip"],
            "discriminating_test": "ask for the method (retort, extraction) and the fluid volumes",
        }
        return Finding(row, "SW", severity, text, names, dig(sum_, 2), [100 - warn_away, 100 + warn_away], more=more)

    applies = (reported(rows, "SO") & reported(rows, "SW") & ~difference) | single
    return answer(rows, tell, applies=applies, known=whole.known, fires=single | off | over)


SATURATION = Rule(
    id="saturation_sum",
    family="core_analysis",
    title="Saturations fill the pores",
    tests="Oil, water and gas saturation of one plug must add up to 100 %.",
    check=check_saturation,
    inputs=("SO", "SW", "SG"),
    flags="SW",
    formula="So + Sw + Sg outside 98-102 warns, outside 95-105 is a candidate for rejection; So + Sw > 102, Sw > 100 or So < 0 warn",
    message="Saturations do not fill the pores",
    source="our default, no publication (fluid summation: API RP 40, 2nd ed. 1998, front matter)",
    must_not_fire="Where oil is by difference (said in the remark): the sum is then built in.",
    example="32.4 + 58.1 + 6.0 = 96.5 warns.",
)
