"""The worked examples of the maturity cross-checks."""

import numpy as np
import pytest

from qc.rules.ro_tmax_disagreement import equivalents
from qc.rules.thresholds import defaults
from qc.rules.vr_count_sd import half_width
from tests.qc.asking import ask, only, outcomes

SAMPLE = {"S2": "6.0", "TOC": "2.0"}


def test_ro_tmax_disagreement():
    finding = only("ro_tmax_disagreement", {**SAMPLE, "RO": "0.45", "TMAX": "450"})
    assert finding.more["schemes"] == pytest.approx({"jarvie2001": 0.94, "evenick2021": 0.85})
    assert finding.analyte == "RO"


@pytest.mark.parametrize(("record", "outcome"), [
    ({"RO": "0.90", "TMAX": "450"}, "pass"),
    ({"RO": "1.30", "TMAX": "450"}, "fire"),
    ({"RO": "0.45", "TMAX": "490"}, "not_applicable"),  # beyond the range of the conversions
    ({"RO": "0.45", "TMAX": "450", "S2": "0.3"}, "not_applicable"),
    ({"RO": "0.45", "TMAX": "450", "S2": "0.9"}, "not_applicable"),  # HI 45
    ({"RO": "0.45"}, "not_applicable"),
    ({"RO": "0.45", "TMAX": "450", "TOC": None}, "cannot_evaluate"),
    ({"RO": "<0.45", "TMAX": "450"}, "cannot_evaluate"),
])  # fmt: skip
def test_ro_tmax_outcomes(record, outcome):
    assert outcomes("ro_tmax_disagreement", {**SAMPLE, **record}) == {outcome}


def test_conversions_give_the_published_values():
    """Evenick 2021 (abstract read): 440 -> 0.72, 435 -> 0.655. Jarvie 2001 (from memory): 435 -> 0.67, 450 -> 0.94."""
    shipped = defaults()["ro_tmax_disagreement"]
    schemes = {
        name: (shipped[f"{name}_slope"]["value"], shipped[f"{name}_intercept"]["value"])
        for name in ("jarvie2001", "evenick2021")
    }
    tmax = np.array([435.0, 440.0, 450.0, 460.0])
    made = equivalents(tmax, schemes)
    assert made["evenick2021"] == pytest.approx([0.655, 0.720, 0.850, 0.980])
    assert made["jarvie2001"] == pytest.approx([0.670, 0.760, 0.940, 1.120])


@pytest.mark.parametrize(("record", "outcome"), [
    ({"TMAX": "472", "S2": "8.2", "TOC": "2.0"}, "fire"),  # HI 410
    ({"TMAX": "458", "S2": "6.2", "TOC": "2.0"}, "fire"),
    ({"TMAX": "458", "S2": "5.8", "TOC": "2.0"}, "pass"),
    ({"TMAX": "480", "S2": "2.2", "TOC": "2.0"}, "fire"),
    ({"TMAX": "440", "S2": "12", "TOC": "2.0"}, "pass"),
    ({"TMAX": "472", "S2": "8.2", "TOC": "2.0", "ALGINITE": "60"}, "not_applicable"),
    ({"TMAX": "472"}, "cannot_evaluate"),
    ({"S2": "8.2", "TOC": "2.0"}, "not_applicable"),
])  # fmt: skip
def test_hi_tmax_envelope(record, outcome):
    assert outcomes("hi_tmax_envelope", record) == {outcome}


@pytest.mark.parametrize(("n", "outcome", "severity"), [
    ("25", "pass", None), ("20", "pass", None), ("19", "fire", "warn"), ("5", "fire", "warn"), ("4", "fire", "reject-candidate"),
    (None, "cannot_evaluate", None),
])  # fmt: skip
def test_vr_count(n, outcome, severity):
    answer = ask("vr_count_sd", {"method": "reflectance", "RO": "0.62", "RO_N": n})
    assert outcomes("vr_count_sd", {"method": "reflectance", "RO": "0.62", "RO_N": n}) == {outcome}
    assert [finding.severity for finding in answer.findings] == ([severity] if severity else [])


def test_vr_spread_and_extremes():
    wide = only("vr_count_sd", {"method": "reflectance", "RO": "0.60", "RO_N": "30", "RO_SD": "0.12"})
    assert (wide.analyte, wide.limit) == ("RO_SD", pytest.approx(0.108))
    astray = only(
        "vr_count_sd", {"method": "reflectance", "RO": "0.40", "RO_N": "30", "RO_MIN": "0.45", "RO_MAX": "0.60"}
    )
    assert astray.severity == "reject-candidate"
    assert outcomes("vr_count_sd", {"method": "reflectance", "RO_MIN": "0.45"}) == {"not_applicable"}


def test_half_width_of_the_mean():
    assert half_width(0.06, 20) == pytest.approx(0.028, abs=5e-4)
    assert half_width(0.06, 5) == pytest.approx(0.074, abs=1e-3)
