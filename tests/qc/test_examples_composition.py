"""The worked examples of the rule catalogue for elements, minerals and carbon, each with what must pass beside it."""

import pytest

from qc.rules.composition.phosphorus import residual_lime
from qc.rules.composition.stoichiometry import CALCITE_PER_CARBON, FLUORAPATITE, FRANCOLITE, LIME_IN, OXIDE_FACTOR
from qc.rules.composition.traces import modern_setting
from tests.qc.asking import ask, only, outcomes

XRF = {"method": "elements"}
XRD = {"method": "minerals"}
ROCK = {
    **XRF,
    "SIO2": "52.10",
    "TIO2": "0.60",
    "AL2O3": "12.30",
    "FE2O3": "4.20",
    "MNO": "0.05",
    "MGO": "2.10",
    "CAO": "9.80",
    "NA2O": "0.70",
    "K2O": "2.60",
    "P2O5": "0.20",
}  # fmt: skip  - 84.65 wt%


def on(*methods):
    """Records of one sample by several methods."""
    return [{"sample": 7, "label": "C-1", **record} for record in methods]


@pytest.mark.parametrize(("changes", "outcome"), [
    ({"LOI": "15.10"}, "pass"),  # 99.75
    ({"LOI": "18.75"}, "fire"),  # 103.4
    ({"LOI": "15.10", "SO3": "3.00"}, "pass"),  # 102.75 with SO3, which may also be lost on ignition
    ({"LOI": "11.00"}, "fire"), ({}, "cannot_evaluate"),  # without LOI, TOC and TIC nothing bounds the sum from below
    ({"SIO2": None, "LOI": "15.10"}, "not_applicable"), ({"LOI": "<15.10"}, "cannot_evaluate"),
])  # fmt: skip
def test_oxide_total(changes, outcome):
    assert outcomes("oxide_total", {**ROCK, **changes}) == {outcome}


def test_oxide_total_severity_and_the_lower_limit_from_carbon():
    assert only("oxide_total", {**ROCK, "LOI": "18.75"}).severity == "warn"
    assert only("oxide_total", {**ROCK, "LOI": "25.00"}).severity == "reject-candidate"
    carbon = {"method": "carbon", "TOC": "2.00", "TIC": "0.50"}  # 100 - 3.83 - 5 = 91.2 > 84.65
    assert outcomes("oxide_total", *on(ROCK, carbon)) == {"fire"}
    assert outcomes("oxide_total", *on(ROCK, {**carbon, "TIC": "2.50"})) == {"pass"}


MINERALS = {**XRD, "QUARTZ": "40.0", "CALCITE": "20.0", "ILLITE": "30.0", "PYRITE": "4.0", "DOLOMITE": "6.0"}


@pytest.mark.parametrize(("changes", "outcome"), [
    ({}, "pass"), ({"QUARTZ": "37.3"}, "fire"),  # 97.3
    ({"QUARTZ": "37.3", "remark": "not normalised"}, "not_applicable"), ({"CLAY": "30.0"}, "pass"),  # a total beside its parts
    ({"QUARTZ": "40", "PYRITE": "<5"}, "cannot_evaluate"), ({"ILLITE": None, "DOLOMITE": None}, "not_applicable"),
])  # fmt: skip
def test_mineral_total(changes, outcome):
    assert outcomes("mineral_total", {**MINERALS, **changes}) == {outcome}


def test_rich_rock_needs_organic_matter_in_the_mineral_table():
    rich = {"method": "carbon", "TOC": "8.00"}
    assert [finding.severity for finding in ask("mineral_total", *on(MINERALS, rich)).findings] == ["info"]
    assert not ask("mineral_total", *on({**MINERALS, "QUARTZ": "30.0", "AMORPHOUS": "10.0"}, rich)).findings


@pytest.mark.parametrize(("toc", "changes", "outcome"), [
    ("1.05", {}, "pass"),  # 0.02 <= 0.252
    ("1.55", {}, "fire"),  # 0.48
    ("1.55", {"remark": "TOC by difference"}, "not_applicable"), (None, {}, "cannot_evaluate"),
    ("<1.55", {}, "cannot_evaluate"), ("1.05", {"TIC": None}, "not_applicable"),
])  # fmt: skip
def test_carbon_sum(toc, changes, outcome):
    record = {"method": "carbon", "TC": "3.21", "TIC": "2.14", "TOC": toc, **changes}
    assert outcomes("carbon_sum", record) == {outcome}


