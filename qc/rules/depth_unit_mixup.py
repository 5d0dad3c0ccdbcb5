"""Feet read as metres, or metres as feet: seen over a whole table, never in one row."""

import numpy as np
import pandas as pd

from qc.rules.rule import CANNOT_EVALUATE, FIRE, NOT_APPLICABLE, PASS, REJECT, Answer, Finding, Rule
from qc.rules.spans import Bools, Floats, num
from qc.rules.table import Table

FOOT = 0.3048  # m, exact (Federal Register notice 2020-21902)
FEET_AS_METRES, METRES_AS_FEET = "feet read as metres", "metres read as feet"


def check(table: Table, *, log_tolerance: float, share_min: float, samples_min: int) -> Answer:
    """One check for each well and source table with depths.

    Three witnesses, the first that can speak decides: the same sample labels in an earlier table, the core runs, total
    depth. A well with none of them cannot be evaluated.
    """
    samples = table.samples()
    outcomes: dict[int, str] = {}
    findings: list[Finding] = []
    deep = samples[samples["top_m"].notna() & samples["kind"].ne("outcrop")]
    for _, batch in deep.groupby(["well", "table"], sort=True):
        first = int(batch.index[0])
        if len(batch) < samples_min:
            outcomes[first] = NOT_APPLICABLE
            continue
        spoken = [
            _labels(batch, deep, log_tolerance, samples_min), _cores(batch, table, share_min), _depth(batch, table, share_min)
        ]  # fmt: skip
        heard = [one for one in spoken if one is not None]
        slip = next((one for one in heard if one[0]), None)
        outcomes[first] = FIRE if slip else PASS if heard else CANNOT_EVALUATE
        if slip:
            findings.append(_finding(batch, *slip))
    return Answer(pd.Series(outcomes, dtype=object), findings)


Word = tuple[str, str, float]  # which slip (empty: none), who says so, the ratio of depths or the share of rows


def _labels(batch: pd.DataFrame, samples: pd.DataFrame, tolerance: float, samples_min: int) -> Word | None:
    """Depths of the same labels in an earlier table of the well: their median ratio against 3.28084."""
    earlier = samples[
        (samples["well"] == batch["well"].iloc[0])
        & (samples["table"] < batch["table"].iloc[0])
        & samples["label"].ne("")
    ]
    known = earlier.drop_duplicates("label").set_index("label")["top_m"]
    shared = batch[batch["label"].isin(known.index) & (batch["top_m"] > 0)]
    if len(shared) < samples_min:
        return None
    ratio = float(np.median(shared["top_m"].to_numpy() / known[shared["label"]].to_numpy()))
    if not ratio > 0:
        return None
    for slip, factor in ((FEET_AS_METRES, 1 / FOOT), (METRES_AS_FEET, FOOT)):
        if abs(np.log(ratio) - np.log(factor)) < tolerance:
            return slip, "the same sample labels in an earlier table", ratio
    return "", "", ratio


def _cores(batch: pd.DataFrame, table: Table, share_min: float) -> Word | None:
    """Core samples outside every run that lie inside once the unit is changed."""
    runs = table.cores[table.cores["well"] == batch["well"].iloc[0]]
    depth = batch.loc[batch["kind"].isin(["core", "plug"]), "top_m"].to_numpy(dtype=float)
    if runs.empty or not len(depth):
        return None
    spans = list(zip(runs["top_m"].astype(float), runs["base_m"].astype(float), strict=True))
    outside = ~_inside(depth, spans)
    for slip, factor in ((FEET_AS_METRES, FOOT), (METRES_AS_FEET, 1 / FOOT)):
        share = float((outside & _inside(depth * factor, spans)).mean())
        if share > share_min:
            return slip, "the core runs", share
    return "", "", 0.0


def _inside(depth: Floats, spans: list[tuple[float, float]]) -> Bools:
    return np.logical_or.reduce([(depth >= top - 1) & (depth <= base + 1) for top, base in spans])


def _depth(batch: pd.DataFrame, table: Table, share_min: float) -> Word | None:
    """Depths below total depth that lie within the well once taken as feet."""
    td = num(table.wells, int(batch["well"].iloc[0]), "td_m")
    if np.isnan(td):
        return None
    depth = batch["top_m"].to_numpy(dtype=float)
    share = float(((depth > td) & (depth * FOOT <= td)).mean())
    return (FEET_AS_METRES, "total depth", share) if share > share_min else ("", "", share)


def _finding(batch: pd.DataFrame, slip: str, witness: str, number: float) -> Finding:
    text = f"The depths of {len(batch)} samples look like {slip}, by {witness}."
    factor = FOOT if slip == FEET_AS_METRES else 1 / FOOT
    more = {
        "witness": witness,
        "proposed_factor": factor,
        "examples": [[round(float(top), 3), round(float(top) * factor, 3)] for top in batch["top_m"].head(3)],
        "alternatives": ["two wells in one file", "measured against true vertical depth in a long-reach well"],
        "discriminating_test": "ask the laboratory for the depth unit of the table; nothing is converted here",
    }
    rows = tuple(int(row) for row in batch.index)
    return Finding(None, "", REJECT, text, (), round(number, 5), round(1 / FOOT, 5), rows=rows, more=more)


RULE = Rule(
    id="depth_unit_mixup",
    family="depth",
    title="Depths are in the unit stated",
    tests="Over a whole table depths are compared with earlier depths of the same samples, core runs and total depth.",
    check=check,
    inputs=("top", "sample label", "core runs", "total depth of the well"),
    flags="the samples of a table",
    formula="|ln r ∓ ln 3.28084| < 0.02 for the median ratio r; or more than 90 % of rows fit the well only after conversion",
    message="Feet and metres are mixed up",
    source="1 ft = 0.3048 m: Federal Register notice 2020-21902; limits: our default, no publication",
    must_not_fire="On single rows; near the top of a well; where nothing is known to compare with (cannot be evaluated).",
    example="8202.1 for a core cut at 2500 m: r = 3.28084, fires.",
)
