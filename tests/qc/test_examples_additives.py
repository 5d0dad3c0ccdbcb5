"""The worked examples of additives, cavings, mud solids, and of cuttings against core."""

import numpy as np
import pytest

from qc.rules.additives import materials, mixture
from qc.rules.cuttings_core_bias import compare
from tests.qc.asking import ask, only, outcomes

LIMESTONE = {"formation": "Dun Limestone", "kind": "cuttings"}


def limestone(count=9):
    return [
        {"label": f"L-{n}", "top_m": 2150.0 + 10 * n, "TOC": f"{0.48 + 0.03 * (n % 3):.2f}", "S1": "0.10", "TMAX": str(436 + n % 3),
         "S2": f"{1.20 + 0.06 * (n % 3):.2f}", "S3": f"{0.33 + 0.02 * (n % 3):.2f}", **LIMESTONE}
        for n in range(count)
    ]  # fmt: skip


FIBRE = {
    "label": "X",
    "top_m": 2205.0,
    "TOC": "1.40",
    "S1": "0.12",
    "S2": "4.30",
    "S3": "4.60",
    "TMAX": "352",
    **LIMESTONE,
}
PILL = [(0, 0.0, 2890.0, "water", "KCl, polymer; cellulose fibre pill at 2210 m")]


def test_fibre_against_losses():
    finding = only("additive_signature", *limestone(), FIBRE, muds=PILL)
    assert (finding.row, finding.severity) == (9, "warn")
    assert "fibre" in finding.more["material"]
    assert "the mud record names it" in finding.message
    assert finding.more["discriminating_test"] == "hand-pick and re-run"
    assert "natural bitumen or migrated oil" in finding.more["alternatives"]


def test_what_the_mud_record_does_not_name_is_said():
    other = [(0, 0.0, 2890.0, "water", "bentonite")]
    assert "does not name it" in only("additive_signature", *limestone(), FIBRE, muds=other).message
    assert "no mud record" in only("additive_signature", *limestone(), FIBRE).message


@pytest.mark.parametrize(("change", "outcome"), [
    ({"TMAX": "437", "S3": "0.9", "S2": "3.4"}, "pass"),  # a richer bed of the same kerogen
    ({"TOC": "0.50", "S2": "1.2", "S3": "0.34"}, "pass"),  # Tmax alone is one sign
])  # fmt: skip
def test_one_sign_is_not_enough(change, outcome):
    assert outcomes("additive_signature", *limestone(), {**FIBRE, **change}) == {outcome}


def test_additive_outcomes():
    assert outcomes("additive_signature", *limestone()) == {"pass"}
    assert outcomes("additive_signature", *limestone(4), FIBRE) == {"not_applicable"}
    assert outcomes("additive_signature", {"RO": "0.5", "label": "N"}) == {"cannot_evaluate"}
    assert not ask("additive_signature", {"method": "reflectance", "RO": "0.5"}).findings


def oily():
    base = [{**one, "S1": f"{0.40 + 0.02 * n:.2f}", "S2": "4.00", "TOC": "1.50"} for n, one in enumerate(limestone())]
    return [*base, {**base[0], "label": "O", "top_m": 2206.0, "S1": "3.00", "S2": "4.10", "TOC": "1.70"}]


def test_the_mud_record_chooses_among_base_oils():
    """Pyrolysis cannot tell base oils apart: the recorded one is named, the others are alternatives."""
    muds = [(0, 0.0, 2890.0, "oil", "mineral base oil")]
    finding = only("additive_signature", *oily(), muds=muds)
    assert (finding.more["material"], finding.analyte) == ("mineral base oil", "S1")
    assert "diesel" in finding.more["alternatives"]
    assert finding.inputs[:2] == ("TOC", "S1")


