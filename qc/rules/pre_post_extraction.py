"""The same split before and after solvent extraction: what the solvent took out of S2."""

import numpy as np
import pandas as pd

from qc.rules.facts import extracted, not_rock
from qc.rules.rule import CANNOT_EVALUATE, REJECT, WARN, Answer, Finding, Rule, fired, judge, merge, say
from qc.rules.spans import exact, line, reported, word
from qc.rules.table import Table

VALUES = ("S1", "S2", "TMAX")


def check(table: Table, *, s2_loss_min: float, tmax_rise_min: float, s2_gain_max: float, s1_left_max: float) -> Answer:
    """For each sample with an extracted split: S2 or Tmax moved, S2 grew (columns swapped), S1 left (extraction incomplete)."""
    rows = table.of("pyrolysis")
    rows = rows[~not_rock(rows)]
    after = extracted(rows)
    pairs = _pairs(rows, after)
    alone = rows.index[after & ~rows["sample"].isin(rows.loc[pairs.index, "sample"]).to_numpy()]
    with np.errstate(invalid="ignore", divide="ignore"):
        loss = (pairs["S2"] - pairs["S2_after"]) / pairs["S2"].where(pairs["S2"] > 0)
        rise = pairs["TMAX_after"] - pairs["TMAX"]
        left = pairs["S1_after"] / pairs["S1"].where(pairs["S1"] > 0)
    facts = pairs.assign(loss=loss, rise=rise, left=left)
    before = rows.loc[pairs.index]
    moved = judge(
        pairs.index,
        applies=True,
        known=loss.notna() | rise.notna(),
        fires=(loss > s2_loss_min) | (rise >= tmax_rise_min),
    )
    grew = judge(pairs.index, applies=True, known=loss.notna(), fires=-loss > s2_gain_max)
    stayed = judge(pairs.index, applies=reported(before, "S1"), known=left.notna(), fires=left > s1_left_max)
    return merge([
        Answer(moved, [_moved(rows, row, line(facts, row), (s2_loss_min, tmax_rise_min)) for row in fired(moved)]),
        Answer(grew, [_grew(row, line(facts, row), s2_gain_max) for row in fired(grew)]),
        Answer(stayed, [_stayed(row, line(facts, row), s1_left_max) for row in fired(stayed)]),
        Answer(pd.Series(CANNOT_EVALUATE, index=alone, dtype=object)),
    ])  # fmt: skip


def _pairs(rows: pd.DataFrame, after: np.ndarray) -> pd.DataFrame:
    """One row a sample measured both ways, indexed by its row before extraction: values before, after, and ``other``."""
    made = pd.DataFrame({name: exact(rows, name) for name in VALUES}, index=rows.index)
    made["sample"], made["other"] = rows["sample"], rows.index
    second = made[after].drop_duplicates("sample").set_index("sample")
    first = made[~after & made["sample"].isin(second.index).to_numpy()].drop_duplicates("sample")
    return first.join(second, on="sample", rsuffix="_after")


def _moved(rows: pd.DataFrame, row: int, fact: pd.Series, limit: tuple[float, float]) -> Finding:
    parts = []
    if fact["loss"] > limit[0]:
        parts.append(f"S2 fell from {say(fact['S2'])} to {say(fact['S2_after'])} mg/g ({100 * fact['loss']:.0f} %)")
    if fact["rise"] >= limit[1]:
        parts.append(f"Tmax rose from {say(fact['TMAX'])} to {say(fact['TMAX_after'])} °C")
    other = int(fact["other_after"])
    labs = [word(rows, one, "lab_number") for one in (row, other)]
    text = f"On extraction {' and '.join(parts)}: heavy free oil stood in S2. Use HI and Tmax after extraction for the kerogen."
    if all(labs) and labs[0] != labs[1]:
        text += f" The lab numbers differ ({labs[0]}, {labs[1]}): make sure that it is one split."
    free = fact["S1"] + fact["S2"] - fact["S2_after"]
    more = {
        "free_oil_mg_g": None if np.isnan(free) else round(float(free), 4),
        "lab_numbers": labs,
        "alternatives": ["the two are different splits", "loss of fines during extraction", "S2 repeatability of a lean sample"],
        "discriminating_test": "paired S2 traces; chromatogram of the extract",
    }  # fmt: skip
    computed = {"S2_loss": _round(fact["loss"]), "TMAX_rise": _round(fact["rise"])}
    return Finding(row, "S2", WARN, text, ("S1", "S2", "TMAX", "TOC"), computed, list(limit), rows=(other,), more=more)


def _grew(row: int, fact: pd.Series, limit: float) -> Finding:
    text = f"S2 after extraction, {say(fact['S2_after'])} mg/g, is above that before, {say(fact['S2'])}: the two may be swapped."
    more = {
        "alternatives": ["before and after swapped", "different splits", "solvent left in the sample"],
        "discriminating_test": "ask the laboratory which split was extracted",
    }
    other = (int(fact["other_after"]),)
    return Finding(row, "S2", REJECT, text, ("S2", "S1", "TMAX"), _round(-fact["loss"]), limit, rows=other, more=more)


def _stayed(row: int, fact: pd.Series, limit: float) -> Finding:
    text = f"S1 after extraction is still {say(fact['S1_after'])} of {say(fact['S1'])} mg/g: the extraction was incomplete."
    more = {
        "alternatives": ["solvent left in the sample", "S1 near its reporting limit"],
        "discriminating_test": "extract again and re-run",
    }
    other = (int(fact["other_after"]),)
    return Finding(row, "S1", WARN, text, ("S1", "S2"), _round(fact["left"]), limit, rows=other, more=more)


def _round(number: float) -> float | None:
    return None if np.isnan(number) else round(float(number), 4)


RULE = Rule(
    id="pre_post_extraction",
    family="suppression",
    title="Before and after solvent extraction",
    tests="Pyrolysis of a sample is compared with that of its extracted split; the remark or preparation says which is which.",
    check=check,
    inputs=("S1", "S2", "TMAX", "remark or preparation"),
    flags="S2 before extraction (S1 where it stayed)",
    formula="S2 falls by more than 15 % or Tmax rises by at least 4 °C; S2 grows by more than 10 %; S1 after > 0.1 S1 before",
    message="Solvent extraction moved S2 or Tmax",
    source="from memory of Clementz 1979, AAPG Bulletin 63:2227, and Delvaux et al. 1990; limits: our default, no publication",
    must_not_fire="On different splits: differing lab numbers are named.",
    example="S2 14.2 to 9.8, Tmax 431 to 441: 31 % and +10 °C, fires; free oil S1 + 4.4 mg/g.",
)
