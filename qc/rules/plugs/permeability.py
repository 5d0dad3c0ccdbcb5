"""Permeability to gas and its slip correction; plugs off the trend of their unit."""

from collections.abc import Callable

import numpy as np
import pandas as pd

from qc.rules.asking import answer, column, dig, nothing
from qc.rules.facts import says
from qc.rules.fits import theil_sen
from qc.rules.robust import modified_z
from qc.rules.rule import INFO, REJECT, WARN, Answer, Finding, Rule, merge, say
from qc.rules.spans import Floats, exact, num, reported
from qc.rules.table import Table

PSI = 6894.757293168  # Pa
ATMOSPHERE = 101325.0  # Pa
MILLIDARCY = 9.869233e-16  # m2
STEPS = 200


def slip_heid(k: Floats) -> Floats:
    """Slip factor b [Pa] of permeability k [mD]: 0.777 k^-0.39 atm. From memory of Heid et al. 1950."""
    return 0.777 * k**-0.39 * ATMOSPHERE


def slip_jones_owens(k: Floats) -> Floats:
    """0.98 k^-0.33 with k in m2 and b in Pa (constants as a gas-slip documentation page prints them)."""
    return 0.98 * (k * MILLIDARCY) ** -0.33


def slip_jones(k: Floats) -> Floats:
    """6.9 k^-0.36 psi, k in mD: Jones 1972, as a public calculation readme prints it."""
    return 6.9 * k**-0.36 * PSI


MODELS: dict[str, Callable[[Floats], Floats]] = {
    "Heid et al. 1950": slip_heid, "Jones & Owens": slip_jones_owens, "Jones 1972": slip_jones,
}  # fmt: skip


def corrected(air: Floats, pressure: float, slip: Callable[[Floats], Floats]) -> Floats:
    """Slip-corrected permeability [mD]: root of ``k (1 + b(k)/p) = k_air``, p mean pressure [Pa]; bisection in log k."""
    low, high = np.log(np.maximum(air, 1e-12)) - 12, np.log(np.maximum(air, 1e-12))
    for _ in range(STEPS):
        middle = (low + high) / 2
        k = np.exp(middle)
        above = k * (1 + slip(k) / pressure) > air
        low, high = np.where(above, low, middle), np.where(above, middle, high)
    return np.exp((low + high) / 2)


def check_order(table: Table, *, slack: float, factor: float, mean_pressure: float) -> Answer:
    """One check a plug with both permeabilities: the corrected one is not above air, and near what slip explains."""
    rows = table.panel("core", "KAIR", "KLINK")
    if rows.empty:
        return nothing()
    air, liquid = (np.where(exact(rows, name) > 0, exact(rows, name), np.nan) for name in ("KAIR", "KLINK"))
    models = {name: corrected(air, mean_pressure * ATMOSPHERE, slip) for name, slip in MODELS.items()}
    stack = np.array(list(models.values()))
    with np.errstate(invalid="ignore"):
        order = liquid > slack * air
        far = (liquid > factor * stack.max(axis=0)) | (liquid < stack.min(axis=0) / factor)
    made = column(rows, order=order, **models)

    def tell(row: int) -> Finding:
        gas, corrected_ = num(rows, row, "KAIR"), num(rows, row, "KLINK")
        predicted = {name: dig(num(made, row, name), 5) for name in MODELS}
        more = {
            "predicted": predicted, "mean_pressure_atm": mean_pressure,
            "alternatives": ["columns swapped", "other mean pressure", "liquid permeability", "typing slip"],
            "discriminating_test": "ask for the pressures of the measurement",
        }  # fmt: skip
        if made.at[row, "order"]:
            text = f"Corrected permeability {say(corrected_)} mD is above permeability to air {say(gas)} mD."
            return Finding(row, "KLINK", REJECT, text, ("KAIR", "KLINK"), dig(corrected_ / gas), slack, more=more)
        text = (
            f"Corrected permeability {say(corrected_)} mD is far from what gas slip makes of {say(gas)} mD "
            f"({say(min(predicted.values()))} to {say(max(predicted.values()))})."
        )
        return Finding(row, "KLINK", WARN, text, ("KAIR", "KLINK"), corrected_, list(predicted.values()), more=more)

    applies = reported(rows, "KAIR") & reported(rows, "KLINK") & ~says(rows, r"liquid perm|brine perm")
    return answer(rows, tell, applies=applies, known=~np.isnan(air + liquid), fires=order | far)


