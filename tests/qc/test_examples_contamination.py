"""The worked examples for oil that is not the rock's own."""

import pytest

from qc.rules.engine import run
from qc.rules.records import table_of
from tests.qc.asking import ask, only, outcomes, series

STAINED = {"S1": "1.90", "S2": "2.40", "TOC": "0.62", "TMAX": "428"}


def test_free_oil_crossover():
    finding = only("free_oil_crossover", STAINED)
    assert (finding.analyte, finding.severity) == ("S1", "warn")
    assert finding.computed == pytest.approx(306, abs=0.5)


@pytest.mark.parametrize(("record", "severity"), [
    ({"S1": "3.0", "S2": "5.0", "TOC": "2.0", "TMAX": "445", "kind": "core"}, "info"),  # pay
    ({"S1": "3.0", "S2": "5.0", "TOC": "2.0", "TMAX": "428", "kind": "core"}, "warn"),
    ({"S1": "0.6", "S2": "5.0", "TOC": "0.4", "TMAX": "445", "kind": "core"}, "warn"),  # lean
    ({"S1": "3.0", "S2": "0.1", "TOC": "2.0", "TMAX": "445", "kind": "core"}, "warn"),  # that Tmax is not valid
])  # fmt: skip
def test_free_oil_is_pay_in_mature_core_only(record, severity):
    assert only("free_oil_crossover", record).severity == severity


def test_free_oil_in_cuttings_under_oil_based_fluid():
    record = {"S1": "3.0", "S2": "5.0", "TOC": "2.0", "TMAX": "445", "kind": "cuttings", "top_m": 2500.0}
    assert only("free_oil_crossover", record).severity == "info"
    assert only("free_oil_crossover", record, muds=[(0, 2450.0, 2800.0, "oil", "")]).severity == "warn"


def test_free_oil_outcomes():
    assert outcomes("free_oil_crossover", {"S1": "0.5", "TOC": "2.0"}) == {"pass"}
    assert outcomes("free_oil_crossover", {"TOC": "2.0"}) == {"cannot_evaluate"}
    assert outcomes("free_oil_crossover", {"S1": "1.5", "TOC": "<2.0"}) == {"cannot_evaluate"}
    assert outcomes("free_oil_crossover", {**STAINED, "kind": "additive"}) == {"not_applicable"}


def test_s1_toc_line():
    assert only("s1_toc_line", STAINED).computed == pytest.approx(3.06, abs=0.01)
    assert outcomes("s1_toc_line", {"S1": "1.2", "TOC": "1.0"}) == {"pass"}
    assert outcomes("s1_toc_line", {"S1": "1.2"}) == {"cannot_evaluate"}
    assert outcomes("s1_toc_line", {**STAINED, "formation": "Brill Sandstone"}) == {"not_applicable"}


def test_pi_high_for_maturity():
    finding = only("pi_high_for_maturity", STAINED)
    assert finding.computed == pytest.approx(0.442, abs=5e-4)
    assert finding.more["scheme"]


@pytest.mark.parametrize(("record", "outcome"), [
    ({"S1": "0.50", "S2": "2.00", "TMAX": "428"}, "pass"),  # 0.20 is not above 0.20
    ({"S1": "0.90", "S2": "2.00", "TMAX": "435"}, "fire"),  # 0.31 > 0.30
    ({"S1": "0.90", "S2": "2.00", "TMAX": "445"}, "pass"),
    ({"S1": "2.30", "S2": "2.00", "TMAX": "446"}, "fire"),
    ({"S1": "3.50", "S2": "2.00", "TMAX": "455"}, "fire"),
    ({"S1": "0.90", "S2": "2.00", "RO": "0.50"}, "fire"),  # Ro stands in for Tmax
    ({"S1": "0.10", "S2": "0.15", "TMAX": "428"}, "not_applicable"),  # noise
    ({"S1": "0.90", "S2": "2.00"}, "cannot_evaluate"),
    ({"S1": "0.90", "S2": "2.00", "TMAX": "428", "formation": "Brill Sandstone"}, "not_applicable"),
])  # fmt: skip
def test_pi_high_by_stage(record, outcome):
    assert outcomes("pi_high_for_maturity", record) == {outcome}


