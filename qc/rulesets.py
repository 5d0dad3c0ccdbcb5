"""Rule sets: versioned thresholds. Every project starts with the standard set; a change makes a new version of its own."""

import math
from collections.abc import Collection, Mapping
from typing import Any

from django.contrib.auth.models import User
from django.db import transaction

from labdata import audit
from labdata.access import Action, require
from labdata.errors import InvalidInput
from labdata.models import Project
from qc.models import RuleSet
from qc.rules import RULES
from qc.rules.thresholds import defaults

STANDARD = "standard"
Changes = Mapping[str, Mapping[str, float]]


def seed(using: str = "default") -> RuleSet:
    """The standard set as shipped; a further version when a later release ships other thresholds. Idempotent."""
    sets = RuleSet.objects.using(using).filter(project=None, name=STANDARD)
    last = sets.order_by("-version").first()
    if last is not None and last.thresholds == defaults():
        return last
    reason = "thresholds as shipped" if last is None else "thresholds of a later release"
    version = last.version + 1 if last else 1
    return RuleSet.objects.using(using).create(
        project=None, name=STANDARD, version=version, thresholds=defaults(), reason=reason
    )


def effective_rule_set(project: Project) -> RuleSet:
    """The newest version of the project's own set, else the standard one."""
    own = RuleSet.objects.filter(project=project).order_by("-version", "-id").first()
    return own or RuleSet.objects.filter(project=None, name=STANDARD).order_by("-version").first() or seed()


@transaction.atomic
def new_version(
    *, project: Project, changes: Changes, author: User, reason: str, disabled: Collection[str] | None = None
) -> RuleSet:
    """A new version of the project's set: ``changes`` is rule -> parameter -> number; ``disabled`` the rules switched off.

    None for ``disabled`` leaves them as they are. Earlier versions stay, and runs keep naming the one they used.
    Raises NotAllowed, and InvalidInput for an unknown rule or parameter, for what is no number, or without a reason.
    """
    require(author, project, Action.EDIT_RULES)
    if not reason.strip():
        raise InvalidInput(
            "A change of thresholds needs a reason.", remedy="Say why the numbers change.", field="reason"
        )
    Project.objects.select_for_update().get(pk=project.pk)
    before = effective_rule_set(project)
    off = sorted(before.disabled if disabled is None else _known(disabled))
    version = before.version + 1 if before.project_id else 1
    where = f"{project.slug} version {version}, by {author.get_username()}: {reason.strip()}"
    thresholds = _changed({**defaults(), **before.thresholds}, changes, where)
    made = RuleSet.objects.create(
        project=project, name=project.slug, version=version, thresholds=thresholds, disabled=off, author=author,
        reason=reason.strip(),
    )  # fmt: skip
    was = {
        rule: {name: before.thresholds.get(rule, {}).get(name, {}).get("value") for name in names}
        for rule, names in changes.items()
    }
    audit.record(
        "rules.change", made, actor=author, project=project, reason=reason.strip(),
        before={"values": was, "disabled": before.disabled},
        after={"values": {rule: dict(names) for rule, names in changes.items()}, "disabled": off, "version": version},
    )  # fmt: skip
    return made


def _known(rules: Collection[str]) -> list[str]:
    ids = {rule.id for rule in RULES}
    for rule in rules:
        if rule not in ids:
            raise InvalidInput(
                f"There is no rule «{rule}».", remedy=f"Rules: {', '.join(sorted(ids))}.", field="disabled"
            )
    return list(rules)


def changed_thresholds(thresholds: Mapping[str, Any], changes: Changes) -> dict[str, Any]:
    """The thresholds as they would be after ``changes``, kept nowhere. Raises InvalidInput as ``new_version`` does."""
    return _changed({**defaults(), **thresholds}, changes, "proposed")


def _changed(thresholds: Mapping[str, Any], changes: Changes, where: str) -> dict[str, Any]:
    """A copy of the thresholds with the changes in it, each saying where it is from."""
    made = {rule: {name: dict(entry) for name, entry in names.items()} for rule, names in thresholds.items()}
    for rule, names in changes.items():
        for name, value in names.items():
            if rule not in made or name not in made[rule]:
                known = ", ".join(made.get(rule, made))
                raise InvalidInput(
                    f"There is no threshold «{rule}.{name}».", remedy=f"Known: {known}.", field=f"{rule}.{name}"
                )
            if isinstance(value, bool) or not isinstance(value, int | float) or not math.isfinite(value):
                raise InvalidInput(
                    f"{rule}.{name} cannot be {value!r}.", remedy="Give a finite number.", field=f"{rule}.{name}"
                )
            made[rule][name] |= {"value": value, "from": where}
    return made
