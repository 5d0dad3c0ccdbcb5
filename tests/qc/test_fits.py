"""Robust lines against SciPy, against the worked set, and beyond what fits in memory at once."""

import numpy as np
import pytest
from scipy import stats

from qc.rules import fits
from qc.rules.robust import madn, modified_z
from tests.qc.asking import S2, TOC

X, Y = np.array(TOC), np.array(S2)


def cloud(size, seed=7):
    generator = np.random.default_rng(seed)
    x = np.round(generator.uniform(0.3, 8.0, size), 2)
    return x, np.round(4.1 * x - 0.6 + generator.standard_t(2, size), 2)


@pytest.mark.parametrize("size", [3, 12, 57, 240])
def test_theil_sen_agrees_with_scipy(size):
    x, y = cloud(size)
    ours, theirs = fits.theil_sen(x, y), stats.theilslopes(y, x)
    assert ours.slope == pytest.approx(theirs.slope, rel=1e-12)
    # scipy takes the joint convention, median(y) - m median(x)
    assert fits.joint_intercept(x, y, ours.slope) == pytest.approx(theirs.intercept, rel=1e-9)


@pytest.mark.parametrize("size", [3, 12, 57, 240])
def test_siegel_agrees_with_scipy(size):
    x, y = cloud(size)
    ours, theirs = fits.siegel(x, y), stats.siegelslopes(y, x)
    assert ours.slope == pytest.approx(theirs.slope, rel=1e-12)
    # scipy's hierarchical intercept is median(y - m x), as ours
    assert ours.intercept == pytest.approx(theirs.intercept, rel=1e-9)


@pytest.mark.parametrize(("odd", "limit"), [(400, 2_000), (401, 5_000), (402, 40_000)])
def test_theil_sen_beyond_memory_is_the_same_number(monkeypatch, odd, limit):
    x, y = cloud(odd)
    everything = fits.theil_sen(x, y)
    monkeypatch.setattr(fits, "PAIRS_IN_MEMORY", limit)
    assert fits.theil_sen(x, y) == everything


def test_theil_sen_beyond_memory_survives_a_misleading_sample(monkeypatch):
    """Every second point lies on another line, so that a thinned look sees the wrong slopes."""
    x = np.arange(4000.0)
    y = np.where(np.arange(4000) % 2 == 0, 5 * x, -3 * x)
    monkeypatch.setattr(fits, "PAIRS_IN_MEMORY", 1000)
    subset = slice(0, 700)
    monkeypatch.setattr(fits, "_bracket", lambda x, y: (4.9, 4.95))
    assert fits.theil_sen(x[subset], y[subset]).slope == pytest.approx(stats.theilslopes(y[subset], x[subset]).slope)


def test_points_of_one_x_have_no_slope():
    assert np.isnan(fits.theil_sen(np.ones(5), np.arange(5.0)).slope)


def test_bootstrap_is_seeded_by_the_data():
    first, again = fits.bootstrap(X, Y, 500), fits.bootstrap(X, Y, 500)
    assert first == again
    assert fits.seed(X, Y) != fits.seed(X, Y + 0.01)


def test_bootstrap_of_the_worked_set():
    """Catalogue: 2000 resamples give TOC0 0.18 to 0.24 at 95 %."""
    made = fits.bootstrap(X, Y, 2000)
    assert made.resamples == 2000
    assert made.crossing == pytest.approx((0.18, 0.24), abs=0.015)


def test_bootstrap_of_a_resample_is_theil_sen_of_it():
    drawn = np.array([0, 0, 2, 3, 5, 5, 5, 7, 8, 9, 10, 11])
    slopes, ends = fits.sorted_slopes(X, Y)
    slope, intercept, _ = fits.resampled(X, Y, slopes, ends, drawn[None, :])[0]
    direct = fits.theil_sen(X[drawn], Y[drawn])
    assert (slope, intercept) == pytest.approx((direct.slope, direct.intercept))


def test_many_points_are_resampled_within_the_work_allowed():
    x, y = cloud(2500)
    order = np.lexsort((y, x))
    made = fits.bootstrap(x[order], y[order], 2000)
    assert fits.RESAMPLES_MIN <= made.resamples < 2000
    assert made.slope[0] < 4.1 < made.slope[1]


def test_modified_z_follows_the_definition():
    values = np.array([3.1, 2.9, 3.0, 3.2, 2.8, 9.0])
    median = np.median(values)
    mad = np.median(np.abs(values - median))
    assert modified_z(values) == pytest.approx(0.6745 * (values - median) / mad, rel=1e-4)
    assert np.isnan(modified_z(np.ones(6))).all()  # no scale, no score
    assert madn(np.array([1.0, 1.0, 1.0, 1.0, 6.0])) == pytest.approx(1.2533 * 1.0)
