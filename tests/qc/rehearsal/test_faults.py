"""Each injector changes what it says, in the samples it names, and nothing else; and tells no lie about it."""

import numpy as np
import pytest

from qc.rehearsal.copying import Copy, differences
from qc.rehearsal.faults import KINDS
from qc.rehearsal.kind import MODERATE, STRENGTHS, STRONG, exchanged_digits
from qc.rehearsal.run import inject
from qc.rules import RULES
from tests.qc.rehearsal.wells import clean

DEPTH = {"top_m", "base_m", "top_text", "base_text"}
INDICES = {"HI", "OI", "PI"}
CHANGES = {
    "oil_based_mud": {"S1", "S2", "TOC"} | INDICES, "oil_stain": {"S1", "TOC", "TMAX"} | INDICES,
    "s2_suppression": {"S2", "HI", "PI"}, "tmax_of_tiny_s2": {"S1", "S2", "TMAX", "HI", "PI"},
    "cellulose_tmax": {"TMAX", "S2", "S3", "TOC"} | INDICES, "carbon_impossible": {"S2", "HI", "PI"},
    "index_digits": INDICES, "index_decimal": INDICES, "hi_oi_swapped": {"HI", "OI"}, "decimal_toc": {"TOC"},
    "decimal_s1": {"S1"}, "decimal_s2": {"S2"}, "toc_of_neighbour": {"TOC"}, "ro_miskeyed": {"RO"},
    "depth_feet_as_metres": DEPTH, "depth_digits": {"top_m", "top_text"}, "top_base_turned": DEPTH,
    "beyond_total_depth": DEPTH, "same_depth_twice": DEPTH, "sample_swap": DEPTH,
}  # fmt: skip
TABLE = clean()


def injected(kind, strength, seed=1):
    copy = Copy(TABLE)
    targets = kind.targets(TABLE, TABLE.rows.index)
    return copy, inject(copy, kind, strength, targets, np.random.default_rng(seed))


def test_every_kind_is_in_the_table_and_names_rules_that_exist():
    assert {kind.id for kind in KINDS} == CHANGES.keys()
    known = {rule.id for rule in RULES}
    for kind in KINDS:
        assert set(kind.strengths) == set(STRENGTHS)
        assert set(kind.rules) & known, kind.id
        assert kind.lacking


@pytest.mark.parametrize("strength", STRENGTHS)
@pytest.mark.parametrize("kind", KINDS, ids=lambda kind: kind.id)
def test_only_what_is_said_changes_and_only_there(kind, strength):
    before = TABLE.rows.copy()
    copy, made = injected(kind, strength)
    if not made:
        assert kind.id == "s2_suppression"
        pytest.fail("the clean wells can carry every kind")
    changed = differences(before, copy.rows)
    named = {row for one in made for row in one.rows}
    assert {row for row, _ in changed} == named
    assert {what for _, what in changed} <= CHANGES[kind.id]
    assert TABLE.rows.equals(before)
    assert all(one.what for one in made)


@pytest.mark.parametrize("kind", KINDS, ids=lambda kind: kind.id)
def test_the_same_seed_injects_the_same(kind):
    first, once = injected(kind, STRONG, seed=5)
    second, again = injected(kind, STRONG, seed=5)
    assert once == again
    assert first.rows.equals(second.rows)


def by_id(name):
    return next(kind for kind in KINDS if kind.id == name)


def first_change(name, strength):
    copy, made = injected(by_id(name), strength)
    row = made[0].rows[0]
    return TABLE.rows.loc[row], copy.rows.loc[row]


@pytest.mark.parametrize(("strength", "share"), [(MODERATE, 2.0), (STRONG, 4.0)])
def test_base_oil_raises_s1_and_the_indices_follow(strength, share):
    before, after = first_change("oil_based_mud", strength)
    added = after["S1"] - before["S1"]
    wanted = share * max(before["TOC"], 1.0)
    assert 0.89 * wanted < added < 1.11 * wanted
    assert after["TOC"] == pytest.approx(before["TOC"] + 0.083 * 1.1 * added, abs=0.006)
    assert after["PI"] == pytest.approx(after["S1"] / (after["S1"] + after["S2"]), abs=0.006)
    assert after["HI"] == pytest.approx(100 * after["S2"] / after["TOC"], abs=0.6)


@pytest.mark.parametrize(("strength", "rise", "fall"), [(MODERATE, 0.20, 15), (STRONG, 0.35, 25)])
def test_a_stain_moves_pi_and_tmax(strength, rise, fall):
    before, after = first_change("oil_stain", strength)
    assert after["PI"] - before["PI"] == pytest.approx(rise, abs=0.015)
    assert before["TMAX"] - after["TMAX"] == pytest.approx(fall, abs=2)


@pytest.mark.parametrize(("strength", "toc0"), [(MODERATE, 0.20), (STRONG, 0.30)])
def test_retention_takes_the_s2_of_so_much_toc(strength, toc0):
    copy, made = injected(by_id("s2_suppression"), strength)
    rows = list(made[0].rows)
    lost = TABLE.rows.loc[rows, "S2"] - copy.rows.loc[rows, "S2"]
    kept = toc0 * float(np.median(TABLE.rows.loc[rows, "S2"] / TABLE.rows.loc[rows, "TOC"]))
    assert lost.median() == pytest.approx(kept, rel=0.1)
    assert (lost <= 0.851 * TABLE.rows.loc[rows, "S2"] + 0.005).all()


@pytest.mark.parametrize(("strength", "excess"), [(MODERATE, 0.15), (STRONG, 0.5)])
def test_too_much_carbon_exceeds_toc_by_so_much(strength, excess):
    _, after = first_change("carbon_impossible", strength)
    carbon = 0.083 * (after["S1"] + after["S2"])
    assert carbon / after["TOC"] - 1 >= 0.99 * excess


@pytest.mark.parametrize(("strength", "factors"), [(MODERATE, (10, 0.1)), (STRONG, (100, 0.01))])
def test_a_decimal_point_moves(strength, factors):
    before, after = first_change("decimal_toc", strength)
    assert any(after["TOC"] == pytest.approx(before["TOC"] * factor, abs=0.006) for factor in factors)
    assert after["HI"] == before["HI"]
    assert after["TOC_text"] == f"{after['TOC']:.2f}"


def test_feet_are_read_as_metres():
    before, after = first_change("depth_feet_as_metres", STRONG)
    assert after["top_m"] * 0.3048 == pytest.approx(before["top_m"])


def test_depth_digits_are_those_of_the_report():
    before, after = first_change("depth_digits", STRONG)
    assert sorted(before["top_text"]) == sorted(after["top_text"])
    assert after["top_m"] == pytest.approx(float(after["top_text"]))


def test_digits_are_exchanged_in_every_unlike_pair():
    assert exchanged_digits("2357") == ["3257", "2537", "2375"]
    assert exchanged_digits("0.10") == ["0.01"]
    assert exchanged_digits("77") == []


def test_a_censored_or_rejected_value_carries_no_fault():
    rows = TABLE.rows.copy()
    rows["S2_q"] = "<"
    rows["RO_rej"] = True
    table = type(TABLE)(**{**TABLE.__dict__, "rows": rows})
    for name in ("oil_based_mud", "decimal_s2", "s2_suppression", "ro_miskeyed"):
        assert by_id(name).targets(table, rows.index) == []