def test_metals_of_pipe_dope_are_read_from_the_elements_of_the_sample():
    rows = [{**one, "sample": n} for n, one in enumerate(limestone())]
    metals = [
        {"method": "elements", "sample": n, "PB": "12", "ZN": "80", "top_m": 2150.0 + 10 * n, **LIMESTONE}
        for n in range(9)
    ]
    metals[4] |= {"PB": "900", "ZN": "1500"}
    finding = only("additive_signature", *rows, *metals)
    assert (finding.row, finding.analyte) == (4, "PB")
    assert set(finding.inputs) >= {"PB", "ZN"}


def test_mixing_with_a_measured_additive():
    """Rock of TOC 3.0 with 20 % of a material of TOC 0.6 measures 2.52, and 20 % is found again."""
    rock, additive = np.array([3.0, 0.5, 12.0, 1.0]), np.array([0.6, 0.1, 1.0, 0.8])
    sample = 0.8 * rock + 0.2 * additive
    assert sample[0] == pytest.approx(2.52)
    made = mixture("cavings", sample, rock, additive, 0.05 * rock)
    assert made.share == pytest.approx(0.20)
    assert made.low < 0.20 < made.high
    assert made.misfit == pytest.approx(0.0, abs=1e-9)
    assert mixture("same", sample, rock, rock, 0.05 * rock) is None
    assert mixture("unknown", sample, rock, np.array([0.6, np.nan, np.nan, np.nan]), 0.05 * rock) is None


def test_the_project_s_own_additive_says_how_much():
    fibre = {"label": "Fibre LCM-2", "kind": "additive", "TOC": "42.0", "S1": "2.0", "S2": "150", "S3": "200"}
    finding = only("additive_signature", *limestone(), FIBRE, fibre, muds=PILL)
    best = finding.more["mixtures"][0]
    assert best["additive"] == "Fibre LCM-2"
    assert best["share_wt_percent"] == pytest.approx(2.1, abs=0.3)
    assert best["interval_wt_percent"][0] < best["share_wt_percent"] < best["interval_wt_percent"][1]
    assert "wt% of Fibre LCM-2" in finding.message


def test_table_of_materials():
    """The catalogue from diesel to barite and KCl; each has signs, what else shows it and a test."""
    assert len(materials()) == 13
    for material in materials():
        assert material.record
        assert len({sign["of"] for sign in material.signs}) >= 2
        assert material.other
        assert material.test
        assert material.mark in {"MEM", "READ"}


def barium(value, **more):
    return {
        "method": "elements",
        "kind": "cuttings",
        "BA": value,
        "top_m": 2500.0,
        "formation": "Ashgrove Shale",
        **more,
    }


def test_barite():
    """Ba 0.35 wt%: BaSO4 0.595 wt%, sulfur 0.082 wt%."""
    finding = only("mud_solids_elements", barium("3500"))
    assert finding.severity == "info"
    assert finding.more["barite_wt_percent"] == pytest.approx(0.595, abs=5e-4)
    assert finding.more["sulfur_of_barite_wt_percent"] == pytest.approx(0.082, abs=5e-4)
    assert only("mud_solids_elements", barium("20000")).severity == "warn"
    assert only("mud_solids_elements", barium(None, BAO="2.5")).severity == "warn"


def test_mud_solids_outcomes():
    assert outcomes("mud_solids_elements", barium("900")) == {"pass"}
    assert outcomes("mud_solids_elements", barium("<50")) == {"cannot_evaluate"}
    assert outcomes("mud_solids_elements", barium("20000", kind="core")) == {"not_applicable"}
    core = barium("30000", kind="core", formation="Ashgrove Shale")
    assert only("mud_solids_elements", core, barium("20000", formation="Ashgrove Shale")).severity == "info"


def test_potassium_under_a_potassium_chloride_fluid():
    rows = [barium(None, K=f"{20000 + 500 * (n % 4)}", top_m=2500.0 + 10 * n) for n in range(9)]
    odd = barium(None, K="31000", top_m=2544.0)
    salty = [(0, 0.0, 3000.0, "water", "KCl, polymer")]
    assert only("mud_solids_elements", *rows, odd, muds=salty).row == 9
    assert not ask("mud_solids_elements", *rows, muds=salty).findings
    assert not ask("mud_solids_elements", *rows, odd).findings


