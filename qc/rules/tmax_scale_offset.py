"""A raw peak temperature delivered as Tmax: a whole batch too hot by one constant."""

from typing import Any

import numpy as np
import pandas as pd

from qc.rules.facts import not_rock, valid_tmax
from qc.rules.robust import madn
from qc.rules.rule import CANNOT_EVALUATE, FIRE, PASS, REJECT, Answer, Finding, Rule, say
from qc.rules.spans import Floats, exact
from qc.rules.table import Table


def offset(away: Floats, low: float, high: float, scatter_max: float) -> tuple[bool, float, float]:
    """(fires, median, MADN) of Tmax reported minus Tmax expected [degC]."""
    median, scatter = float(np.median(away)), madn(away)
    return low <= median <= high and scatter < scatter_max, median, scatter


def check(
    table: Table, *, offset_min: float, offset_max: float, scatter_max: float, samples_min: int, reference_min: int,
    ro_slope: float, ro_intercept: float, s2_min: float,
) -> Answer:  # fmt: skip
    """One check a table of pyrolysis: against its reference rock, else against reflectance of at least 5 samples."""
    rows = table.of("pyrolysis")
    rows = rows[~not_rock(rows) & (rows["TMAX_id"] >= 0)]
    expected = (exact(rows, "RO") - ro_intercept) / ro_slope
    rows = rows.assign(away=valid_tmax(rows, s2_min) - expected)
    outcomes: dict[int, str] = {}
    findings: list[Finding] = []
    for place, batch in rows.groupby("table", sort=True):
        first = int(batch.index[0])
        rock = references(table, place)
        paired = batch["away"].dropna().to_numpy()
        by_rock = len(rock) >= reference_min
        away = rock if by_rock else paired
        if not by_rock and len(paired) < samples_min:
            outcomes[first] = CANNOT_EVALUATE
            continue
        fires, _, _ = offset(away, offset_min, offset_max, scatter_max)
        outcomes[first] = FIRE if fires else PASS
        if fires:
            findings.append(_finding(batch, away, (offset_min, offset_max), by_rock=by_rock))
    return Answer(pd.Series(outcomes, dtype=object), findings)


def references(table: Table, place: Any) -> Floats:
    """Tmax of the batch's reference rock minus its certified one [degC], one a measurement."""
    held = table.controls
    own = held[
        (held["table"] == place) & (held["analyte"] == "TMAX") & (held["role"] == "reference") & (held["q"] == "")
    ]
    return (own["value"] - own["certified"]).dropna().to_numpy(dtype=float)


def _finding(batch: pd.DataFrame, away: Floats, limit: tuple[float, float], *, by_rock: bool) -> Finding:
    median, scatter = float(np.median(away)), madn(away)
    against = "the certified Tmax of the reference rock" if by_rock else "what reflectance of the same samples gives"
    text = (
        f"Tmax of this table stands {say(median)} °C above {against} ({len(away)} measurements, scatter {say(scatter)} °C), "
        "as a raw peak temperature would."
    )
    more = {
        "offsets": [round(float(one), 2) for one in np.sort(away)[:100]],
        "scatter": round(scatter, 3),
        "against": against,
        "alternatives": (
            ["thermocouple out of calibration", "wrong reference rock selected"]
            if by_rock
            else ["reflectance of caved or suppressed vitrinite throughout", "Type I kerogen", "thermocouple out of calibration"]
        ),
        "discriminating_test": "ask the laboratory which of the two temperatures it reports; Tmax of the reference rock run with the batch",
    }  # fmt: skip
    rows = tuple(int(row) for row in batch.index)
    return Finding(None, "TMAX", REJECT, text, ("TMAX", "RO"), round(median, 3), list(limit), rows=rows, more=more)


RULE = Rule(
    id="tmax_scale_offset",
    family="validity",
    title="Tmax is on the usual scale",
    tests="A batch whose Tmax all stand too high by one constant was reported as raw peak temperatures.",
    check=check,
    inputs=("TMAX", "S2", "RO", "reference rock of the batch"),
    flags="TMAX of the batch",
    formula="median(Tmax - Tmax expected) in [+25, +55] °C with MADN < 6 °C; expected: certificate, else (Ro + 7.16) / 0.0180",
    message="The batch may report raw peak temperatures as Tmax",
    source=(
        "per-oven difference of about 35 to 42 °C: from memory of Behar et al. 2001; limits: our default, no publication; "
        "conversion from memory of Jarvie et al. 2001"
    ),
    must_not_fire="On fewer than 5 samples with reflectance where no reference rock was run (cannot be evaluated).",
    example="Reference rock certified 416; measured 454, 455, 453: median +38, fires.",
)
