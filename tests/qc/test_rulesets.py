"""Thresholds: every number with its source, every change with author and reason."""

import pytest

from labdata.errors import InvalidInput, NotAllowed, NotFound
from labdata.models import AuditEntry, Role
from qc.explain import catalogue, explain
from qc.models import RuleSet
from qc.rules import RULES
from qc.rules.rule import FAMILIES
from qc.rules.thresholds import MARKS, defaults, in_words, values
from qc.rulesets import effective_rule_set, new_version, seed
from tests.factories import MembershipFactory, ProjectFactory


@pytest.mark.parametrize("rule", RULES, ids=lambda rule: rule.id)
def test_every_rule_is_fully_described(rule):
    assert rule.id in defaults()
    assert rule.family in FAMILIES
    for text in (
        rule.title,
        rule.tests,
        rule.formula,
        rule.message,
        rule.source,
        rule.must_not_fire,
        rule.example,
        rule.flags,
    ):
        assert text.strip()
    assert rule.check.__doc__
    for name, entry in defaults()[rule.id].items():
        assert set(entry) == {"value", "unit", "source", "mark"}, name
        assert entry["mark"] in MARKS
        assert entry["source"]
        assert entry["unit"]


def test_rule_ids_are_unique_and_no_threshold_is_orphaned():
    ids = [rule.id for rule in RULES]
    assert len(set(ids)) == len(ids)
    assert set(defaults()) == set(ids)


def test_a_memory_is_not_shown_as_a_quotation():
    assert in_words("MEM", "Peters 1986") == "from memory of Peters 1986"
    assert in_words("DEF", "a margin").startswith("our default, no publication")
    assert in_words("READ", "AAPG Wiki") == "AAPG Wiki"
    memories = [entry for names in defaults().values() for entry in names.values() if entry["mark"] == "MEM"]
    assert memories


@pytest.mark.django_db
def test_the_standard_set_is_seeded_once_and_follows_the_shipped_numbers():
    assert RuleSet.objects.get(project=None).version == 1
    assert seed() == seed()
    RuleSet.objects.filter(project=None).update(thresholds={})
    assert seed().version == 2
    assert RuleSet.objects.filter(project=None).count() == 2


@pytest.mark.django_db
def test_a_change_makes_a_new_version_of_the_projects_own():
    member = MembershipFactory(role=Role.GEOCHEMIST)
    project = member.project
    assert effective_rule_set(project).name == "standard"
    changes = {"s2_floor_for_tmax": {"s2_min": 0.3}}
    first = new_version(project=project, changes=changes, author=member.user, reason="our oven's own floor")
    assert (first.name, first.version) == (project.slug, 1)
    assert effective_rule_set(project) == first
    assert values(first.thresholds["s2_floor_for_tmax"])["s2_min"] == 0.3
    assert "our oven's own floor" in first.thresholds["s2_floor_for_tmax"]["s2_min"]["from"]
    second = new_version(
        project=project, changes={}, author=member.user, reason="no mud record", disabled=["oil_based_fluid_interval"]
    )
    assert (second.version, second.disabled) == (2, ["oil_based_fluid_interval"])
    assert values(second.thresholds["s2_floor_for_tmax"])["s2_min"] == 0.3
    entry = AuditEntry.objects.filter(action="rules.change").first()
    assert entry.before["values"] == {"s2_floor_for_tmax": {"s2_min": 0.2}}
    assert effective_rule_set(ProjectFactory()).name == "standard"


@pytest.mark.django_db
@pytest.mark.parametrize(("changes", "disabled", "says"), [
    ({"no_such_rule": {"x": 1.0}}, None, "no threshold"), ({"tmax_range": {"no_such": 1.0}}, None, "no threshold"),
    ({"tmax_range": {"warn_below": float("nan")}}, None, "cannot be nan"), ({"tmax_range": {"warn_below": "400"}}, None, "cannot be"),
    ({}, ["no_such_rule"], "no rule"),
])  # fmt: skip
def test_a_change_that_makes_no_sense_is_refused(changes, disabled, says):
    member = MembershipFactory(role=Role.GEOCHEMIST)
    with pytest.raises(InvalidInput, match=says):
        new_version(project=member.project, changes=changes, author=member.user, reason="why", disabled=disabled)
    assert not RuleSet.objects.filter(project=member.project).exists()


@pytest.mark.django_db
def test_a_change_needs_a_reason_and_the_right():
    member = MembershipFactory(role=Role.GEOCHEMIST)
    with pytest.raises(InvalidInput, match="reason"):
        new_version(project=member.project, changes={}, author=member.user, reason=" ")
    analyst = MembershipFactory(project=member.project, role=Role.ANALYST)
    with pytest.raises(NotAllowed):
        new_version(project=member.project, changes={}, author=analyst.user, reason="why")


@pytest.mark.django_db
def test_a_rule_is_explained_with_the_numbers_in_force():
    member = MembershipFactory(role=Role.GEOCHEMIST)
    changes = {"s2_floor_for_tmax": {"s2_min": 0.3}}
    rule_set = new_version(
        project=member.project, changes=changes, author=member.user, reason="our oven", disabled=["tmax_range"]
    )
    told = explain("s2_floor_for_tmax", rule_set)
    number = next(one for one in told["thresholds"] if one["name"] == "s2_min")
    assert (number["value"], number["default"], number["changed"], number["unit"]) == (0.3, 0.2, True, "mg/g")
    assert number["source"] == "from memory of Peters 1986, AAPG Bulletin 70:318"
    assert "our oven" in number["from"]
    assert told["must_not_fire"]
    assert [rule["id"] for rule in catalogue(rule_set) if not rule["enabled"]] == ["tmax_range"]
    with pytest.raises(NotFound, match="no rule"):
        explain("no_such_rule", rule_set)
