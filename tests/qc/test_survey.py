"""Minimum curvature against published figures."""

import numpy as np
import pytest

from qc.rules.survey import dogleg, path, ratio_factor


def test_published_example():
    """drillingformulas.com «Minimum Curvature Method»: 3500 ft I15 A20 to 3600 ft I25 A45."""
    tvd, north, east = path(np.array([3500.0, 3600.0]), np.array([15.0, 25.0]), np.array([20.0, 45.0]))
    assert (north[1], east[1], tvd[1]) == pytest.approx((27.22, 19.45, 94.01), abs=0.005)
    beta = dogleg(*(np.radians(angle) for angle in (15.0, 20.0, 25.0, 45.0)))
    assert beta == pytest.approx(0.22605, abs=5e-6)
    assert np.degrees(beta) == pytest.approx(12.95, abs=0.005)
    assert ratio_factor(beta) == pytest.approx(1.00428, abs=5e-6)  # the page prints 1.00408


def test_quarter_circle():
    """Geometry: 900 ft from vertical to horizontal reach 900 * 2/pi both ways."""
    tvd, north, _ = path(np.array([0.0, 900.0]), np.array([0.0, 90.0]), np.array([0.0, 0.0]))
    assert (tvd[1], north[1]) == pytest.approx((572.958, 572.958), abs=5e-4)


def test_a_straight_hole_and_a_nearly_straight_one():
    tvd, _, _ = path(np.array([0.0, 1000.0]), np.array([60.0, 60.0]), np.array([10.0, 10.0]))
    assert tvd[1] == pytest.approx(500.0)
    assert ratio_factor(np.array(1e-9)) == pytest.approx(1.0)
    assert ratio_factor(np.array(1.0001e-4)) == pytest.approx(float(ratio_factor(np.array(0.9999e-4))), rel=1e-12)
