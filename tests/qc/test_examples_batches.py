"""The worked examples of Tmax on another scale, of two TOC methods, and of too large an aliquot."""

import numpy as np
import pytest

from qc.rules.tmax_scale_offset import offset
from tests.qc.asking import only, outcomes


def batch(tmax_shift, count=6, **more):
    """Samples whose Tmax stand ``tmax_shift`` above what their reflectance gives."""
    return [
        {"label": f"B-{n}", "RO": f"{0.6 + 0.02 * n:.2f}", "TMAX": f"{(0.6 + 0.02 * n + 7.16) / 0.018 + tmax_shift:.0f}", "S2": "4.0",
         **more}
        for n in range(count)
    ]  # fmt: skip


def test_reference_rock_at_the_raw_temperature():
    """Certified 416; measured 454, 455, 453."""
    fires, median, _ = offset(np.array([454.0, 455.0, 453.0]) - 416, 25, 55, 6)
    assert (fires, median) == (True, 38.0)
    assert not offset(np.array([417.0, 415.0, 416.0]) - 416, 25, 55, 6)[0]
    assert not offset(np.array([430.0, 455.0, 470.0]) - 416, 25, 55, 6)[0]  # no constant


def test_tmax_scale_offset_against_reflectance():
    finding = only("tmax_scale_offset", *batch(38))
    assert (finding.severity, finding.row) == ("reject-candidate", None)
    assert finding.computed == pytest.approx(38, abs=0.5)
    assert outcomes("tmax_scale_offset", *batch(0)) == {"pass"}
    assert outcomes("tmax_scale_offset", *batch(38, count=4)) == {"cannot_evaluate"}


PAIR = {"TOC": "2.40", "TOC_CARBON": "3.00"}


def test_toc_method_pair():
    finding = only("toc_method_pair", PAIR)
    assert finding.computed == pytest.approx(0.60)
    assert finding.limit == pytest.approx(0.384, abs=5e-4)
    assert finding.more["direction"] == "combustion high"
    assert only("toc_method_pair", {"TOC": "3.00", "TOC_CARBON": "2.40"}).more["direction"] == "combustion low"


@pytest.mark.parametrize(("record", "outcome"), [
    ({"TOC": "2.70", "TOC_CARBON": "3.00"}, "pass"), ({"TOC": "2.40"}, "not_applicable"),
    ({"TOC": "<0.2", "TOC_CARBON": "3.00"}, "cannot_evaluate"), ({"TOC": "0.05", "TOC_CARBON": "0.15"}, "pass"),
])  # fmt: skip
def test_toc_pair_outcomes(record, outcome):
    assert outcomes("toc_method_pair", record) == {outcome}


def test_aliquot_overload():
    assert only("aliquot_overload", {"S2": "180", "ALIQUOT": "70"}).computed == pytest.approx(12.6)
    assert outcomes("aliquot_overload", {"S2": "8", "ALIQUOT": "70"}) == {"pass"}
    assert outcomes("aliquot_overload", {"S2": "180"}) == {"cannot_evaluate"}
    assert outcomes("aliquot_overload", {"TOC": "1.0"}) == {"not_applicable"}
