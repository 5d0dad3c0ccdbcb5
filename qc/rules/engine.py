"""Run every rule of a rule set over a table."""

from collections.abc import Callable, Collection, Mapping
from dataclasses import replace

from qc.rules import RULES
from qc.rules.evidence import Witness
from qc.rules.rule import Answer, Rule
from qc.rules.s2_toc import ARITHMETIC, CONTAMINATION
from qc.rules.table import Table
from qc.rules.thresholds import Parameters, defaults, values

RuleSetValues = Mapping[str, Parameters]
HEEDED = frozenset((*CONTAMINATION, *ARITHMETIC))  # rules whose findings later rules pay heed to


def parameters(rule: Rule, given: RuleSetValues) -> dict[str, Mapping[str, object]]:
    """The rule's numbers: as the rule set has them, shipped ones where it has none (a set older than the rule)."""
    return {**defaults()[rule.id], **given.get(rule.id, {})}


def run(
    table: Table,
    given: RuleSetValues | None = None,
    disabled: Collection[str] = (),
    dismissed: Collection[str] = (),
    step: Callable[[str], None] = lambda rule: None,
) -> dict[str, Answer]:
    """Rule id -> answer, in the order of ``RULES``. ``step`` is called with each rule's id before it runs.

    ``dismissed``: fingerprints of flags that a reviewer dismissed; they still fire, but fits no longer heed them.
    """
    answers: dict[str, Answer] = {}
    witness = Witness(table) if dismissed else None
    for rule in RULES:
        if rule.id in disabled:
            continue
        step(rule.id)
        numbers = parameters(rule, given or {})
        answer = rule.check(table.knowing(answers), **values(numbers))
        if witness and answer.findings and rule.id in HEEDED:
            prints = [witness.fingerprint(rule, numbers, finding) for finding in answer.findings]
            answer = replace(answer, settled=frozenset(at for at, one in enumerate(prints) if one in dismissed))
        answers[rule.id] = answer
    return answers
