"""Before other thresholds are saved: which flags they would bring and which they would take."""

import pytest

from labdata.errors import InvalidInput
from qc.models import Flag, QcRun, RuleSet
from qc.rehearsal.preview import preview
from qc.rulesets import effective_rule_set
from tests.factories import ProjectFactory
from tests.qc.storing import store

pytestmark = pytest.mark.django_db
RULE = "s2_floor_for_tmax"
REPORT = [
    {"well": "Quill 1", "label": "S-1", "top_m": 2000.0, "S2": "0.14", "TMAX": "431"},
    {"well": "Quill 1", "label": "S-2", "top_m": 2010.0, "S2": "0.60", "TMAX": "432"},
    {"well": "Quill 1", "label": "S-3", "top_m": 2020.0, "S2": "3.10", "TMAX": "433"},
]


def of_rule(told, rule=RULE):
    return next(row for row in told["rules"] if row["rule"] == rule)


def test_flags_that_would_appear_and_vanish():
    project = store(REPORT)
    effective_rule_set(project)
    before = RuleSet.objects.count()
    told = preview(project, {RULE: {"s2_warn": 0.7}}, [])
    assert (told["appear"], told["vanish"], told["wells"]) == (1, 0, 1)
    assert "S-2" in of_rule(told)["appearing"][0]
    told = preview(project, {RULE: {"s2_min": 0.1}}, [])
    assert (told["appear"], told["vanish"]) == (1, 1)  # the candidate for rejection becomes a warning
    assert (RuleSet.objects.count(), Flag.objects.count(), QcRun.objects.count()) == (before, 0, 0)


def test_a_rule_switched_off_takes_its_flags():
    told = preview(store(REPORT), {}, [RULE])
    row = of_rule(told)
    assert (row["before"], row["after"], row["vanish"]) == (1, 0, 1)
    assert "S-1" in row["vanishing"][0]


def test_no_change_no_data_and_a_wrong_number():
    project = store(REPORT)
    assert preview(project, {}, [])["rules"] == []
    assert preview(ProjectFactory(), {RULE: {"s2_min": 0.3}}, [])["wells"] == 0
    with pytest.raises(InvalidInput):
        preview(project, {RULE: {"s2_mim": 0.3}}, [])
