"""Whether a batch carries the controls that it needs."""

from typing import Any

import numpy as np
import pandas as pd

from qc.rules.asking import nothing, of_sets
from qc.rules.rule import CANNOT_EVALUATE, FIRE, PASS, REJECT, WARN, Answer, Finding, Rule
from qc.rules.table import Table

METHODS = frozenset({"pyrolysis", "carbon", "elements", "isotopes"})


def lacking(unknowns: int, blanks: int, references: int, duplicates: int, every: float) -> list[str]:
    """What a batch of so many unknowns lacks."""
    needed = max(2, int(np.ceil(unknowns / every)))
    missing = []
    if not blanks:
        missing.append("a blank")
    if references < needed:
        missing.append(f"{needed - references} of {needed} reference materials")
    if duplicates < unknowns // every:
        missing.append(f"{int(unknowns // every) - duplicates} of {int(unknowns // every)} duplicates")
    return missing


def check(table: Table, *, every: float, unknowns_min: float) -> Answer:
    """One check a source table, method and well: cannot be evaluated where the table holds no control at all."""
    if table.rows.empty:
        return nothing()
    rows = table.rows[table.rows["method"].isin(METHODS)]
    if rows.empty:
        return nothing()
    controls = table.controls[table.controls["table"] >= 0]
    lines = controls.drop_duplicates(["table", "method", "line"])
    counted = lines.groupby(["table", "method", "role"]).size().to_dict()
    failing = _failing(table, controls)
    entries: list[Any] = []
    for (number, method), group in rows.groupby(["table", "method"], sort=True):  # type: ignore[misc]
        unknown = group[(group["role"] == "sample") & (group["replicate"] == 1)]
        if len(unknown) < unknowns_min:
            continue
        blanks, references = (int(counted.get((number, method, role), 0)) for role in ("blank", "reference"))
        missing = lacking(len(unknown), blanks, references, len(group) - len(unknown), every)
        for _, members in group.groupby("well", sort=True):
            first = int(members.index[0])
            if not blanks + references:
                entries.append((first, CANNOT_EVALUATE, None))
            elif not missing and (number, method) not in failing:
                entries.append((first, PASS, None))
            else:
                entries.append((first, FIRE, _finding(members, missing, (number, method) in failing, len(unknown))))
    return of_sets(entries)


def _failing(table: Table, controls: pd.DataFrame) -> set[tuple[int, str]]:
    """Tables of which every reference that could be judged fails: results were issued all the same."""
    answer = table.answers.get("crm_recovery")
    if answer is None:
        return set()
    places: Any = list(zip(table.rows["table"].astype(int), table.rows["method"].astype(str), strict=True))
    where = dict(zip(table.rows.index.tolist(), places, strict=True))
    failed = {where[one.rows[0]] for one in answer.findings}
    passed = {where[row] for row in answer.outcome.index[answer.outcome == PASS].tolist()}
    return failed - passed


def _finding(rows: pd.DataFrame, missing: list[str], failing: bool, unknowns: int) -> Finding:
    said = [f"the batch of {unknowns} lacks {', '.join(missing)}"] if missing else []
    if failing:
        said.append("every reference material in it fails, and results were issued")
    text = "; ".join(said)
    more = {
        "missing": missing,
        "alternatives": ["controls held in another file: ask"],
        "discriminating_test": "ask for the run sheet",
    }
    members = tuple(int(row) for row in rows.index)
    return Finding(
        None,
        "",
        REJECT if failing else WARN,
        f"{text[0].upper()}{text[1:]}.",
        (),
        unknowns,
        None,
        rows=members,
        more=more,
    )


COVERAGE = Rule(
    id="batch_qc_coverage",
    family="lab_control",
    title="Batches carry their controls",
    tests="A batch that shows controls has a blank, a reference material for every 20 unknowns (two at least) and a duplicate for every 20.",
    check=check,
    inputs=("TOC",),
    flags="TOC",
    formula="no blank, or fewer than max(2, n/20) references, or fewer than n/20 duplicates warns; all references failing is a candidate for rejection",
    message="A batch lacks controls",
    source="practice of a national geological laboratory's organic-petrology sheet; duplicates 1 in 15-20: duplicate note",
    must_not_fire="Where the table holds no control at all: they may be in another file (cannot be evaluated, ask).",
    example="46 unknowns with one reference fires.",
)
RULES = (COVERAGE,)
