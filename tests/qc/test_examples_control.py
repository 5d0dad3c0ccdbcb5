"""The worked examples of the rule catalogue for the laboratory's own controls, each with what must pass beside it."""

import numpy as np
import pytest

from qc.rules.control.batches import lacking
from qc.rules.control.references import material, normalised_error, recovery, two_point
from tests.qc.asking import ask, only, outcomes

SAMPLES = [{"label": f"S-{n}", "table": 1, "line": n, "S1": "0.40", "S2": "6.20", "TOC": "2.10"} for n in range(3, 12)]
AT = {
    "table": 1,
    "method": "pyrolysis",
    "laboratory": "Ninefold",
    "role": "reference",
    "material": "shale 7",
    "project": 1,
}


def control(line, value, analyte="S2", **more):
    return {**AT, "line": line, "analyte": analyte, "value": value, "certified": 12.43, "uncertainty": 0.5, **more}


@pytest.mark.parametrize(("value", "certified", "outcome"), [
    (12.60, 12.43, "pass"),  # 101.4 %
    (13.60, 12.43, "fire"), (12.60, np.nan, "cannot_evaluate"),
])  # fmt: skip
def test_crm_recovery(value, certified, outcome):
    assert outcomes("crm_recovery", *SAMPLES, controls=[control(2, value, certified=certified)]) == {outcome}


def test_recovery_scores_of_the_catalogue():
    assert recovery(12.60, 12.43) == pytest.approx(101.4, abs=0.05)
    assert pytest.approx(0.68) == (12.60 - 12.43) / 0.25
    assert normalised_error(12.9, 12.43, 0.35, 0.50) == pytest.approx(0.77, abs=0.005)


def test_two_failing_references_reject_what_they_bracket_and_a_good_one_bounds_it():
    one = ask("crm_recovery", *SAMPLES, controls=[control(2, 13.60), control(7, 12.4)]).findings
    assert [(finding.severity, [SAMPLES[row]["line"] for row in finding.rows]) for finding in one] == [
        ("warn", [3, 4, 5, 6])
    ]
    two = ask("crm_recovery", *SAMPLES, controls=[control(2, 13.60), control(7, 13.70)]).findings
    assert [finding.severity for finding in two] == ["reject-candidate"] * 2


def test_tmax_of_a_reference_rock():
    rows = [{**one, "TMAX": "438"} for one in SAMPLES]
    assert outcomes("crm_recovery", *rows, controls=[control(2, 419, "TMAX", certified=416)]) == {"fire"}
    assert outcomes("crm_recovery", *rows, controls=[control(2, 417, "TMAX", certified=416)]) == {"pass"}


def test_a_control_of_another_table_says_nothing():
    assert not len(ask("crm_recovery", *SAMPLES, controls=[control(2, 13.60, table=-1)]).outcome)


@pytest.mark.parametrize(("value", "q", "limited", "outcome"), [
    (0.06, "", True, "fire"),  # limit 0.02
    (0.01, "", True, "pass"), (0.06, "<", True, "pass"), (0.05, "", False, "fire"), (np.nan, "~", True, "cannot_evaluate"),
])  # fmt: skip
def test_blank_level(value, q, limited, outcome):
    rows = [*SAMPLES, {"label": "low", "table": 1, "line": 12, "S1": "<0.02" if limited else "0.41"}]
    blank = control(2, value, "S1", role="blank", material="blank", q=q)
    assert outcomes("blank_level", *rows, controls=[blank]) == {outcome}


def test_blank_corrected_values():
    rows = [{**SAMPLES[0], "S1": "<0.02", "remark": "blank-corrected"}, *SAMPLES[1:]]
    blank = control(2, 0.05, "S1", role="blank", material="blank")
    assert outcomes("blank_level", *rows, controls=[blank]) == {"pass"}


@pytest.mark.parametrize(("analyte", "values", "outcome"), [
    ("TOC", ("4.02", "4.55"), "fire"),  # 12.37 %
    ("TOC", ("2.31", "2.35"), "pass"),  # 1.72 %
    ("TOC", ("0.10", "0.15"), "pass"),  # near the limit: 0.05 <= 2 x 0.05
    ("S1", ("0.40", "<0.50"), "cannot_evaluate"), ("TMAX", ("438", "443"), "not_applicable"),  # no S2 beside it
])  # fmt: skip
def test_duplicate_rpd(analyte, values, outcome):
    twins = [{"sample": 4, "label": "S-4", "replicate": n, analyte: value} for n, value in enumerate(values, start=1)]
    assert outcomes("duplicate_rpd", *twins) == {outcome}


