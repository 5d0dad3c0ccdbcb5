"""The demonstration basin keeps to its stated model, and the model is the same every time."""

import numpy as np
import pandas as pd
import pytest
from scipy.stats import theilslopes

from labdata.demo import geology
from labdata.demo.basin import BRACKWATER, CORVANE, HESTWICK, TARROW_1, TARROW_2, WELLS
from labdata.demo.composition import MINERALS, OXIDES, elements


@pytest.fixture(scope="module")
def tarrow() -> pd.DataFrame:
    return geology.measured(geology.rock(TARROW_1), BRACKWATER, geology.generator(1))


def test_the_same_seed_gives_the_same_rock():
    for well in WELLS:
        pd.testing.assert_frame_equal(geology.rock(well), geology.rock(well))


def test_log_reflectance_is_linear_in_depth(tarrow):
    slope, intercept = np.polyfit(tarrow["tvd"], np.log10(tarrow["ro"]), 1)
    assert slope == pytest.approx(geology.RO_SLOPE, rel=1e-6)
    assert intercept == pytest.approx(geology.RO_INTERCEPT, rel=1e-6)


def test_tmax_rises_with_depth_as_the_relation_says(tarrow):
    expected = (tarrow["ro"] + 7.16) / 0.0180
    assert abs((tarrow["tmax"] - expected).median()) < 0.5
    assert (tarrow["tmax"] - expected).std() < 2.5


def test_s2_against_toc_recovers_hydrogen_index_and_retention(tarrow):
    """The Theil-Sen line of the retaining unit meets the TOC axis where 100 r / HI says, its slope is HI / 100."""
    unit = tarrow[tarrow["formation"] == CORVANE.name]
    slope, intercept, _, _ = theilslopes(unit["s2"], unit["toc"])
    hydrogen = CORVANE.hi0 * (1 - geology.transformed(unit["ro"].to_numpy(), CORVANE.kerogen)).mean()
    assert slope == pytest.approx(hydrogen / 100, rel=0.06)
    assert -intercept / slope == pytest.approx(100 * CORVANE.retention / hydrogen, rel=0.25)


def test_hydrogen_index_falls_and_production_index_rises_with_maturity(tarrow):
    unit = tarrow[tarrow["formation"] == HESTWICK.name]
    shallow, deep = unit.iloc[:12], unit.iloc[-12:]
    assert deep["hi"].median() < 0.9 * shallow["hi"].median()
    assert deep["pi"].median() > 1.3 * shallow["pi"].median()


def test_retention_takes_everything_from_lean_rock_and_a_constant_from_rich_rock():
    kept = geology.retained(np.array([0.01, 50.0]), 1.2)
    assert kept == pytest.approx([0.01, 1.2], rel=0.01)


def test_true_vertical_depth_of_the_deviated_well_agrees_with_minimum_curvature():
    """Sections of constant azimuth: the arc of radius 1/k from i1 to i2 is (sin i2 - sin i1)/k deep."""
    stations = np.array(TARROW_2.survey)
    inclination = np.radians(stations[:, 1])
    steps = np.diff(stations[:, 0])
    bend = np.diff(inclination)
    straight = steps * np.cos(inclination[:-1])
    with np.errstate(invalid="ignore", divide="ignore"):
        arcs = np.where(np.abs(bend) > 1e-9, steps * np.diff(np.sin(inclination)) / bend, straight)
    at_td = geology.true_vertical_depth(TARROW_2, np.array([TARROW_2.td]))[0]
    assert at_td == pytest.approx(arcs.sum(), abs=0.1)
    assert at_td < TARROW_2.td


def test_minerals_and_oxides_close_to_a_hundred():
    for name, parts in MINERALS.items():
        assert sum(parts.values()) == pytest.approx(100.0, abs=0.01), name
    table = elements(geology.rock(TARROW_1).set_index("label"), geology.generator(2))
    assert table[list(OXIDES)].sum(axis=1).between(98.0, 102.0).all()