ORDER = Rule(
    id="klinkenberg_order",
    family="core_analysis",
    title="Slip correction lowers permeability",
    tests="Slip-corrected permeability is below permeability to air, by about what gas slip explains.",
    check=check_order,
    inputs=("KAIR", "KLINK"),
    flags="KLINK",
    formula="k_g = k_L (1 + b/p); k_L > 1.02 k_air is a candidate for rejection; k_L beyond a factor of 2 of all three slip laws warns",
    message="Slip-corrected permeability does not fit permeability to air",
    source=(
        "Heid et al. 1950 from memory; Jones & Owens constants as a gas-slip documentation page prints them (m2, Pa); "
        "Jones 1972 as a public calculation readme prints it"
    ),
    must_not_fire="On liquid permeabilities (said in the remark).",
    example="At 1.5 atm 100 mD to air is 91.84 corrected, 1 is 0.615, 0.1 is 0.0341 (Heid et al.). 120 of 100 mD fires.",
)


def check_outlier(table: Table, *, z_max: float, samples_min: float, vertical_max: float) -> Answer:
    """One check a plug against the porosity-permeability trend of its unit; one of vertical against horizontal."""
    rows = table.panel("core", "PHI", "KAIR", "KVERT")
    if rows.empty:
        return nothing()
    return merge([_trend(rows, z_max, samples_min), _vertical(rows, vertical_max)])


def _trend(rows: pd.DataFrame, z_max: float, samples_min: float) -> Answer:
    phi, air = exact(rows, "PHI"), exact(rows, "KAIR")
    with np.errstate(invalid="ignore", divide="ignore"):
        logk = np.where(air > 0, np.log10(air), np.nan)
    usable = ~np.isnan(phi + logk) & ~rows["PHI_rej"].to_numpy() & ~rows["KAIR_rej"].to_numpy()
    z, expected, size = np.full(len(rows), np.nan), np.full(len(rows), np.nan), np.zeros(len(rows))
    for places in rows.reset_index().groupby(["well", "unit"], sort=True).indices.values():
        good = places[usable[places]]
        size[places] = len(good)
        if len(good) < samples_min:
            continue
        fit = theil_sen(phi[good], logk[good])
        left = logk[good] - fit.slope * phi[good]
        middle = float(np.median(left))
        z[good], expected[good] = modified_z(left), middle + fit.slope * phi[good]
    made = column(rows, z=z, expected=expected, n=size)

    def tell(row: int) -> Finding:
        k, usual = num(rows, row, "KAIR"), 10 ** num(made, row, "expected")
        text = f"Permeability {say(k)} mD at porosity {say(num(rows, row, 'PHI'))} % where the unit has about {say(usual)} mD."
        more = {
            "n": int(num(made, row, "n")),
            "alternatives": ["cracked or fractured plug", "vuggy or cemented plug", "decimal slip"],
            "discriminating_test": "look at the plug; repeat under confining pressure",
        }
        return Finding(row, "KAIR", INFO, text, ("PHI", "KAIR"), dig(num(made, row, "z"), 2), z_max, more=more)

    with np.errstate(invalid="ignore"):
        fires = np.abs(z) > z_max
    applies = reported(rows, "PHI") & reported(rows, "KAIR") & (size >= samples_min)
    return answer(rows, tell, applies=applies, known=~np.isnan(z), fires=fires)


def _vertical(rows: pd.DataFrame, vertical_max: float) -> Answer:
    up, along = exact(rows, "KVERT"), exact(rows, "KAIR")

    def tell(row: int) -> Finding:
        vertical, horizontal = num(rows, row, "KVERT"), num(rows, row, "KAIR")
        text = f"Vertical permeability {say(vertical)} mD is {say(vertical / horizontal) if horizontal else 'many'} times horizontal {say(horizontal)} mD."
        more = {"alternatives": ["cracked plug", "columns swapped"], "discriminating_test": "look at both plugs"}
        return Finding(row, "KVERT", WARN, text, ("KVERT", "KAIR"), vertical, dig(vertical_max * horizontal), more=more)

    with np.errstate(invalid="ignore"):
        fires = up > vertical_max * along
    return answer(
        rows, tell, applies=reported(rows, "KVERT") & reported(rows, "KAIR"), known=~np.isnan(up + along), fires=fires
    )


OUTLIER = Rule(
    id="poroperm_outlier",
    family="core_analysis",
    title="Plugs off the porosity-permeability trend",
    tests="A plug far from the robust trend of log permeability on porosity in its unit is named; so is vertical far above horizontal.",
    check=check_outlier,
    inputs=("PHI", "KAIR", "KVERT"),
    flags="KAIR",
    formula="|modified z| of the residual of log10 k on porosity (Theil-Sen) > 3.5 informs; k_v > 10 k_h warns",
    message="A plug is off the porosity-permeability trend",
    source="limit 3.5: Iglewicz & Hoaglin 1993, read second hand; factor 10: our default, no publication",
    must_not_fire="On fewer than 15 plugs of a unit.",
    example="Porosity 3 % with 850 mD among plugs of 0.1 mD: a crack.",
)
