"""True vertical depth follows the arc between survey stations."""

from math import cos, pi, sin

import pytest

from labdata.release.trajectory import tvd_of

RADIUS = 573.0
QUARTER = [[0.0, 0.0, 0.0], [RADIUS * pi / 2, 90.0, 0.0]]  # a quarter circle, from vertical to horizontal


@pytest.mark.parametrize("degrees", [0.0, 10.0, 45.0, 80.0, 90.0])
def test_on_a_circle_tvd_is_radius_times_sine(degrees):
    angle = degrees * pi / 180
    assert tvd_of([RADIUS * angle], QUARTER) == [pytest.approx(RADIUS * sin(angle), abs=1e-9)]


def test_a_slant_hole_is_straight():
    survey = [[0.0, 30.0, 120.0], [1000.0, 30.0, 120.0]]
    assert tvd_of([250.0, 1000.0], survey) == [
        pytest.approx(250 * cos(pi / 6)), pytest.approx(1000 * cos(pi / 6))
    ]  # fmt: skip


def test_above_the_first_station_the_hole_is_vertical():
    assert tvd_of([400.0], [[500.0, 0.0, 0.0], [600.0, 10.0, 0.0]]) == [pytest.approx(400.0)]


def test_nothing_is_said_below_the_last_station_or_without_depth():
    assert tvd_of([None, -1.0, 2000.0], QUARTER) == [None, None, None]


def test_at_a_station_it_is_the_station():
    survey = [[0.0, 0.0, 0.0], [3500.0, 15.0, 20.0], [3600.0, 25.0, 45.0], [3700.0, 25.0, 45.0]]
    before, after = tvd_of([3500.0, 3600.0], survey)
    assert after - before == pytest.approx(94.01, abs=0.01)
