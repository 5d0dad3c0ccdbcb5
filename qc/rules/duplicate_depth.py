"""Two rows for one depth, or two depths for one sample."""

import itertools

import numpy as np
import pandas as pd

from qc.rules.facts import extracted
from qc.rules.rule import INFO, NOT_APPLICABLE, PASS, REJECT, WARN, Answer, Finding, Rule, merge, say
from qc.rules.spans import num, word
from qc.rules.table import ANALYTES, Table

SLOT = ["well", "kind", "top_m", "base_m", "method", "file", "extracted"]


def check(table: Table, *, same_label_apart: float, label_repeat_max: float) -> Answer:
    """For each analysis: another of the same depth, kind, method and report not flagged as replicate; for each sample: its label at
    another depth."""
    return merge([_same_depth(table), _same_label(table, same_label_apart, label_repeat_max)])


def _same_depth(table: Table) -> Answer:
    rows = table.rows
    stated = rows["replicate_stated"] | (rows["role"] == "duplicate")
    rows = rows.assign(extracted=extracted(rows))
    judged = rows[rows["top_m"].notna() & ~stated].sort_values(["table", "line"], kind="stable")
    outcome = pd.Series(NOT_APPLICABLE, index=rows.index, dtype=object)
    outcome[judged.index] = PASS
    findings: list[Finding] = []
    repeated = judged[judged.duplicated(SLOT, keep=False)]
    for _, group in repeated.groupby(SLOT, sort=True, dropna=False):
        for first, second in itertools.pairwise(group.index):
            finding = _pair(table, int(first), int(second))
            if finding:
                outcome[second] = "fire"
                findings.append(finding)
    return Answer(outcome, findings)


def _pair(table: Table, first: int, second: int) -> Finding | None:
    """What two analyses of one depth say about each other; None where they measured nothing in common."""
    rows = table.rows
    shared = [
        name for name in ANALYTES
        if all(num(rows, row, f"{name}_row") == row and not np.isnan(num(rows, row, name)) for row in (first, second))
    ]  # fmt: skip
    if not shared:
        return None
    unlike = [
        name for name in shared
        if (num(rows, first, name), word(rows, first, f"{name}_q")) != (num(rows, second, name), word(rows, second, f"{name}_q"))
    ]  # fmt: skip
    where = f"at {num(rows, second, 'top_m'):.2f} m"
    more = {"discriminating_test": "ask the laboratory whether the second is a replicate"}
    if not unlike:
        text = f"Two lines {where} hold the same {word(rows, second, 'method')} results to the last decimal."
        causes = {"alternatives": ["line entered twice"]}
        return Finding(
            second, shared[0], INFO, text, tuple(shared[:4]), None, None, rows=(first,), more={**causes, **more}
        )
    name = unlike[0]
    text = f"Two {word(rows, second, 'method')} lines {where} differ ({name} {say(num(rows, first, name))} and {say(num(rows, second, name))}) and neither is flagged a replicate."
    causes = {"alternatives": ["replicate not flagged", "depth of one sample wrong", "two samples of one depth"]}
    pair = [num(rows, first, name), num(rows, second, name)]
    return Finding(second, name, WARN, text, tuple(unlike[:4]), pair, None, rows=(first,), more={**causes, **more})


def _same_label(table: Table, apart: float, repeat_max: float) -> Answer:
    samples = table.samples()
    named = samples[samples["label"].str.contains(r"\d", regex=True) & samples["top_m"].notna()]
    outcome = pd.Series(NOT_APPLICABLE, index=samples.index, dtype=object)
    findings: list[Finding] = []
    for _, well in named.groupby("well", sort=True):
        depths = well.groupby("label")["top_m"]
        spread = depths.transform("max") - depths.transform("min")
        outcome[well.index] = PASS
        twice = well[spread > apart]
        if len(twice) > max(2.0, repeat_max * len(well)):
            outcome[well.index] = NOT_APPLICABLE  # such labels do not name a sample
            continue
        for label, group in twice.groupby("label", sort=True):
            last = int(group.sort_values(["table", "line"], kind="stable").index[-1])
            outcome[last] = "fire"
            findings.append(_two_depths(str(label), group, last))
    return Answer(outcome, findings)


def _two_depths(label: str, group: pd.DataFrame, row: int) -> Finding:
    depths = sorted({round(float(depth), 3) for depth in group["top_m"]})
    text = f"Sample {label} is reported at {' and '.join(f'{depth:.2f}' for depth in depths)} m."
    more = {
        "alternatives": ["depth slip", "label used twice"],
        "discriminating_test": "compare with the sample list of the well",
    }
    others = tuple(int(other) for other in group.index if other != row)
    return Finding(row, "", REJECT, text, (), depths, None, rows=others, more=more)


RULE = Rule(
    id="duplicate_depth",
    family="depth",
    title="One result for one depth, one depth for one sample",
    tests="Two lines of a report for the same depth, kind and method, and one label at two depths.",
    check=check,
    inputs=("sample label", "top", "base", "sample kind", "method"),
    flags="the first value that differs, else the sample",
    formula="same well, depth, kind, method and report with distinct results; the same to all decimals; one label at two depths",
    message="The depth or the sample is reported twice",
    source="our default, no publication",
    must_not_fire="On replicates and duplicates flagged as such; on labels that repeat as a rule.",
    example="2510.0 with TOC 2.1 and 2510.0 with TOC 3.4, no replicate flag: fires.",
)
