"""What other thresholds would change on a project's own data: which flags would appear, which would go."""

from collections.abc import Collection, Mapping, Sequence
from typing import Any

from labdata.models import Project
from qc.rehearsal.services import drawn_wells
from qc.rules import RULES
from qc.rules.engine import run
from qc.rules.rule import Answer
from qc.rules.spans import num, word
from qc.rules.table import Table
from qc.rulesets import Changes, changed_thresholds, effective_rule_set
from qc.services import dismissed
from qc.tables import read

EXAMPLES = 5
ANALYSES_MAX = 2000  # a page waits for it
Mark = tuple[str, tuple[int, ...], str, str]  # rule, rows, analyte, severity


def preview(project: Project, changes: Changes, disabled: Collection[str]) -> dict[str, Any]:
    """Rows a rule with flags now, after, appearing and vanishing; examples in words. Nothing is kept.

    ``disabled`` are the rules switched off after the change. Raises InvalidInput for an unknown rule, parameter or number.
    A large project is looked at in a draw of its wells; ``wells`` says how many of how many.
    """
    before = effective_rule_set(project)
    proposed = changed_thresholds(before.thresholds, changes)
    wells, known = drawn_wells(project, seed=1, analyses_max=ANALYSES_MAX)
    made: dict[str, Any] = {"wells": len(wells), "wells_known": known, "rules": [], "appear": 0, "vanish": 0}
    if not wells:
        return made
    table, answered = read(wells), dismissed(wells)
    was = marks(run(table, before.thresholds, before.disabled, answered))
    now = marks(run(table, proposed, disabled, answered))
    for rule in RULES:
        row = _row(table, rule.id, was.get(rule.id, {}), now.get(rule.id, {}))
        if row["appear"] or row["vanish"]:
            made["rules"].append(row)
            made["appear"] += row["appear"]
            made["vanish"] += row["vanish"]
    return made


def marks(answers: Mapping[str, Answer]) -> dict[str, dict[Mark, str]]:
    """Rule -> flag -> its message. Two flags are the same when they say the same weight of the same value."""
    return {
        rule: {
            (rule, finding.rows[:1] if finding.row is None else (finding.row,), finding.analyte, finding.severity): finding.message
            for finding in answer.findings
        }
        for rule, answer in answers.items()
    }  # fmt: skip


def _row(table: Table, rule: str, was: Mapping[Mark, str], now: Mapping[Mark, str]) -> dict[str, Any]:
    new, gone = sorted(now.keys() - was.keys()), sorted(was.keys() - now.keys())
    return {
        "rule": rule, "before": len(was), "after": len(now), "appear": len(new), "vanish": len(gone),
        "appearing": _examples(table, new, now), "vanishing": _examples(table, gone, was),
    }  # fmt: skip


def _examples(table: Table, found: Sequence[Mark], messages: Mapping[Mark, str]) -> list[str]:
    """The first few in words: well, sample, weight and what the rule says."""
    said = []
    for mark in found[:EXAMPLES]:
        row = mark[1][0]
        well = word(table.wells, int(num(table.rows, row, "well")), "name")
        said.append(f"{well} {table.name(row)}, {mark[3]}: {messages[mark]}")
    return said
