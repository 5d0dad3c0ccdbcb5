"""Cuttings intervals of even length, without gaps or overlaps."""

import pandas as pd

from qc.rules.rule import CANNOT_EVALUATE, NOT_APPLICABLE, WARN, Answer, Finding, Rule, fired, judge, merge
from qc.rules.spans import line
from qc.rules.table import Table


def check(table: Table, *, length_ratio: float, overlap_max: float, samples_min: int, share_min: float) -> Answer:
    """One check for each cuttings interval: its own length, and its distance from the one above.

    Laboratories are sent selected samples: where fewer than ``share_min`` of a well's intervals are of one length there
    is no usual one, and where fewer adjoin each other a gap means nothing.
    """
    samples = table.samples()
    cuttings = samples[samples["kind"] == "cuttings"]
    other = pd.Series(NOT_APPLICABLE, index=samples.index.difference(cuttings.index), dtype=object)
    answers = [Answer(other)]
    for _, well in cuttings.groupby("well", sort=True):
        answers.append(_well(well, (length_ratio, overlap_max, samples_min, share_min)))
    return merge(answers)


def _well(cuttings: pd.DataFrame, limits: tuple[float, float, int, float]) -> Answer:
    length_ratio, overlap_max, samples_min, share_min = limits
    lengths = (cuttings["base_m"] - cuttings["top_m"]).where(lambda made: made > 0)
    if lengths.count() < samples_min:
        return Answer(pd.Series(CANNOT_EVALUATE, index=cuttings.index, dtype=object))
    usual = float(lengths.round(2).mode().iloc[0])
    if (lengths.round(2) == usual).sum() < share_min * lengths.count():
        return Answer(pd.Series(NOT_APPLICABLE, index=cuttings.index, dtype=object))
    ordered = cuttings.sort_values(["top_m", "base_m"], kind="stable")
    gap = (ordered["top_m"] - ordered["base_m"].shift(1)).reindex(cuttings.index)
    facts = pd.DataFrame({"length": lengths, "gap": gap}, index=cuttings.index)
    facts["odd"] = (lengths > length_ratio * usual + 1e-9) | (lengths < usual / length_ratio - 1e-9)
    facts["overlap"] = gap < -overlap_max * usual - 1e-9
    series = (gap <= usual).sum() >= share_min * gap.count()
    facts["far"] = (gap > length_ratio * usual + 1e-9) & series
    outcome = judge(
        cuttings.index, applies=True, known=lengths.notna(), fires=facts[["odd", "overlap", "far"]].any(axis=1)
    )
    return Answer(outcome, [_finding(line(facts, row), row, usual, length_ratio) for row in fired(outcome)])


def _finding(fact: pd.Series, row: int, usual: float, ratio: float) -> Finding:
    parts = []
    if fact["odd"]:
        parts.append(f"its length of {fact['length']:.2f} m is not the well's usual {usual:.2f} m")
    if fact["overlap"]:
        parts.append(f"it overlaps the interval above by {-fact['gap']:.2f} m")
    if fact["far"]:
        parts.append(f"{fact['gap']:.2f} m are missing above it")
    more = {
        "usual_length_m": usual,
        "alternatives": ["composite not named as one", "samples not analysed", "typing error in top or base"],
        "discriminating_test": "compare with the sample list of the well",
    }
    computed = float(fact["length"] if fact["odd"] else fact["gap"])
    return Finding(
        row,
        "",
        WARN,
        f"Cuttings interval: {'; '.join(parts)}.",
        (),
        round(computed, 3),
        round(ratio * usual, 3),
        more=more,
    )


RULE = Rule(
    id="cuttings_interval",
    family="depth",
    title="Cuttings intervals follow each other",
    tests="Cuttings are caught over even intervals one below the other.",
    check=check,
    inputs=("top", "base", "sample kind"),
    flags="the sample",
    formula="length > 3 L or < L/3, gap > 3 L, overlap > 1 % of L; L the well's most frequent length",
    message="The interval is not like the others",
    source="our default, no publication",
    must_not_fire="On composites named as such; where the well has no usual length; on gaps between selected samples.",
    example="10 m samples; 2450-2460 and 2455-2465 overlap by 5 m, fires.",
)