def test_duplicates_of_tmax_and_of_plugs():
    twins = [{"sample": 4, "replicate": n, "S2": "4.00", "TMAX": value} for n, value in enumerate(("438", "443"))]
    assert only("duplicate_rpd", *twins).analyte == "TMAX"
    plugs = [
        {"method": "core", "sample": 4, "replicate": n, "RHOG": value, "KAIR": k}
        for n, (value, k) in enumerate((("2.65", "1.0"), ("2.68", "1.1")))
    ]
    assert only("duplicate_rpd", *plugs).analyte == "RHOG"


def pairs_of(last):
    values = [
        ("2.31", "2.35"),
        ("1.10", "1.12"),
        ("0.56", "0.55"),
        ("3.40", "3.31"),
        last,
        ("1.75", "1.78"),
        ("2.20", "2.16"),
        ("0.98", "1.00"),
    ]
    return [
        {"sample": n, "label": f"S-{n}", "replicate": k, "TOC": toc}
        for n, pair in enumerate(values)
        for k, toc in enumerate(pair, start=1)
    ]


def test_cochran_variance():
    assert only("cochran_variance", *pairs_of(("4.02", "4.55"))).severity == "warn"
    assert outcomes("cochran_variance", *pairs_of(("4.02", "4.10"))) == {"pass"}
    assert outcomes("cochran_variance", *pairs_of(("4.02", "4.55"))[6:12]) == {"not_applicable"}


def series_of(values, table_from=24):
    return [
        control(2, value, date=f"2020-{1 + n // 28:02d}-{1 + n % 28:02d}", report=f"R-{n}", table=1 if n >= table_from else -1)
        for n, value in enumerate(values)
    ]  # fmt: skip


BASE = [12.4 + 0.1 * (-1) ** n * (1 + n % 3) / 2 for n in range(24)]


@pytest.mark.parametrize(("rule", "last", "fires"), [
    ("control_multirule", 13.4, True), ("control_multirule", 12.45, False), ("ewma_drift", 13.4, True), ("ewma_drift", 12.45, False),
    ("cusum_shift", 13.4, True), ("cusum_shift", 12.45, False),
])  # fmt: skip
def test_charts(rule, last, fires):
    assert outcomes(rule, *SAMPLES, controls=series_of([*BASE, last])) == ({"fire"} if fires else {"pass"})


@pytest.mark.parametrize("rule", ["control_multirule", "ewma_drift", "cusum_shift"])
def test_a_chart_needs_its_baseline_and_a_new_lot_begins_a_new_one(rule):
    assert outcomes(rule, *SAMPLES, controls=series_of([*BASE[:10], 13.4], 10)) == {"not_applicable"}
    moved = [{**one, "lot": "B"} if one["table"] == 1 else one for one in series_of([*BASE, 13.4])]
    assert outcomes(rule, *SAMPLES, controls=moved) == {"not_applicable"}


ROUND = (2.31, 2.35, 2.29, 2.40, 2.33, 2.36, 2.28, 2.34, 2.37, 3.10)


@pytest.mark.parametrize("rule", ["robust_z_batch", "grubbs_single"])
def test_replicates(rule):
    replicates = [control(20 + n, value, "TOC") for n, value in enumerate(ROUND)]
    spread = [*SAMPLES, *({**SAMPLES[0], "label": f"T-{n}", "line": 20.5 + n} for n in range(10))]
    rows = [{**one, "line": 2 * one["line"] if one["line"] < 20 else one["line"]} for one in spread]
    rows = [{**one, "line": int(2 * one["line"])} for one in rows]
    replicates = [{**one, "line": 2 * one["line"]} for one in replicates]
    found = ask(rule, *rows, controls=replicates).findings
    assert [finding.more["control"]["value"] for finding in found] == [3.10]
    calm = ask(rule, *rows, controls=[{**one, "value": 2.30 + n / 100} for n, one in enumerate(replicates)])
    assert set(calm.outcome) == {"pass"}
    assert set(ask(rule, *rows, controls=replicates[:4]).outcome) == {"not_applicable"}
    if rule == "robust_z_batch":
        flat = [{**one, "value": 2.3} for one in replicates]
        assert set(ask(rule, *rows, controls=flat).outcome) == {"cannot_evaluate"}


