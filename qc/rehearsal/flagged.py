"""What rules said of a table, in a form that two tables can be compared by."""

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Final

from qc.rules import RULES
from qc.rules.rule import INFO, REJECT, WARN, Answer, Finding
from qc.rules.spans import num, word
from qc.rules.table import Table

#: These say how far a correct measurement may be read (an index of lean rock, OI beside carbonate, Tmax of a small peak).
#: Such a statement is true of the rock and doubts no measurement: it neither catches another fault nor is a false alarm.
LIMITS_OF_READING: Final = frozenset({"toc_floor_for_indices", "s3_carbonate_interference", "s2_floor_for_tmax"})
WEIGHT: Final = {INFO: 0, WARN: 1, REJECT: 2}
FAMILY: Final = {rule.id: rule.family for rule in RULES}

Mark = tuple[str, str]  # rule, analyte
SetMark = tuple[str, int, str, str]  # rule, well, unit and kind of its first sample


@dataclass
class Flagged:
    """Warnings and candidates for rejection. ``samples``: sample -> mark -> weight; ``sets``: mark -> (weight, samples)."""

    samples: dict[int, dict[Mark, int]] = field(default_factory=dict)
    sets: dict[SetMark, tuple[int, set[int]]] = field(default_factory=dict)


def flagged(table: Table, answers: Mapping[str, Answer]) -> Flagged:
    """Findings of weight by sample, those of whole units or batches apart."""
    made, sample = Flagged(), table.rows["sample"].to_numpy()
    for rule, answer in answers.items():
        for finding in answer.findings:
            weight = WEIGHT[finding.severity]
            if not weight:
                continue
            if finding.row is None:
                made.sets[_set_mark(table, rule, finding)] = (weight, {int(sample[row]) for row in finding.rows})
                continue
            marks = made.samples.setdefault(int(sample[finding.row]), {})
            marks[rule, finding.analyte] = max(weight, marks.get((rule, finding.analyte), 0))
    return made


def _set_mark(table: Table, rule: str, finding: Finding) -> SetMark:
    first = finding.rows[0]
    return rule, int(num(table.rows, first, "well")), word(table.rows, first, "unit"), word(table.rows, first, "kind")


def fresh(now: Flagged, before: Flagged, sample: int) -> set[str]:
    """Rules whose mark on the sample is new or heavier."""
    was = before.samples.get(sample, {})
    return {mark[0] for mark, weight in now.samples.get(sample, {}).items() if weight > was.get(mark, 0)}


def fresh_sets(now: Flagged, before: Flagged) -> dict[SetMark, set[int]]:
    """Marks on units or batches that are new or heavier, and their samples."""
    return {
        mark: samples for mark, (weight, samples) in now.sets.items() if weight > before.sets.get(mark, (0, set()))[0]
    }


def doubted(found: Flagged) -> set[int]:
    """Samples that a rule doubts already: no fault is put on top of another, and none of them counts as clean."""
    made = {
        sample for sample, marks in found.samples.items() if any(rule not in LIMITS_OF_READING for rule, _ in marks)
    }
    for mark, (weight, samples) in found.sets.items():
        if FAMILY.get(mark[0]) == "contamination" or weight == WEIGHT[REJECT]:
            made |= samples
    return made
