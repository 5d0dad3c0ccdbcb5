"""The S2-TOC line: the worked set of the catalogue, its preconditions, and the rules that build upon it."""

import numpy as np
import pytest

from qc.rules.s2_retained import retained
from tests.qc.asking import S2, TOC, ask, only, outcomes, worked_set


def test_the_worked_set_fires_with_both_readings():
    finding = only("s2_toc_fit", *worked_set())
    fit = finding.more["fit"]
    assert (finding.severity, finding.analyte) == ("warn", "HI")
    assert fit["slope"] == pytest.approx(4.2081, abs=1e-4)
    assert fit["intercept"] == pytest.approx(-0.9620, abs=1e-4)
    assert fit["intercept_joint_medians"] == pytest.approx(-0.9595, abs=1e-4)
    assert fit["toc0"] == pytest.approx(0.2286, abs=1e-4)
    assert fit["hi_star"] == pytest.approx(421, abs=0.5)
    assert fit["slope_siegel"] == pytest.approx(4.2159, abs=1e-4)
    assert fit["intercept_siegel"] == pytest.approx(-0.9725, abs=1e-4)
    assert fit["slope_deming"] == pytest.approx(3.844, abs=1e-3)
    assert fit["slope_ordinary"] == pytest.approx(3.696, abs=1e-3)
    assert fit["intercept_ordinary"] == pytest.approx(-0.400, abs=1e-3)
    assert fit["ci95"]["toc0"] == pytest.approx([0.18, 0.24], abs=0.015)
    assert len(fit["x"]) == len(fit["y"]) == 12
    assert "dead" in finding.message
    assert "held back" in finding.message


@pytest.mark.parametrize(("records", "outcome"), [
    (worked_set()[:7], "not_applicable"),  # too few
    (worked_set(TMAX=None), "cannot_evaluate"),  # a maturity gradient cannot be ruled out
    (worked_set(S2="5.00"), "cannot_evaluate"),  # no slope
    (worked_set(TOC="2.50"), "not_applicable"),  # TOC does not span a factor of three
    (worked_set(kind="fluid"), "no check"),
    (worked_set(rejected=("S2",)), "not_applicable"),  # rejected values are not drawn through
])  # fmt: skip
def test_preconditions(records, outcome):
    assert (outcomes("s2_toc_fit", *records) or {"no check"}) == {outcome}


def test_a_maturity_gradient_forbids_the_fit():
    records = [{**record, "TMAX": str(430 + 3 * number)} for number, record in enumerate(worked_set())]
    assert outcomes("s2_toc_fit", *records) == {"not_applicable"}


def test_a_line_through_the_origin_passes():
    """Dilution with carbonate alone goes through the origin."""
    records = [{**record, "S2": f"{4.2 * toc:.2f}"} for record, toc in zip(worked_set(), TOC, strict=True)]
    assert outcomes("s2_toc_fit", *records) == {"pass"}
    assert outcomes("s2_retained", *records) == {"not_applicable"}


def test_units_are_fitted_apart():
    """Two formations that lie on two lines are not one set."""
    other = [
        {**record, "formation": "Brill Shale", "S2": f"{1.1 * toc:.2f}"}
        for record, toc in zip(worked_set(), TOC, strict=True)
    ]
    assert only("s2_toc_fit", *worked_set(), *other).more["unit"]["formation"] == "Ashgrove Shale"


def test_a_formation_not_stated_gives_information_only():
    assert only("s2_toc_fit", *worked_set(formation="")).severity == "info"


def test_eight_samples_give_information_only():
    assert only("s2_toc_fit", *(worked_set()[:10:1][i] for i in (0, 1, 2, 3, 4, 5, 6, 8, 9))).severity == "info"


def test_a_stained_sample_is_left_out_and_named():
    stained = {**worked_set()[5], "label": "stained", "S1": "4.00", "S2": "9.00", "TMAX": "426"}
    finding = only("s2_toc_fit", *worked_set(), stained)
    assert finding.more["fit"]["n"] == 12
    assert "stained" in finding.more["excluded"][0]


def test_many_stained_samples_leave_contamination_unresolved():
    stained = [{**record, "label": f"T-{n}", "S1": "6.00", "TMAX": "426"} for n, record in enumerate(worked_set()[:6])]
    assert outcomes("s2_toc_fit", *worked_set(), *stained) == {"not_applicable"}


def test_a_slip_in_s2_does_not_spoil_the_fit():
    """Ten times S2 with HI and PI as they were: arithmetic names S2, and the line is drawn without that sample."""
    slip = {**worked_set()[4], "label": "slip", "S2": "41.90", "HI": "349", "S3": "0.60", "OI": "50"}
    finding = only("s2_toc_fit", *worked_set(), slip)
    assert finding.more["fit"]["n"] == 12
    assert "slip" in finding.more["excluded"][0]
    assert [one.row for one in ask("s2_toc_outlier", *worked_set(), slip).findings] == [10, 12]


def test_s2_retained():
    findings = ask("s2_retained", *worked_set()).findings
    assert {finding.severity for finding in findings} == {"info"}
    assert findings[0].computed == pytest.approx(0.99, abs=0.005)
    assert findings[0].more["retained_percent"] == pytest.approx(56, abs=0.5)
    assert findings[11].computed == pytest.approx(0.93, abs=0.005)
    assert findings[11].more["retained_percent"] == pytest.approx(5, abs=0.5)
    assert retained(0.42, 0.78, 4.2081) == pytest.approx((0.99, 56), abs=0.5)


def test_s2_toc_outlier():
    finding = only("s2_toc_outlier", *worked_set())
    assert finding.row == TOC.index(3.60)
    assert finding.computed == pytest.approx(-5.09, abs=0.005)
    assert finding.more["z"] == pytest.approx(-93, abs=0.5)
    assert outcomes("s2_toc_outlier", *worked_set()[:9]) == {"not_applicable"}
    even = [{**record, "S2": f"{4.2 * toc - 0.9:.3f}"} for record, toc in zip(worked_set(), TOC, strict=True)]
    assert outcomes("s2_toc_outlier", *even) <= {"pass", "cannot_evaluate"}


def test_s2_positive_intercept():
    """m 3.1, b +0.9: S2 is left at zero TOC."""
    noise = np.resize([0.06, -0.04, 0.03, -0.05], len(TOC))
    records = [
        {**record, "S2": f"{3.1 * toc + 0.9 + error:.2f}"}
        for record, toc, error in zip(worked_set(), TOC, noise, strict=True)
    ]
    finding = only("s2_positive_intercept", *records)
    assert (finding.severity, finding.analyte) == ("warn", "S2")
    assert finding.computed == pytest.approx(0.9, abs=0.1)
    assert outcomes("s2_positive_intercept", *worked_set()) == {"pass"}
    assert outcomes("s2_positive_intercept", *worked_set(TMAX=None)) == {"cannot_evaluate"}
    rich = [
        {**record, "TOC": f"{toc + 1:.2f}", "S2": f"{s2 + 9:.2f}"}
        for record, toc, s2 in zip(worked_set(), TOC, S2, strict=True)
    ]
    assert outcomes("s2_positive_intercept", *rich) == {"not_applicable"}  # zero is too far from the lowest TOC