def laboratories(values):
    return [
        control(2, value, "TOC", laboratory=f"L{n}", table=1 if n == len(values) - 1 else -1)
        for n, value in enumerate(values)
    ]


def test_robust_consensus():
    assert only("robust_consensus", *SAMPLES, controls=laboratories(ROUND)).computed == pytest.approx(14.6, abs=0.1)
    assert outcomes("robust_consensus", *SAMPLES, controls=laboratories(ROUND[:9])) == {"pass"}
    assert outcomes("robust_consensus", *SAMPLES, controls=laboratories(ROUND[:3])) == {"not_applicable"}
    assert outcomes("robust_consensus", *SAMPLES, controls=laboratories((2.0,) * 5 + (2.3,))) == {"cannot_evaluate"}


def test_horwitz_check():
    calm = [2.15 * (1 + 0.05 * step / 1.5811) for step in (-2, -1, 0, 1, 2)]  # 5 % between laboratories
    assert outcomes("horwitz_check", *SAMPLES, controls=laboratories(calm)) == {"pass"}
    assert outcomes("horwitz_check", *SAMPLES, controls=laboratories([2.1, 2.9, 1.2, 2.0, 3.3])) == {"fire"}
    assert outcomes("horwitz_check", *SAMPLES, controls=laboratories(calm[:3])) == {"not_applicable"}


def test_batch_qc_coverage():
    unknowns = [
        {"label": f"S-{n}", "table": 1, "line": n, "TOC": "1.20", "method": "carbon"} for n in range(3, 49)
    ]  # 46
    one = control(2, 3.28, "TOC", method="carbon", certified=3.28)
    blank = control(60, 0.0, "TOC", method="carbon", role="blank")
    assert only("batch_qc_coverage", *unknowns, controls=[one]).severity == "warn"
    assert outcomes("batch_qc_coverage", *unknowns) == {"cannot_evaluate"}
    twins = [{**unknowns[n], "replicate": 2, "line": 70 + n} for n in range(2)]
    enough = [one, {**one, "line": 25}, {**one, "line": 50}, blank]
    assert outcomes("batch_qc_coverage", *unknowns, *twins, controls=enough) == {"pass"}
    assert outcomes("batch_qc_coverage", *unknowns[:3], controls=[one]) == {"not_applicable"} or not len(
        ask("batch_qc_coverage", *unknowns[:3], controls=[one]).outcome
    )
    assert lacking(46, 1, 1, 2, 20) == ["2 of 3 reference materials"]


ISOTOPES = [{"method": "isotopes", "table": 1, "line": n, "label": f"S-{n}", "D13C_ORG": "-28.10"} for n in range(3, 8)]


@pytest.mark.parametrize(("name", "value", "outcome"), [
    ("NBS 22", -29.80, "fire"), ("NBS 22", -30.08, "pass"), ("house oil", -29.80, "cannot_evaluate"),
    ("NBS-19", 1.95, "pass"), ("LSVEC", -46.6, "pass"), ("USGS24", -16.05, "pass"), ("IAEA-CH-6", -10.45, "pass"),
    ("IAEA-CH-7", -32.15, "pass"), ("USGS40", -26.39, "pass"), ("NBS 18", -5.01, "pass"),  # CIAAW table; Coplen et al. 2006
])  # fmt: skip
def test_isotope_rm_check(name, value, outcome):
    reference = {**control(2, value, "D13C_ORG", material=name, method="isotopes", certified=np.nan)}
    assert outcomes("isotope_rm_check", *ISOTOPES, controls=[reference]) == {outcome}


def test_two_point_normalisation():
    assert two_point(-27.50, (-29.80, -16.00), (-30.03, -16.05)) == pytest.approx(-27.70, abs=0.005)
    assert material("IAEA-CH-6") == "IAEACH6"