def test_pi_stage_labels_of_the_public_page():
    """AAPG Wiki «Production Index (PI)»: below 0.10 immature, 0.10-0.30 oil, above 0.30 gas or cracking."""
    fires = [
        outcomes("pi_high_for_maturity", {"S1": f"{10 * pi}", "S2": f"{10 * (1 - pi)}", "TMAX": "430"})
        for pi in (0.05, 0.20, 0.35)
    ]
    assert fires == [{"pass"}, {"pass"}, {"fire"}]


def neighbours(count):
    return [
        {"label": f"N-{n}", "top_m": 2000.0 + 5 * n, "formation": "Ashgrove Shale", "S1": f"{0.6 + 0.2 * (n % 3):.2f}",
         "S2": "9.20", "TMAX": str(439 + 2 * (n % 3))}
        for n in range(count)
    ]  # fmt: skip


def test_pi_low_tmax_pair():
    stain = {"label": "X", "top_m": 2017.0, "formation": "Ashgrove Shale", "S1": "3.10", "S2": "6.90", "TMAX": "424"}
    finding = only("pi_low_tmax_pair", *neighbours(8), stain)
    assert (finding.row, finding.analyte) == (8, "S1")
    assert outcomes("pi_low_tmax_pair", *neighbours(9)) == {"pass"}
    assert outcomes("pi_low_tmax_pair", *neighbours(6), stain) == {"not_applicable"}
    assert "cannot_evaluate" in outcomes("pi_low_tmax_pair", *neighbours(8), {**stain, "TMAX": None})
    high_tmax = {**stain, "TMAX": "440"}
    assert outcomes("pi_low_tmax_pair", *neighbours(8), high_tmax) == {"pass"}


def well_with_step(below=(140, 200, 260, 420, 150, 180, 210, 300, 350, 160, 170, 40)):
    """Nine clean samples, then twelve under the second fluid; OSI as given."""
    above = [
        {"label": f"A-{n}", "top_m": 2405.0 + 5 * n, "TOC": "1.00", "S1": "0.55", "S2": "3.00", "kind": "cuttings"}
        for n in range(9)
    ]
    under = [
        {
            "label": f"B-{n}",
            "top_m": 2450.0 + 5 * n,
            "TOC": "1.00",
            "S1": f"{osi / 100:.2f}",
            "S2": "3.00",
            "kind": "cuttings",
        }
        for n, osi in enumerate(below)
    ]
    return [*above, *under]


def test_oil_based_fluid_interval():
    muds = [(0, 0.0, 2450.0, "water", ""), (0, 2450.0, 3000.0, "oil", "diesel")]
    finding = only("oil_based_fluid_interval", *well_with_step(), muds=muds)
    assert "11 of 12 samples" in finding.message
    assert finding.more["interval_m"] == [2450.0, 3000.0]
    assert outcomes("oil_based_fluid_interval", *well_with_step()) == {"cannot_evaluate"}  # fluid not recorded
    assert outcomes("oil_based_fluid_interval", *well_with_step((40,) * 12), muds=muds) == {"pass"}
    assert outcomes("oil_based_fluid_interval", *well_with_step((200,) * 4), muds=muds) == {"not_applicable"}
    water = [(0, 0.0, 3000.0, "water", "")]
    assert outcomes("oil_based_fluid_interval", *well_with_step(), muds=water) == {"not_applicable"}
    late = [(0, 0.0, 2480.0, "water", ""), (0, 2480.0, 3000.0, "oil", "")]
    assert outcomes("oil_based_fluid_interval", *well_with_step(), muds=late) == {
        "pass"
    }  # the step is not at the change


def test_a_rule_switched_off_is_silent():
    answers = run(table_of([STAINED]), disabled=["free_oil_crossover"])
    assert "free_oil_crossover" not in answers
    assert answers["s1_toc_line"].findings


def test_evidence_of_contamination_names_a_rival_and_a_test():
    for rule in ("free_oil_crossover", "s1_toc_line", "pi_high_for_maturity"):
        more = ask(rule, STAINED).findings[0].more
        assert len(more["alternatives"]) >= 2
        assert more["discriminating_test"]


def test_series_of_clean_samples_passes():
    clean = series(10, S1="0.20", S2="4.00", TOC="1.50", TMAX="430")
    for rule in ("free_oil_crossover", "s1_toc_line", "pi_high_for_maturity", "pi_low_tmax_pair"):
        assert outcomes(rule, *clean) == {"pass"}
