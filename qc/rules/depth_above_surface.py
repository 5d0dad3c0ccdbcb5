"""No sample from above ground or sea floor."""

import numpy as np
import pandas as pd

from qc.rules.rule import REJECT, Answer, Finding, Rule, fired, judge
from qc.rules.spans import num
from qc.rules.table import Table


def surface(wells: pd.DataFrame) -> pd.Series:
    """Measured depth of ground or sea floor below the well's datum [m]; NaN where it is not recorded.

    Offshore (water depth above 0): air gap (the datum's elevation above sea level) plus water depth.
    """
    offshore = wells["water_m"].fillna(0) > 0
    return pd.Series(
        np.where(offshore, wells["datum_m"] + wells["water_m"], wells["datum_m"] - wells["ground_m"]), index=wells.index
    )


def check(table: Table, *, tolerance: float) -> Answer:
    """One check a sample with a top."""
    samples = table.samples()
    start = samples["well"].map(surface(table.wells)).to_numpy(dtype=float)
    top = samples["top_m"].to_numpy(dtype=float)
    with np.errstate(invalid="ignore"):
        fires = (top < start - tolerance) | (top < 0)
    applies = samples["kind"].ne("outcrop").to_numpy()
    outcome = judge(samples.index, applies=applies, known=~np.isnan(start) & ~np.isnan(top), fires=fires)
    starts = pd.Series(start, index=samples.index)
    return Answer(outcome, [_finding(samples, row, float(starts[row])) for row in fired(outcome)])


def _finding(samples: pd.DataFrame, row: int, start: float) -> Finding:
    top = num(samples, row, "top_m")
    shown = f"{start:.2f} m below the datum" if np.isfinite(start) else "at the datum or below it"
    text = f"{top:.2f} m is above ground or sea floor ({shown})."
    more = {
        "alternatives": ["depth from another datum", "subsea depth given as measured depth", "typing error"],
        "discriminating_test": "check datum, ground level and water depth in the well file",
    }
    return Finding(row, "", REJECT, text, (), top, start if np.isfinite(start) else 0.0, more=more)


RULE = Rule(
    id="depth_above_surface",
    family="depth",
    title="Not above ground or sea floor",
    tests="A sample cannot come from the air or the sea.",
    check=check,
    inputs=("top", "datum elevation", "ground elevation or water depth"),
    flags="the sample",
    formula="top < datum - ground onshore; top < air gap + water depth offshore",
    message="The sample is above ground or sea floor",
    source="geometry of the well (our default, no publication)",
    must_not_fire="Where datum, ground or water depth is not recorded (cannot be evaluated).",
    example="Air gap 25 m, water 310 m: a sample at 290 m fires.",
)