def test_cuttings_core_example():
    """Cuttings 1.9 (MADN 0.4, n 8), core 3.0 (MADN 0.5, n 12): 2 SE 0.404."""
    cuttings = 1.9 + np.array([-4, -3, -1, -1, 1, 1, 3, 4]) * 0.4 / (2 * 1.4826)
    cores = 3.0 + np.array([-4, -3, -3, -1, -1, -0.5, 0.5, 1, 1, 3, 3, 4]) * 0.5 / (2 * 1.4826)
    made = compare(cuttings, cores)
    assert made.away == pytest.approx(-1.10)
    assert made.error == pytest.approx(2 * np.sqrt(0.4**2 / 8 + 0.5**2 / 12), rel=0.01)
    assert 2 * np.sqrt(0.4**2 / 8 + 0.5**2 / 12) == pytest.approx(0.404, abs=5e-4)


def bed(kind, toc, count, first=2500.0, step=2.0):
    return [
        {"label": f"{kind}-{n}", "kind": kind, "formation": "Ashgrove Shale", "top_m": first + step * n, "TOC": f"{toc + 0.1 * (n % 5):.2f}"}
        for n in range(count)
    ]  # fmt: skip


def test_cuttings_core_bias():
    finding = only("cuttings_core_bias", *bed("cuttings", 1.7, 8), *bed("core", 2.8, 12))
    assert (finding.analyte, finding.severity, finding.row) == ("TOC", "warn", None)
    assert "thin rich bed" in finding.more["alternatives"][1]
    assert "pass" in outcomes("cuttings_core_bias", *bed("cuttings", 2.7, 8), *bed("core", 2.8, 12))
    assert outcomes("cuttings_core_bias", *bed("cuttings", 1.7, 4), *bed("core", 2.8, 12)) == {"not_applicable"}
    far = bed("core", 2.8, 12, first=2600.0)
    assert not ask("cuttings_core_bias", *bed("cuttings", 1.7, 8), *far).findings


def hole(odd="435", kind="cuttings", unit="Brill Shale"):
    """Tmax rises by 4 degC each 100 m from 420; the sample at 1950 m is as given."""
    rows = [
        {"label": f"H-{n}", "kind": "cuttings", "top_m": 1000.0 + 100 * n, "TMAX": str(420 + 4 * n + (n * 5) % 3 - 1), "S2": "3.0", "TOC": "1.0",
         "formation": "Ashgrove Shale" if n < 7 else "Brill Shale"}
        for n in range(14)
    ]  # fmt: skip
    return [
        *rows,
        {"label": "X", "kind": kind, "top_m": 1950.0, "TMAX": odd, "S2": "3.0", "TOC": "1.0", "formation": unit},
    ]


def test_caving_trend_outlier():
    finding = only("caving_trend_outlier", *hole("434"), shoes=[(0, 900.0)])
    assert (finding.row, finding.analyte, finding.severity) == (14, "TMAX", "warn")
    assert finding.more["unit"] == "Ashgrove Shale"
    assert finding.more["casing_shoes_m"] == [900.0]


@pytest.mark.parametrize(("odd", "shoe", "outcome"), [
    ("434", 1700.0, "pass"),  # the unit above stands behind casing
    ("456", 900.0, "pass"), ("405", 900.0, "pass"),  # on the trend; like nothing above
])  # fmt: skip
def test_caving_must_not_fire(odd, shoe, outcome):
    assert outcomes("caving_trend_outlier", *hole(odd), shoes=[(0, shoe)]) == {outcome}


def test_caving_outcomes():
    assert outcomes("caving_trend_outlier", *hole("434")) == {"pass", "cannot_evaluate"}  # no casing recorded
    assert not ask("caving_trend_outlier", *hole("434", kind="core"), shoes=[(0, 900.0)]).findings
    assert outcomes("caving_trend_outlier", *hole()[:4], shoes=[(0, 900.0)]) == {"not_applicable"}
