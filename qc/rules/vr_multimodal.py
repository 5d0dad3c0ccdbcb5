"""Reflectance readings of two populations reported as one mean."""

import numpy as np
import pandas as pd

from qc.rules.dip import p_value
from qc.rules.facts import says
from qc.rules.rule import CANNOT_EVALUATE, FIRE, NOT_APPLICABLE, PASS, WARN, Answer, Finding, Rule, say
from qc.rules.spans import Floats, exact, num, reported
from qc.rules.table import Table

NOTED = r"\b(?:population|populations|reworked|caved|cavings|bimodal|multimodal|bitumen)\b"


def check(
    table: Table, *, p_max: float, apart_min: float, readings_min: int, class_min: int, spread_factor: float
) -> Answer:
    """One check for each sample with a mean: its single readings are rows of one reading (n = 1, or replicates without n)."""
    rows = table.of("reflectance")
    rows = rows[reported(rows, "RO")]
    n = exact(rows, "RO_N")
    single = (n == 1) | (np.isnan(n) & rows["replicate_stated"].to_numpy())
    ro, alone = pd.Series(exact(rows, "RO"), index=rows.index), pd.Series(single, index=rows.index)
    read_singly = rows["sample"].isin(rows.loc[alone, "sample"])
    outcomes = {int(row): CANNOT_EVALUATE for row in rows[~read_singly].drop_duplicates("sample").index}
    findings: list[Finding] = []
    for _, members in rows[read_singly].groupby("sample", sort=False):
        own = alone[members.index]
        means = members.index[~own]
        first = int(means[0] if len(means) else members.index[0])
        readings: Floats = np.sort(np.asarray(ro[members.index[own]].dropna(), dtype=np.float64))
        if len(readings) < readings_min:
            outcomes[first] = CANNOT_EVALUATE
            continue
        if says(members, NOTED).any():
            outcomes[first] = NOT_APPLICABLE
            continue
        split = classes(readings, class_min)
        p = p_value(readings)
        fires = p < p_max or separate(split, apart_min, spread_factor)
        outcomes[first] = FIRE if fires else PASS
        if fires:
            findings.append(
                _finding(rows, first, members.index[own], readings, split=split, p=p, limit=(p_max, apart_min))
            )
    return Answer(pd.Series(outcomes, dtype=object), findings)


Split = tuple[Floats, Floats]


def classes(readings: Floats, class_min: int) -> Split:
    """The two classes of sorted readings with the least spread within; each has at least ``class_min`` readings."""
    cuts = range(class_min, len(readings) - class_min + 1)
    within = {cut: readings[:cut].var() * cut + readings[cut:].var() * (len(readings) - cut) for cut in cuts}
    best = min(within, key=lambda cut: within[cut]) if within else len(readings)
    return readings[:best], readings[best:]


def separate(split: Split, apart_min: float, spread_factor: float) -> bool:
    """Two classes more than ``apart_min`` apart, and apart by more than their spread within would make."""
    low, high = split
    if not len(high):
        return False
    apart = float(high.mean() - low.mean())
    return apart > apart_min and apart > spread_factor * float(np.hypot(low.std(ddof=1), high.std(ddof=1)))


def _finding(
    rows: pd.DataFrame, row: int, others: pd.Index, readings: Floats, *, split: Split, p: float, limit: tuple[float, float]
) -> Finding:  # fmt: skip
    parts = [
        f"{len(one)} at {one.mean():.2f} ± {one.std(ddof=1) if len(one) > 1 else 0:.2f} %" for one in split if len(one)
    ]
    text = (
        f"The {len(readings)} readings behind Ro {say(num(rows, row, 'RO'))} % are of more than one population: {' and '.join(parts)} "
        f"(dip test p {p:.3f}); no population is noted."
    )
    more = {
        "readings": [round(float(one), 4) for one in readings],
        "classes": [{"n": len(one), "mean": round(float(one.mean()), 4)} for one in split if len(one)],
        "p_dip": round(p, 4),
        "alternatives": ["caved younger rock with the sample's own", "reworked vitrinite", "solid bitumen counted as vitrinite"],
        "discriminating_test": "histogram with photographs; mean of each population reported apart",
    }  # fmt: skip
    rest = tuple(int(one) for one in others if int(one) != row)
    apart = round(float(split[1].mean() - split[0].mean()), 4) if len(split[1]) else None
    return Finding(row, "RO", WARN, text, ("RO", "RO_N", "RO_SD"), apart, list(limit), rows=rest, more=more)


RULE = Rule(
    id="vr_multimodal",
    family="maturity",
    title="Reflectance readings of one population",
    tests="The single readings of a sample must have one mode, unless the report notes populations.",
    check=check,
    inputs=("RO", "RO_N", "single readings"),
    flags="RO",
    formula="Hartigan dip test p < 0.05, or two classes of at least 3 readings more than 0.2 % apart",
    message="The mean is of more than one population",
    source="our default, no publication; dip test: Hartigan & Hartigan 1985, Annals of Statistics 13:70 (from memory)",
    must_not_fire="Where single readings are not at hand (cannot be evaluated), or the remark names populations.",
    example="14 readings at 0.52 ± 0.04 and 9 at 0.88 ± 0.05 reported as mean 0.66: fires.",
)