def test_carbon_sum_shows_the_limit():
    assert only("carbon_sum", {"TC": "3.21", "TIC": "2.14", "TOC": "1.55"}).limit == pytest.approx(0.252, abs=0.005)


@pytest.mark.parametrize(("lime", "outcome"), [("6.0", "fire"), ("11.2", "pass"), (None, "not_applicable")])
def test_tic_vs_calcium(lime, outcome):
    """n = 0.107 + 0.0248 + 0.0139 = 0.146 < 0.9 x 0.1998."""
    rock = {**XRF, "CAO": lime, "MGO": "1.0", "FEO": "1.0"}
    assert outcomes("tic_vs_calcium", *on(rock, {"method": "carbon", "TIC": "2.40"})) == {outcome}


def test_tic_vs_calcium_shows_moles_and_needs_tic():
    rock = {**XRF, "CAO": "6.0", "MGO": "1.0", "FEO": "1.0"}
    finding = only("tic_vs_calcium", *on(rock, {"method": "carbon", "TIC": "2.40"}))
    assert (finding.computed, finding.limit) == (pytest.approx(0.146, abs=1e-3), pytest.approx(0.180, abs=1e-3))
    assert finding.more["calcite_by_tic"] == pytest.approx(20.0, abs=0.01)
    assert outcomes("tic_vs_calcium", rock) == {"cannot_evaluate"}


@pytest.mark.parametrize(("tic", "extra", "outcome"), [
    ("3.18", {}, "pass"), ("1.20", {}, "fire"), ("1.20", {"SIDERITE": "6.0"}, "not_applicable"), ("<9", {}, "cannot_evaluate"),
])  # fmt: skip
def test_tic_makes_the_calcite_of_diffraction(tic, extra, outcome):
    rock = {**XRD, "CALCITE": "20.0", "DOLOMITE": "6.0", **extra}
    assert outcomes("tic_vs_calcium", *on(rock, {"method": "carbon", "TIC": tic})) == {outcome}


@pytest.mark.parametrize(("p2o5", "lime", "outcome"), [
    ("2.5", "2.9", "fire"),  # floor 3.29 - 0.26 = 3.03
    ("2.5", "3.1", "pass"), ("12", "30", "pass"), ("0.9", "0.5", "not_applicable"), ("2.5", None, "cannot_evaluate"),
])  # fmt: skip
def test_apatite_ca_floor(p2o5, lime, outcome):
    assert outcomes("apatite_ca_floor", {**XRF, "P2O5": p2o5, "CAO": lime}) == {outcome}


def test_apatite_ca_floor_leaves_other_phosphates_and_reads_elements():
    assert outcomes("apatite_ca_floor", {**XRF, "P2O5": "5", "CAO": "1", "remark": "vivianite"}) == {"not_applicable"}
    assert outcomes("apatite_ca_floor", {**XRF, "P": "10911", "CA": "20726"}) == {"fire"}  # 2.5 and 2.9 wt%


def test_printed_compositions():
    # webmineral, Apatite-(CaF): CaO 55.60, P2O5 42.22, molar mass 504.30
    assert pytest.approx(1.317, abs=5e-4) == FLUORAPATITE
    assert LIME_IN["APATITE"] == pytest.approx(0.5560, abs=1e-4)
    assert pytest.approx(0.5560, abs=1e-3) == (5 * 56.077 / (504.30 - 0.5 * 0))
    # SSHADE, calcite: CaO 56.03, CO2 43.97, molar mass 100.09
    assert LIME_IN["CALCITE"] == pytest.approx(0.5603, abs=1e-4)
    assert pytest.approx(100.087 / 12.011, abs=1e-3) == CALCITE_PER_CARBON
    assert residual_lime(30, 12) == pytest.approx(14.20, abs=0.01)
    assert residual_lime(30, 12) / 0.5603 == pytest.approx(25.3, abs=0.05)
    assert pytest.approx(1.57) == FRANCOLITE


