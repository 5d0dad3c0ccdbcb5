"""Run every rule of a rule set over a table."""

from collections.abc import Callable, Collection, Mapping

from qc.rules import RULES
from qc.rules.rule import Answer, Rule
from qc.rules.table import Table
from qc.rules.thresholds import Parameters, defaults, values

RuleSetValues = Mapping[str, Parameters]


def parameters(rule: Rule, given: RuleSetValues) -> dict[str, Mapping[str, object]]:
    """The rule's numbers: as the rule set has them, shipped ones where it has none (a set older than the rule)."""
    return {**defaults()[rule.id], **given.get(rule.id, {})}


def run(
    table: Table,
    given: RuleSetValues | None = None,
    disabled: Collection[str] = (),
    step: Callable[[str], None] = lambda rule: None,
) -> dict[str, Answer]:
    """Rule id -> answer, in the order of ``RULES``. ``step`` is called with each rule's id before it runs."""
    answers: dict[str, Answer] = {}
    for rule in RULES:
        if rule.id not in disabled:
            step(rule.id)
            answers[rule.id] = rule.check(table.knowing(answers), **values(parameters(rule, given or {})))
    return answers
