"""The worked examples of the rule catalogue for routine core analysis, each with what must pass beside it."""

import numpy as np
import pytest
from scipy import optimize

from qc.rules.plugs.grains import density_of
from qc.rules.plugs.permeability import (
    ATMOSPHERE,
    MODELS,
    PSI,
    corrected,
    slip_heid,
    slip_jones,
    slip_jones_owens,
)
from qc.rules.plugs.porosity import porosity_of
from tests.qc.asking import ask, only, outcomes

PLUG = {"method": "core", "kind": "plug"}


@pytest.mark.parametrize(("cells", "outcome"), [
    ({"PHI": "10.3", "RHOB": "2.43", "RHOG": "2.66"}, "fire"), ({"PHI": "8.7", "RHOB": "2.43", "RHOG": "2.66"}, "pass"),
    ({"PHI": "10.3", "RHOB": "2.43", "RHOG": "2.66", "remark": "wet bulk density"}, "not_applicable"),
    ({"PHI": "10.3", "RHOB": "2.43"}, "not_applicable"), ({"PHI": "<10.3", "RHOB": "2.43", "RHOG": ">2.6"}, "cannot_evaluate"),
    ({"PHI": "65"}, "fire"), ({"PHI": "5.0", "RHOB": "2.70", "RHOG": "2.66"}, "fire"),
])  # fmt: skip
def test_porosity_density_consistency(cells, outcome):
    assert outcomes("porosity_density_consistency", {**PLUG, **cells}) == {outcome}


def test_porosity_hint_names_the_grain_density_that_was_assumed():
    finding = only("porosity_density_consistency", {**PLUG, "PHI": "10.3", "RHOB": "2.43", "RHOG": "2.66"})
    assert porosity_of(2.43, 2.66) == pytest.approx(8.65, abs=0.01)
    assert porosity_of(2.43, 2.71) == pytest.approx(10.33, abs=0.01)
    assert finding.more["implied_grain_density"] == pytest.approx(2.71, abs=0.002)


@pytest.mark.parametrize(("air", "liquid"), [(100, 91.84), (1, 0.615), (0.1, 0.0341)])
def test_slip_by_heid_at_one_and_a_half_atmospheres(air, liquid):
    made = corrected(np.array([float(air)]), 1.5 * ATMOSPHERE, slip_heid)[0]
    assert made == pytest.approx(liquid, rel=2e-3)


@pytest.mark.parametrize("slip", MODELS.values(), ids=MODELS)
@pytest.mark.parametrize("air", [0.01, 3.0, 800.0])
def test_slip_correction_agrees_with_scipy(slip, air):
    root = optimize.brentq(lambda k: k * (1 + slip(k) / (1.5 * ATMOSPHERE)) - air, 1e-9, air)
    assert corrected(np.array([air]), 1.5 * ATMOSPHERE, slip)[0] == pytest.approx(root, rel=1e-6)


def test_published_slip_factors():
    assert slip_heid(1.0) / PSI == pytest.approx(11.42, abs=0.01)
    assert slip_jones_owens(1.0) / PSI == pytest.approx(
        12.7, abs=0.1
    )  # m2 and Pa: millidarcy and atmospheres would be wrong
    # Klinkenberg plot page: intercept 24.78 mD, slope 41.02, b printed as 1.66 psi
    assert pytest.approx(1.655, abs=1e-3) == 41.02 / 24.78
    # readme after Ahmed: 46.6 mD to air at 2.152 psi -> 22.85 mD (laboratory 23.66)
    assert corrected(np.array([46.6]), 2.152 * PSI, slip_jones)[0] == pytest.approx(22.85, abs=0.02)
    assert PSI == 6894.757293168  # SI


@pytest.mark.parametrize(("air", "liquid", "outcome"), [
    ("100", "91.8", "pass"), ("100", "120", "fire"), ("1.0", "0.1", "fire"), ("1.0", "0.615", "pass"),
    ("1.0", None, "not_applicable"), ("<0.01", "0.005", "cannot_evaluate"),
])  # fmt: skip
def test_klinkenberg_order(air, liquid, outcome):
    assert outcomes("klinkenberg_order", {**PLUG, "KAIR": air, "KLINK": liquid}) == {outcome}


def test_klinkenberg_order_severity_and_liquid_permeability():
    assert only("klinkenberg_order", {**PLUG, "KAIR": "100", "KLINK": "120"}).severity == "reject-candidate"
    liquid = {**PLUG, "KAIR": "100", "KLINK": "120", "remark": "liquid permeability"}
    assert outcomes("klinkenberg_order", liquid) == {"not_applicable"}


