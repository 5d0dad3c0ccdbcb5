"""A rule in plain words, for the page about it."""

from typing import Any

from labdata.errors import NotFound
from qc.models import RuleSet
from qc.rules import RULES
from qc.rules.engine import parameters
from qc.rules.rule import Rule
from qc.rules.thresholds import defaults, in_words

MARKS = {
    "READ": "seen in a public page",
    "MEM": "from memory, not re-read: check before quoting",
    "DEF": "our own default, no publication",
}


def find(rule_id: str) -> Rule:
    """The rule by its id. Raises NotFound."""
    for rule in RULES:
        if rule.id == rule_id:
            return rule
    raise NotFound(
        f"There is no rule «{rule_id}».", remedy=f"Rules: {', '.join(rule.id for rule in RULES)}.", rule=rule_id
    )


def explain(rule_id: str, rule_set: RuleSet) -> dict[str, Any]:
    """What the rule tests, with which numbers and from where, when it must be silent, and a worked example."""
    rule = find(rule_id)
    return {
        "id": rule.id, "family": rule.family, "title": rule.title, "tests": rule.tests, "formula": rule.formula,
        "inputs": list(rule.inputs), "flags": rule.flags, "message": rule.message, "source": rule.source,
        "must_not_fire": rule.must_not_fire, "example": rule.example, "version": rule.version,
        "enabled": rule.id not in rule_set.disabled,
        "rule_set": {"name": rule_set.name, "version": rule_set.version},
        "thresholds": [_threshold(rule, name, dict(entry)) for name, entry in parameters(rule, rule_set.thresholds).items()],
    }  # fmt: skip


def catalogue(rule_set: RuleSet) -> list[dict[str, Any]]:
    """All rules in the order in which they run."""
    return [explain(rule.id, rule_set) for rule in RULES]


def _threshold(rule: Rule, name: str, entry: dict[str, Any]) -> dict[str, Any]:
    shipped = defaults()[rule.id].get(name, {})
    return {
        "name": name, "label": name.replace("_", " "), "value": entry["value"], "unit": entry["unit"],
        "source": in_words(entry["mark"], entry["source"]), "mark": entry["mark"], "mark_means": MARKS[entry["mark"]],
        "from": entry.get("from", "default"), "default": shipped.get("value"),
        "changed": entry["value"] != shipped.get("value"),
    }  # fmt: skip
