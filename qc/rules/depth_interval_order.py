"""Top above base."""

import pandas as pd

from qc.rules.rule import CANNOT_EVALUATE, FIRE, NOT_APPLICABLE, PASS, REJECT, WARN, Answer, Finding, Rule
from qc.rules.spans import num
from qc.rules.table import Table

STRICT = frozenset({"cuttings", "composite"})


def check(table: Table, *, swapped_share: float, point_share: float) -> Answer:
    """One check a sample with a top; where nearly all of a source table is reversed, one finding for the table."""
    samples = table.samples()
    outcome = pd.Series(PASS, index=samples.index, dtype=object)
    findings: list[Finding] = []
    for _, batch in samples.groupby("table", sort=True):
        both = batch[batch["base_m"].notna()]
        reversed_rows = both[both["top_m"] > both["base_m"]]
        equal = both[(both["top_m"] == both["base_m"]) & both["kind"].isin(STRICT)]
        outcome[batch.index] = NOT_APPLICABLE
        outcome[batch.index[batch["top_m"].isna()]] = CANNOT_EVALUATE
        outcome[both.index] = PASS
        if len(reversed_rows) > 1 and len(reversed_rows) > swapped_share * len(both):
            outcome[reversed_rows.index] = NOT_APPLICABLE
            outcome[reversed_rows.index[0]] = FIRE
            findings.append(_swapped(table, reversed_rows, len(both)))
            continue
        outcome[reversed_rows.index] = FIRE
        findings += [_reversed(table, int(row)) for row in reversed_rows.index]
        if len(equal) <= point_share * both["kind"].isin(STRICT).sum():
            outcome[equal.index] = FIRE
            findings += [_no_length(table, int(row)) for row in equal.index]
    return Answer(outcome, findings)


def _ends(table: Table, row: int) -> str:
    return f"top {num(table.rows, row, 'top_m'):.2f} m, base {num(table.rows, row, 'base_m'):.2f} m"


def _swapped(table: Table, batch: pd.DataFrame, of: int) -> Finding:
    first = int(batch.index[0])
    text = f"Top lies below base in {len(batch)} of {of} rows of the table: were the two columns swapped?"
    more = {
        "alternatives": ["columns swapped", "header reads base, top"],
        "discriminating_test": "look at the header of the file",
    }
    rows = tuple(int(row) for row in batch.index)
    return Finding(first, "", REJECT, text, (), len(batch), of, rows=rows, more=more)


def _reversed(table: Table, row: int) -> Finding:
    text = f"Top lies below base ({_ends(table, row)})."
    more = {
        "alternatives": ["typing error in top or base"],
        "discriminating_test": "compare with the sample list of the well",
    }
    top, base = num(table.rows, row, "top_m"), num(table.rows, row, "base_m")
    return Finding(row, "", REJECT, text, (), top, base, more=more)


def _no_length(table: Table, row: int) -> Finding:
    text = f"The interval has no length ({_ends(table, row)}), though others of the table do."
    more = {
        "alternatives": ["base not filled in", "point depth"],
        "discriminating_test": "compare with the sample list of the well",
    }
    top, base = num(table.rows, row, "top_m"), num(table.rows, row, "base_m")
    return Finding(row, "", WARN, text, (), top, base, more=more)


RULE = Rule(
    id="depth_interval_order",
    family="depth",
    title="Top lies above base",
    tests="The top of an interval must be shallower than its base; a core plug or point sample may have both equal.",
    check=check,
    inputs=("top", "base"),
    flags="the sample",
    formula="top > base; top = base for cuttings where other cuttings of the table have a length",
    message="Top lies below base",
    source="definition of an interval (our default, no publication)",
    must_not_fire="Row by row where more than 80 % are reversed: then one message asks whether columns were swapped.",
    example="Top 2510.0, base 2501.0 fires.",
)