@pytest.mark.parametrize(("so", "sw", "sg", "outcome"), [
    ("32.4", "58.1", "6.0", "fire"),  # 96.5
    ("32.4", "58.1", "9.0", "pass"), ("10.0", "101.0", None, "fire"), ("30.0", "40.0", None, "cannot_evaluate"),
    (None, "40.0", None, "not_applicable"),
])  # fmt: skip
def test_saturation_sum(so, sw, sg, outcome):
    assert outcomes("saturation_sum", {**PLUG, "SO": so, "SW": sw, "SG": sg}) == {outcome}


def test_saturation_sum_severity_and_oil_by_difference():
    assert only("saturation_sum", {**PLUG, "SO": "32.4", "SW": "58.1", "SG": "6.0"}).severity == "warn"
    assert only("saturation_sum", {**PLUG, "SO": "32.4", "SW": "48.1", "SG": "6.0"}).severity == "reject-candidate"
    built_in = {**PLUG, "SO": "32.4", "SW": "58.1", "SG": "6.0", "remark": "oil by difference"}
    assert outcomes("saturation_sum", built_in) == {"not_applicable"}


@pytest.mark.parametrize(("rho", "remark", "outcome"), [
    ("2.91", "limestone, grey", "fire"), ("2.71", "limestone, grey", "pass"), ("2.91", "", "not_applicable"),
    ("1.90", "", "fire"), ("2.91", "limestone and sandstone", "not_applicable"), (None, "limestone", "not_applicable"),
    ("~2.91", "limestone", "cannot_evaluate"),
])  # fmt: skip
def test_grain_density_window(rho, remark, outcome):
    assert outcomes("grain_density_window", {**PLUG, "RHOG": rho, "remark": remark}) == {outcome}


MINERALS = {"QUARTZ": 45.0, "CALCITE": 20.0, "ILLITE": 25.0, "PYRITE": 5.0}


def test_grain_density_of_minerals():
    assert density_of(MINERALS, 5.0) == pytest.approx(2.607, abs=1e-3)
    assert density_of(MINERALS) == pytest.approx(2.765, abs=1e-3)


@pytest.mark.parametrize(("rho", "toc", "outcome"), [
    ("2.76", "4.00", "fire"), ("2.61", "4.00", "pass"), ("2.76", None, "cannot_evaluate"), (None, "4.00", "not_applicable"),
])  # fmt: skip
def test_grain_density_from_minerals(rho, toc, outcome):
    records = [
        {**PLUG, "sample": 3, "RHOG": rho}, {"method": "carbon", "sample": 3, "TOC": toc},
        {"method": "minerals", "sample": 3, **{name: f"{share:.1f}" for name, share in MINERALS.items()}},
    ]  # fmt: skip
    assert outcomes("grain_density_from_minerals", *records) == {outcome}
    if outcome == "fire":
        assert "Organic matter ignored" in only("grain_density_from_minerals", *records).message


def plugs(size, **odd):
    made = [
        {
            **PLUG,
            "label": f"P-{n}",
            "formation": "Ashgrove Sand",
            "PHI": f"{3 + 0.5 * n:.1f}",
            "KAIR": f"{0.05 * 1.5 ** (n + (n % 3) / 4):.3f}",
        }
        for n in range(size)
    ]
    return [*made, {**PLUG, "label": "odd", "formation": "Ashgrove Sand", **odd}]


def test_poroperm_outlier():
    """Porosity 3 % with 850 mD: a crack."""
    found = ask("poroperm_outlier", *plugs(16, PHI="3.0", KAIR="850")).findings
    assert [(finding.row, finding.severity) for finding in found] == [(16, "info")]
    assert outcomes("poroperm_outlier", *plugs(16, PHI="6.0", KAIR="0.6")) == {"pass"}
    assert outcomes("poroperm_outlier", *plugs(8, PHI="3.0", KAIR="850")) == {"not_applicable"}
    assert outcomes("poroperm_outlier", *plugs(16, PHI="3.0", KAIR="<0.01")) == {"pass", "cannot_evaluate"}


def test_vertical_permeability():
    assert only("poroperm_outlier", {**PLUG, "KAIR": "1.0", "KVERT": "12"}).severity == "warn"
    assert outcomes("poroperm_outlier", {**PLUG, "KAIR": "1.0", "KVERT": "0.8"}) == {"pass"}
