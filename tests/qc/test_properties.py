"""What must not matter: the order of rows, columns that a rule does not read, the unit of a report."""

import json

import numpy as np
import pandas as pd
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from qc.rules import RULES
from qc.rules.engine import parameters, run
from qc.rules.evidence import Witness
from qc.rules.records import table_of
from qc.rules.rule import OUTCOMES
from qc.rules.table import Table

quick = settings(max_examples=8, deadline=None, suppress_health_check=[HealthCheck.too_slow])


def cell(low, high, decimals):
    number = st.integers(int(low * 10**decimals), int(high * 10**decimals)).map(
        lambda n: f"{n / 10**decimals:.{decimals}f}"
    )
    return st.one_of(number, number, number, st.none(), number.map(lambda text: f"<{text.lstrip('-')}"))


def record(number):
    return st.fixed_dictionaries({
        "label": st.just(f"S-{number}"), "top_m": st.integers(1000, 3000).map(float), "kind": st.sampled_from(["cuttings", "core"]),
        "formation": st.sampled_from(["Ashgrove Shale", "Brill Shale"]), "S1": cell(0, 4, 2), "S2": cell(0, 12, 2),
        "S3": cell(0, 3, 2), "TOC": cell(0, 6, 2), "TMAX": cell(350, 540, 0), "HI": cell(0, 900, 0), "PI": cell(0, 1, 2),
    })  # fmt: skip


records = st.integers(2, 14).flatmap(lambda size: st.tuples(*(record(number) for number in range(size)))).map(list)


def seen(table: Table, answers) -> dict[str, tuple[list[str], list[str]]]:
    """Outcomes and messages a rule, by sample and not by place."""
    return {
        rule: (
            sorted(f"{table.rows.at[row, 'label']} {outcome}" for row, outcome in answer.outcome.items())
            if not answer.sets and rule not in PER_SET
            else sorted(answer.outcome),
            sorted(f"{finding.analyte} {finding.severity} {finding.message}" for finding in answer.findings),
        )
        for rule, answer in answers.items()
    }


PER_SET = {
    "detection_limit",
    "batch_qc_coverage",
    "cochran_variance",
    "element_oxide_mixup",
    "method_pair_bias",
    "isotope_scale_declared",
    "oxygen_scale_slip",
    "core_log_shift",
    "core_recovery",
    "cuttings_core_bias",
    "datum_missing_or_mixed",
    "depth_interval_order",
    "depth_unit_mixup",
    "lag_depth_error",
    "md_tvd_consistency",
    "oil_based_fluid_interval",
    "s2_positive_intercept",
    "s2_toc_fit",
    "sample_sequence",
    "tmax_scale_offset",
}


@quick
@given(records, st.randoms(use_true_random=False))
def test_the_order_of_rows_does_not_matter(made, random):
    made = [{**one, "line": place + 2, "top_m": one["top_m"] + place / 100} for place, one in enumerate(made)]
    shuffled = random.sample(made, len(made))
    first, second = table_of(made), table_of(shuffled)
    assert seen(first, run(first)) == seen(second, run(second))


@quick
@given(records)
def test_unrelated_columns_do_not_matter_and_the_table_is_left_as_it_was(made):
    table = table_of(made)
    before = table.rows.copy()
    plain = seen(table, run(table))
    pd.testing.assert_frame_equal(table.rows, before)
    wider = Table(table.rows.assign(NOTE="x", PERM=1.0), table.wells, table.tops, table.cores, table.muds)
    assert seen(wider, run(wider)) == plain


@quick
@given(records)
def test_every_check_has_one_of_four_outcomes_and_every_firing_a_finding(made):
    for rule, answer in run(table_of(made)).items():
        assert set(answer.outcome) <= set(OUTCOMES), rule
        assert answer.counts()["fire"] == len(answer.findings), rule
        assert sum(answer.counts().values()) == len(answer.outcome)


@quick
@given(records)
def test_a_missing_input_is_never_a_pass(made):
    """Without TOC nothing that needs TOC may pass."""
    for rule, answer in run(table_of([{**one, "TOC": None} for one in made])).items():
        if rule in {"pyro_carbon_balance", "free_oil_crossover", "s1_toc_line", "hi_ceiling", "toc_floor_for_indices"}:
            assert answer.counts()["pass"] == 0, rule


@quick
@given(st.floats(0.3, 8), st.floats(0.05, 30), st.integers(1, 3))
def test_the_unit_of_the_report_does_not_matter(toc, s2, decimals):
    """TOC as percent or as fraction: the value and its half-unit are both converted."""
    percent = table_of([{"TOC": f"{toc:.{decimals}f}", "S2": f"{s2:.2f}", "HI": f"{100 * s2 / toc:.0f}"}])
    fraction = table_of([{"TOC": f"{toc / 100:.{decimals + 2}f}", "S2": f"{s2:.2f}", "HI": f"{100 * s2 / toc:.0f}"}])
    rows = fraction.rows.assign(TOC=np.round(fraction.rows["TOC"] * 100, 12), TOC_h=fraction.rows["TOC_h"] * 100)
    scaled = Table(rows, fraction.wells, fraction.tops, fraction.cores, fraction.muds)
    off = [rule.id for rule in RULES if rule.id != "index_recalc"]
    if np.isclose(percent.rows["TOC"].iloc[0], rows["TOC"].iloc[0]):
        outcomes = [list(run(table, disabled=off)["index_recalc"].outcome) for table in (percent, scaled)]
        assert outcomes[0] == outcomes[1]


ODD = [
    [],
    [{"method": "reflectance", "RO": "0.5"}],
    [{"method": "carbon", "TOC": "1.2"}],
    [{"method": "core"}],
    [{"TOC": "0", "S1": "0", "S2": "0", "S3": "0", "PI": "0", "HI": "0", "TMAX": "0"}],
    [{"TOC": ">5", "S1": ">1", "S2": ">2", "TMAX": "~430", "HI": "~40", "PI": "<1", "OI": "5", "S3": "99999"}],
    [{"top_m": 100.0, "kind": "cuttings", "label": ""}] * 3,
    [{"method": "reflectance", "RO": "5", "RO_MIN": "9"}],
]


@pytest.mark.parametrize("odd", ODD, ids=range(len(ODD)))
def test_odd_tables_are_judged_and_their_evidence_is_json(odd):
    """Nothing measured, only bounds, only zeros, no depth: an answer from every rule, and no NaN in what is shown."""
    table = table_of(odd)
    witness, answers = Witness(table), run(table)
    assert set(answers) == {rule.id for rule in RULES}
    for rule in RULES:
        numbers = parameters(rule, {})
        for finding in answers[rule.id].findings:
            json.dumps(witness.record(rule, numbers, finding), allow_nan=False)
            assert len(witness.fingerprint(rule, numbers, finding)) == 64
            assert "nan" not in finding.message