@pytest.mark.parametrize(("element", "atoms", "mass", "oxide_mass"), [
    ("AL", 2, 26.982, 101.961), ("SI", 1, 28.085, 60.083), ("CA", 1, 40.078, 56.077), ("MG", 1, 24.305, 40.304),
    ("K", 2, 39.098, 94.195), ("NA", 2, 22.990, 61.979), ("TI", 1, 47.867, 79.865), ("FE", 2, 55.845, 159.687),
    ("MN", 1, 54.938, 70.937), ("P", 2, 30.974, 141.943), ("S", 1, 32.06, 80.057), ("BA", 1, 137.327, 153.326),
])  # fmt: skip
def test_oxide_factors_follow_from_atomic_masses(element, atoms, mass, oxide_mass):
    assert OXIDE_FACTOR[element][1] == pytest.approx(oxide_mass / (atoms * mass), abs=6e-4)


@pytest.mark.parametrize(("iron", "extra", "outcome"), [
    ("1.90", {}, "fire"),  # 1.496 > 1.05 x 1.329
    ("2.30", {}, "pass"), ("1.90", {"remark": "sulfate"}, "not_applicable"), (None, {}, "cannot_evaluate"),
])  # fmt: skip
def test_sulfur_needs_iron(iron, extra, outcome):
    rock = {**XRF, "BA": "3512", "FE2O3": iron, **extra}  # barium of 0.082 wt% sulfur
    assert outcomes("sulfur_iron_pyrite", *on(rock, {"method": "carbon", "TS": "1.80"})) == {outcome}


def test_pyrite_cannot_hold_more_sulfur_than_the_rock_and_ratios_are_labels():
    sulfur = {"method": "carbon", "TS": "1.00", "TOC": "2.39"}
    assert only("sulfur_iron_pyrite", *on({**XRD, "PYRITE": "4.0"}, sulfur)).severity == "reject-candidate"
    assert outcomes("sulfur_iron_pyrite", *on({**XRD, "PYRITE": "1.8"}, sulfur)) == {"pass"}
    rock = {**XRF, "FE2O3": "9.0"}
    assert outcomes("sulfur_iron_pyrite", *on(rock, {"method": "carbon", "TS": "0.90", "TOC": "2.15"})) == {
        "pass"
    }  # 2.39
    label = only("sulfur_iron_pyrite", *on(rock, {"method": "carbon", "TS": "0.10", "TOC": "2.15"}))
    assert (label.severity, label.computed) == ("info", 21.5)


@pytest.mark.parametrize(
    ("loi", "outcome"), [("6.2", "fire"), ("10.8", "pass"), ("<11", "cannot_evaluate"), (None, "not_applicable")]
)
def test_loi_floor(loi, outcome):
    """2.15 + 8.79 = 10.94."""
    assert outcomes("loi_floor", *on({**XRF, "LOI": loi}, {"method": "carbon", "TOC": "2.15", "TIC": "2.40"})) == {
        outcome
    }


def test_loi_floor_needs_carbon():
    assert outcomes("loi_floor", {**XRF, "LOI": "6.2"}) == {"cannot_evaluate"}


@pytest.mark.parametrize(
    ("lime", "outcome"), [("10.0", "fire"), ("13.99", "pass"), ("19.58", "fire"), (None, "not_applicable")]
)
def test_element_oxide_mixup(lime, outcome):
    batch = [{**XRF, "label": f"S-{n}", "CA": "100000", "CAO": lime} for n in range(4)]
    given = outcomes("element_oxide_mixup", *batch)
    assert given == ({outcome} if lime else set()) or (lime is None and not given)


def test_one_pair_is_no_batch():
    assert outcomes("element_oxide_mixup", {**XRF, "CA": "100000", "CAO": "10.0"}) == {"not_applicable"}


VANADIUM = ("380", "402", "415", "431", "444", "460")


@pytest.mark.parametrize(
    ("odd", "fires"), [("0.045", True), ("0.42", True), ("300", False), ("4200000", True), ("60000", True)]
)
def test_ppm_pct_mixup(odd, fires):
    """V 0.045 in a ppm column whose neighbours are 380 to 460; 60000 ug/g is more than rock holds."""
    batch = [{**XRF, "label": f"S-{n}", "V": value} for n, value in enumerate((*VANADIUM, odd))]
    found = ask("ppm_pct_mixup", *batch).findings
    assert [finding.row for finding in found] == ([6] if fires else [])


def test_ppm_pct_mixup_other_outcomes():
    assert outcomes("ppm_pct_mixup", *({**XRF, "V": value} for value in VANADIUM[:3])) == {"cannot_evaluate"}
    assert outcomes("ppm_pct_mixup", *({**XRF, "V": value} for value in VANADIUM)) == {"pass"}
    assert only("ppm_pct_mixup", {**XRF, "P2O5": "43.0"}).severity == "reject-candidate"


