"""Context labels: each by its named scheme, gaps and bounds handled."""

import math

import pytest

from qc.rules import labels


@pytest.mark.parametrize(("tmax", "kerogen", "zone"), [
    (434, "II", "immature"), (440, "II", "oil"), (460, "II", "gas"), (460, "III", "oil"), (435, "II", "oil"), (455, "II", "gas"), (465, "III", "gas"),
])  # fmt: skip
def test_tmax_zones_of_the_public_page(tmax, kerogen, zone):
    """AAPG Wiki «Tmax»: immature below 435; oil 435-455 (II), 435-465 (III)."""
    label = labels.tmax_zone(tmax, kerogen)
    assert (label.text, label.scheme) == (zone, "aapg_wiki_tmax")


def test_tmax_says_nothing_of_type_one():
    assert labels.tmax_zone(440, "I").text == ""
    assert "not reliable" in labels.tmax_zone(440, "I").caution


@pytest.mark.parametrize(("pi", "zone"), [(0.05, "immature"), (0.20, "oil"), (0.35, "gas or cracking")])
def test_pi_zones_of_the_public_page(pi, zone):
    """AAPG Wiki «Production Index (PI)»."""
    assert labels.pi_zone(pi).text == zone
    assert labels.pi_zone(pi).scheme == "aapg_wiki_pi"


@pytest.mark.parametrize(("ro", "stage"), [(0.45, "immature"), (0.90, "mature"), (1.40, "overmature")])
def test_reflectance_stages_of_the_standard(ro, stage):
    """ASTM D7708 as its catalogue page has it."""
    assert labels.reflectance_stage(ro, labels.D7708).text == stage


def test_schemes_differ_and_are_named():
    stages = {
        scheme: labels.reflectance_stage(0.57, scheme) for scheme in (labels.D7708, labels.JARVIE, labels.PETERS_CASSA)
    }
    assert {name: label.text for name, label in stages.items()} == {
        "astm_d7708": "mature", "jarvie_2007": "oil", "peters_cassa_1994": "immature"
    }  # fmt: skip
    assert all(label.scheme == name for name, label in stages.items())
    assert set(stages) < set(labels.SOURCES)
    with pytest.raises(ValueError, match="no reflectance stages"):
        labels.reflectance_stage(0.5, "another")


def test_peters_and_cassa():
    """From memory of Peters & Cassa 1994: TOC 0.5 fair, S2 6 good, HI 350 Type II, Ro 0.62 early."""
    assert labels.quality("TOC", 0.5).text == "fair"
    assert labels.quality("S2", 6).text == "good"
    assert labels.kerogen("HI", 350, toc=2.0).text == "Type II"
    assert labels.maturity("RO", 0.62).text == "early"


@pytest.mark.parametrize(("code", "value", "text"), [
    ("PI", 0.09, "immature"), ("PI", 0.12, "early"), ("PI", 0.20, "between early and peak"), ("PI", 0.25, "peak"), ("PI", 0.45, "late"),
    ("BITUMEN_TOC", 0.12, "between early and peak"), ("BITUMEN_TOC", 0.16, "peak"), ("RO", 0.1, ""), ("RO", 0.2, "immature"),
    ("TMAX", 445, "peak"), ("TMAX", 434.9, "immature"), ("TMAX", 470, "post"), ("RO", 1.35, "post"), ("TMAX", math.nan, ""),
])  # fmt: skip
def test_gaps_and_bounds_of_the_maturity_table(code, value, text):
    assert labels.maturity(code, value).text == text


@pytest.mark.parametrize(("toc", "text"), [
    (0.0, "poor"), (0.499, "poor"), (1.0, "good"), (2.0, "very good"), (4.0, "excellent"), (math.nan, ""),
])  # fmt: skip
def test_lower_bounds_belong_to_the_class(toc, text):
    assert labels.quality("TOC", toc).text == text


def test_kerogen_type_needs_immature_clean_rock_with_carbon():
    assert labels.kerogen("HI", 350, toc=0.4).text == ""
    assert labels.kerogen("HI", 350, toc=math.nan).text == ""
    mature = labels.kerogen("HI", 150, toc=2.0, maturity="late")
    assert mature.text == "present-day HI class III"
    assert "not immature" in mature.caution
    assert "contamination" in labels.kerogen("HI", 350, toc=2.0, contaminated=True).caution
    assert labels.quality("S2", 6, maturity="immature").caution == ""


@pytest.mark.parametrize(("hi", "kind", "made"), [
    (620, "I", "oil"), (300, "II", "oil"), (250, "II/III", "oil and gas"), (60, "III", "gas"), (49, "IV", "none")
])  # fmt: skip
def test_products(hi, kind, made):
    assert labels.kerogen("HI", hi, toc=1.0).text == f"Type {kind}"
    assert labels.product(kind) == made
    assert labels.product("VII") == ""
