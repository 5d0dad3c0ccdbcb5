"""A rehearsal on clean wells: what is caught, what is counted as an alarm, and that it repeats itself exactly."""

import json

import pytest

from qc.rehearsal import run as rehearsal
from qc.rehearsal.faults import KINDS
from qc.rehearsal.flagged import Flagged, fresh
from qc.rehearsal.kind import STRENGTHS
from qc.rehearsal.run import Terms, caught_by, rehearse
from qc.rules.records import table_of
from tests.qc.rehearsal.wells import clean, records

QUICK = ("index_digits",)


@pytest.fixture
def quick(monkeypatch):
    monkeypatch.setattr(rehearsal, "KINDS", tuple(kind for kind in KINDS if kind.id in QUICK))


@pytest.fixture(scope="module")
def told():
    """All kinds, once each."""
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(rehearsal, "SPARSE_REPEATS", 1)
        return rehearse(clean(per_unit=20), Terms(), seed=1)


def test_strong_and_moderate_faults_are_caught(told):
    assert len(told["kinds"]) == len(KINDS) * len(STRENGTHS)
    for entry in told["kinds"]:
        assert entry["applicable"], entry
        assert entry["rate"] >= (0.95 if entry["strength"] == "strong" else 0.80), entry


def test_clean_rock_is_left_alone(told):
    alarms = told["false_alarms"]
    assert alarms["rate"] <= 0.03
    assert alarms["after_injection"]["rate"] <= 0.03


def test_the_answer_is_plain_and_complete(told):
    assert json.loads(json.dumps(told)) == told
    for entry in told["kinds"]:
        assert {"kind", "strength", "definition", "injected", "caught", "rate", "rules", "missed"} <= entry.keys()
        assert entry["caught"] <= entry["injected"]
        assert len(entry["missed"]) <= rehearsal.EXAMPLES
    assert {"analyses", "flagged", "rate", "by_rule"} <= told["false_alarms"].keys()


def test_the_same_seed_gives_the_same_answer_and_another_another(quick):
    table = clean(per_unit=6)
    first = rehearse(table, Terms(), seed=3)
    assert rehearse(table, Terms(), seed=3) == first
    copies = [
        rehearsal.inject(rehearsal.Copy(table), KINDS[6], "strong", KINDS[6].targets(table, table.rows.index),
                         rehearsal._random(seed, KINDS[6], "strong", 0))
        for seed in (3, 4)
    ]  # fmt: skip
    assert copies[0] != copies[1]


def test_what_data_cannot_carry_is_said_with_its_reason(quick):
    bare = [{"well": 0, "label": f"A-{n}", "top_m": 100.0 + n, "TOC": "1.20"} for n in range(6)]
    told = rehearse(table_of(bare), Terms(), seed=1)
    for entry in told["kinds"]:
        assert not entry["applicable"]
        assert entry["rate"] is None
        assert entry["reason"]


def test_switched_off_rules_catch_nothing(quick):
    told = rehearse(clean(per_unit=6, wells=1), Terms(disabled={"index_recalc"}), seed=1)
    entry = next(one for one in told["kinds"] if one["kind"] == "index_digits" and one["strength"] == "strong")
    assert entry["caught"] == 0
    assert entry["missed"]


def test_doubted_samples_carry_no_fault_and_accepted_ones_are_no_alarm(quick):
    listed = records(per_unit=6)
    listed[3]["HI"] = "999"
    table = table_of(listed, wells=[{"name": "Quill 1", "td_m": 2405.0}, {"name": "Brill 7", "td_m": 2405.0}])
    open_fault = rehearse(table, Terms(), seed=1)["false_alarms"]
    assert open_fault["by_rule"].get("index_recalc") == 1
    accepted = rehearse(table, Terms(faulty=frozenset({3})), seed=1)["false_alarms"]
    assert "index_recalc" not in accepted["by_rule"]
    assert accepted["analyses"] == open_fault["analyses"] - 1


def test_limits_of_reading_catch_only_their_own_kind():
    before, now = Flagged(), Flagged(samples={0: {("s2_floor_for_tmax", "TMAX"): 1}})
    table = clean(per_unit=2, wells=1)
    by_id = {kind.id: kind for kind in KINDS}
    one = rehearsal.Injected((0,), "x")
    assert caught_by(table, by_id["tmax_of_tiny_s2"], one, now=now, before=before) == ["s2_floor_for_tmax"]
    assert caught_by(table, by_id["decimal_s2"], one, now=now, before=before) == []


def test_a_flag_that_stood_before_catches_nothing_unless_it_grows_heavier():
    before = Flagged(samples={0: {("tmax_range", "TMAX"): 1}})
    assert fresh(before, before, 0) == set()
    assert fresh(Flagged(samples={0: {("tmax_range", "TMAX"): 2}}), before, 0) == {"tmax_range"}