@pytest.mark.parametrize(("cells", "severities"), [
    (("0.2", "<1", "4"), ["warn"]), (("1.2", "<1", "4"), []), (("0.2", "0.3", "4"), []), (("0", "<1", "4"), ["warn"]),
    (("<1",) * 5 + ("3",) * 4, ["info"]), (("<1",) * 3 + ("3",) * 6, []),
])  # fmt: skip
def test_detection_limit(cells, severities):
    batch = [{**XRF, "label": f"S-{n}", "MO": value} for n, value in enumerate(cells)]
    assert [finding.severity for finding in ask("detection_limit", *batch).findings] == severities


def test_redox_enrichment_sanity():
    rock = {**XRF, "AL2O3": "12.30", "V": "450", "MO": "60", "U": "18"}
    assert outcomes("redox_enrichment_sanity", rock) == {"pass"}
    mill = only("redox_enrichment_sanity", {**rock, "CO": "400", "W": "900"})
    assert mill.severity == "warn"
    assert mill.more["per_aluminium"] == {
        "V": pytest.approx(69.1, abs=0.1),
        "MO": pytest.approx(9.2, abs=0.1),
        "U": pytest.approx(2.8, abs=0.1),
    }
    assert mill.more["setting"] == ""
    assert (
        only("redox_enrichment_sanity", {**XRF, "AL2O3": "12.30", "V": "60", "MO": "60", "U": "2"}).severity == "info"
    )
    assert outcomes("redox_enrichment_sanity", {**XRF, "V": "450"}) == {"cannot_evaluate"}
    assert outcomes("redox_enrichment_sanity", {**XRF, "CAO": "4"}) == {"not_applicable"}


@pytest.mark.parametrize(("v", "mo", "u", "setting"), [
    (47, 5.1, 5.1, "perennial oxygen-minimum-zone core"),  # V > 46, U > 5, Mo > 5: Bennett & Canfield 2020, abstract
    (30, 6, 2, "euxinic"), (20, 2, 1.5, "beneath an oxygen-minimum zone"), (69.1, 9.2, 2.8, ""),
])  # fmt: skip
def test_settings_by_metals(v, mo, u, setting):
    assert modern_setting(v, mo, u) == setting


@pytest.mark.parametrize(
    ("slope", "size", "outcome"), [(0.62, 12, "fire"), (1.02, 12, "pass"), (0.62, 8, "not_applicable")]
)
def test_method_pair_bias(slope, size, outcome):
    records = [{**XRF, "sample": n, "table": 0, "sheet": "XRF", "ZR": f"{100 + 13 * n}"} for n in range(size)]
    records += [
        {**XRF, "sample": n, "table": 1, "ZR": f"{slope * (100 + 13 * n):.1f}", "replicate": 2} for n in range(size)
    ]
    assert outcomes("method_pair_bias", *records) == {outcome}
    if outcome == "fire":
        assert "incomplete digestion" in only("method_pair_bias", *records).message


@pytest.mark.parametrize(
    ("lime", "outcome"), [("20.4", "pass"), ("14.2", "fire"), ("<30", "cannot_evaluate"), (None, "not_applicable")]
)
def test_xrd_xrf_reconcile(lime, outcome):
    """Calcite 30 and dolomite 10 hold 19.85 wt% CaO."""
    records = on({**XRD, "CALCITE": "30.0", "DOLOMITE": "10.0"}, {**XRF, "CAO": lime})
    assert outcomes("xrd_xrf_reconcile", *records) == {outcome}
    if outcome == "fire":
        assert only("xrd_xrf_reconcile", *records).computed == pytest.approx(19.85 - 14.2, abs=0.01)


def test_minerals_of_silica_and_potash_are_floors():
    rock = {**XRD, "QUARTZ": "60.0", "K_FELDSPAR": "20.0"}
    assert outcomes("xrd_xrf_reconcile", *on(rock, {**XRF, "SIO2": "75.0", "K2O": "3.6"})) == {"pass"}
    assert {
        finding.analyte
        for finding in ask("xrd_xrf_reconcile", *on(rock, {**XRF, "SIO2": "50.0", "K2O": "3.6"})).findings
    } == {"QUARTZ"}
