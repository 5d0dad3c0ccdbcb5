"""The worked examples of single reflectance readings and of splits before and after extraction."""

import numpy as np
import pytest
from scipy import stats

from qc.rules.dip import dip, p_value
from qc.rules.vr_multimodal import classes, separate
from tests.qc.asking import ask, only, outcomes


def spread(count, mean, sd):
    """``count`` readings of this mean and standard deviation, evenly in probability."""
    made = stats.norm.ppf((np.arange(count) + 0.5) / count)
    return [f"{reading:.2f}" for reading in mean + sd * made / made.std(ddof=1)]


def sample(readings, **mean):
    rows = [
        {"method": "reflectance", "sample": 7, "RO": one, "RO_N": "1", "line": 3 + n} for n, one in enumerate(readings)
    ]
    return [{"method": "reflectance", "sample": 7, "RO_N": str(len(readings)), **mean}, *rows]


TWO = spread(14, 0.52, 0.04) + spread(9, 0.88, 0.05)


def test_two_populations_under_one_mean():
    finding = only("vr_multimodal", *sample(TWO, RO="0.66"))
    assert (finding.row, finding.severity) == (0, "warn")
    assert [one["n"] for one in finding.more["classes"]] == [14, 9]
    assert finding.computed == pytest.approx(0.36, abs=0.01)
    assert "caved" in finding.more["alternatives"][0]


@pytest.mark.parametrize(("records", "outcome"), [
    (sample(spread(23, 0.60, 0.06), RO="0.60"), "pass"),
    (sample(TWO, RO="0.66", remark="two populations, reworked 0.88"), "not_applicable"),
    (sample(TWO[:6], RO="0.50"), "cannot_evaluate"),
    ([{"method": "reflectance", "RO": "0.66", "RO_N": "23"}], "cannot_evaluate"),
    ([{"TOC": "1.0"}], "not_applicable"),
])  # fmt: skip
def test_multimodal_outcomes(records, outcome):
    assert (outcomes("vr_multimodal", *records) or {"not_applicable"}) == {outcome}


def test_halves_of_one_population_are_no_classes():
    for even in (np.linspace(0.4, 0.9, 30), np.array([float(one) for one in spread(40, 0.8, 0.12)])):
        assert not separate(classes(even, 3), 0.2, 3.0)
        assert p_value(even) > 0.05


def test_dip_has_its_known_ends():
    """1/(2n) for evenly spaced values, 1/4 for two atoms of equal weight."""
    assert dip(np.linspace(0, 1, 20)) == pytest.approx(1 / 40)
    assert dip(np.repeat([0.0, 1.0], 10)) == pytest.approx(0.25)
    shifted = np.array([0.1, 0.2, 0.25, 0.7, 0.8, 0.95])
    assert dip(3 + 2 * shifted) == pytest.approx(dip(shifted))
    assert dip(-shifted) == pytest.approx(dip(shifted))
    assert p_value(np.repeat([0.0, 1.0], 10)) < 0.01


def split(after, before=None, **more):
    before = {"S1": "2.1", "S2": "14.2", "TMAX": "431", "TOC": "3.0", **(before or {})}
    return [{"sample": 5, **before}, {"sample": 5, "remark": "preparation: extracted", "replicate": 2, **after, **more}]


GONE = {"S1": "0.1", "S2": "9.8", "TMAX": "441", "TOC": "2.6"}


def test_pre_post_extraction():
    finding = only("pre_post_extraction", *split(GONE))
    assert (finding.row, finding.rows, finding.severity) == (0, (1,), "warn")
    assert finding.computed == {"S2_loss": pytest.approx(0.31, abs=0.005), "TMAX_rise": 10.0}
    assert finding.more["free_oil_mg_g"] == pytest.approx(2.1 + 4.4)
    assert "31 %" in finding.message


def test_extraction_swapped_or_incomplete():
    swapped = only("pre_post_extraction", *split({"S1": "0.1", "S2": "16.0", "TMAX": "431"}))
    assert swapped.severity == "reject-candidate"
    assert "incomplete" in only("pre_post_extraction", *split({"S1": "0.5", "S2": "14.0", "TMAX": "432"})).message
    split_numbers = split(GONE, {"lab_number": "L-1"}, lab_number="L-9")
    assert "make sure that it is one split" in only("pre_post_extraction", *split_numbers).message


def test_extraction_outcomes():
    assert outcomes("pre_post_extraction", *split({"S1": "0.1", "S2": "13.6", "TMAX": "432"})) == {"pass"}
    assert outcomes("pre_post_extraction", split(GONE)[1]) == {"cannot_evaluate"}
    assert not len(ask("pre_post_extraction", split(GONE)[0]).outcome)
    unlike = split({**GONE, "remark": "not extracted"})
    assert not len(ask("pre_post_extraction", *unlike).outcome)
    assert "cannot_evaluate" in outcomes("pre_post_extraction", *split({"S1": "0.1"}))


def test_an_extracted_split_is_no_second_line_of_a_depth():
    rows = [{**one, "label": "A-1", "top_m": 2510.0} for one in split(GONE)]
    assert not ask("duplicate_depth", *rows).findings
