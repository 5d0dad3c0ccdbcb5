"""Control statistics against published tables; the source stands beside each, misprints are named."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import stats

from qc.rules.control import outliers
from qc.rules.control.series import cusum, ewma, multirule

# NIST/SEMATECH e-Handbook 1.3.5.17, uranium data of Tietjen & Moore (numbers from memory, recomputed)
URANIUM = np.array([199.31, 199.53, 200.19, 200.82, 201.92, 201.95, 202.18, 245.57])
# rules catalogue, duplicates of TOC
PAIRS = np.array(
    [(2.31, 2.35), (1.10, 1.12), (0.56, 0.55), (3.40, 3.31), (4.02, 4.55), (1.75, 1.78), (2.20, 2.16), (0.98, 1.00)]
)
ROUND = np.array([2.31, 2.35, 2.29, 2.40, 2.33, 2.36, 2.28, 2.34, 2.37, 3.10])


def test_grubbs_of_the_uranium_data():
    g, place = outliers.grubbs(URANIUM)
    assert (g, place) == (pytest.approx(2.4688, abs=5e-5), 7)
    assert outliers.grubbs_critical(8) == pytest.approx(2.032, abs=5e-4)
    assert outliers.grubbs_critical(8, two_sided=True) == pytest.approx(2.127, abs=5e-4)


@pytest.mark.parametrize(("n", "one5", "two5", "one1", "two1"), [
    (3, 1.153, 1.154, 1.155, 1.155), (4, 1.463, 1.481, 1.493, 1.496), (5, 1.671, 1.715, 1.749, 1.764),
    (6, 1.822, 1.887, 1.944, 1.973), (7, 1.938, 2.020, 2.097, 2.139), (8, 2.032, 2.127, 2.221, 2.274),
    (9, 2.110, 2.215, 2.323, 2.387), (10, 2.176, 2.290, 2.410, 2.482), (12, 2.285, 2.412, 2.549, 2.636),
    (15, 2.409, 2.548, 2.705, 2.806), (20, 2.557, 2.708, 2.884, 3.001), (25, 2.663, 2.822, 3.009, 3.135),
    (30, 2.745, 2.908, 3.103, 3.236),
])  # fmt: skip
def test_grubbs_critical_values(n, one5, two5, one1, two1):
    made = [outliers.grubbs_critical(n, alpha, two_sided=two) for alpha in (0.05, 0.01) for two in (False, True)]
    assert made == pytest.approx([one5, two5, one1, two1], abs=6e-4)


@pytest.mark.parametrize(("n", "alpha", "printed", "right"), [
    (8, 0.05, 2.126, 2.126), (10, 0.05, 2.290, 2.290), (14, 0.05, 2.507, 2.507),
    (7, 0.05, 2.202, 2.020), (15, 0.01, 2.755, 2.806),  # misprints of that table: digits exchanged, and a wrong value
])  # fmt: skip
def test_grubbs_table_of_libretexts_appendix_7(n, alpha, printed, right):
    """LibreTexts, Appendix 07: Critical Values for Grubb's Test (two-sided)."""
    made = outliers.grubbs_critical(n, alpha, two_sided=True)
    assert made == pytest.approx(right, abs=1.1e-3)
    if printed != right:
        assert made != pytest.approx(printed, abs=0.02)


@pytest.mark.parametrize(("k", "df", "critical"), [
    (2, 1, 0.9999), (3, 1, 0.9933), (5, 1, 0.9279), (8, 1, 0.7945), (10, 1, 0.7175), (20, 1, 0.4799), (10, 2, 0.5358), (10, 3, 0.4469),
])  # fmt: skip
def test_cochran_table_of_the_university_of_washington(k, df, critical):
    """University of Washington, table of Cochran's C at 1 %."""
    assert outliers.cochran_critical(k, df + 1, 0.01) == pytest.approx(critical, abs=2e-4)


def test_cochran_of_the_pairs():
    c, place = outliers.cochran(PAIRS)
    assert (c, place) == (pytest.approx(0.955, abs=5e-4), 4)
    assert c > outliers.cochran_critical(8, 2, 0.01) == pytest.approx(0.794, abs=1e-3)


def test_relative_difference_and_repeatability():
    assert outliers.relative_difference(4.02, 4.55) == pytest.approx(12.37, abs=0.005)
    assert outliers.relative_difference(2.31, 2.35) == pytest.approx(1.72, abs=0.005)
    s = outliers.repeatability(PAIRS[:4])
    assert (s, 2.8 * s) == (pytest.approx(0.0357, abs=5e-5), pytest.approx(0.100, abs=5e-4))


def test_algorithm_a():
    """Constants 1.483, 1.5 and 1.134: ISO 13528."""
    made = outliers.algorithm_a(ROUND)
    assert made.rounds[0] == pytest.approx((2.345, 0.04449), abs=5e-5)
    assert made.rounds[1] == pytest.approx((2.34417, 0.04939), abs=5e-5)
    assert (made.mean, made.deviation) == (pytest.approx(2.3453, abs=2e-4), pytest.approx(0.0516, abs=2e-4))
    assert (3.10 - made.mean) / made.deviation == pytest.approx(14.6, abs=0.1)
    assert (ROUND.mean(), ROUND.std(ddof=1)) == pytest.approx((2.413, 0.244), abs=6e-4)
    assert np.isnan(outliers.algorithm_a(np.array([1.0, 1.0, 1.0, 1.0, 6.0])).deviation)


@pytest.mark.parametrize(("fraction", "percent"), [(1, 2), (0.01, 4), (1e-4, 8), (1e-6, 16), (1e-8, 32), (1e-9, 45)])
def test_horwitz(fraction, percent):
    """AOAC, HorRat: 100 % 2, 1 % 4, 0.01 % 8, 1 ppm 16, 10 ppb 32, 1 ppb 45."""
    assert outliers.horwitz(fraction) == pytest.approx(percent, abs=0.3)


def test_horrat():
    assert outliers.horwitz(0.0215) == pytest.approx(3.56, abs=0.005)
    assert outliers.horrat(5.0, 0.0215) == pytest.approx(1.40, abs=0.005)
    assert outliers.thompson(1e-8) == 22.0
    assert outliers.thompson(0.138) == pytest.approx(outliers.thompson(0.1381), rel=0.02)


@pytest.mark.parametrize(("z", "runs", "fires"), [
    ([0.4, -0.8, 2.3], None, {"1-2s"}), ([0.2, 3.1], None, {"1-2s", "1-3s"}), ([2.1, 2.4], None, {"1-2s", "2-2s"}),
    ([2.3, -2.2], [1, 1], {"1-2s", "R-4s"}), ([2.3, -2.2], [1, 2], {"1-2s"}), ([1.2, 1.5, 1.1, 1.8], None, {"4-1s"}),
    ([0.3] * 10, None, {"10-x"}), ([0.3] * 9 + [0.0], None, set()), ([-0.5, 1.9, -1.9], None, set()), ([2.0, -2.0], [1, 1], set()),
])  # fmt: skip
def test_multirule(z, runs, fires):
    """Definitions as several pages give them (Westgard Rules and Multirules; Westgard et al. 1981)."""
    assert set(multirule(np.array(z), runs)) == fires


def test_the_other_reading_of_r_4s():
    """[2.5, -1.6] in one run: range 4.1 s, but not one above +2 and one below -2."""
    z = np.array([2.5, -1.6])
    assert "R-4s" not in multirule(z, [1, 1])
    assert "R-4s" in multirule(z, [1, 1], by_range=True)


def test_ewma_of_the_handbook():
    """NIST/SEMATECH e-Handbook 6.3.2.4 (numbers from memory, recomputed); 47.4115 is printed, 47.4116 exact."""
    x = np.array([
        52.0, 47.0, 53.0, 49.3, 50.1, 47.0, 51.0, 50.1, 51.2, 50.5, 49.6, 47.6, 49.9, 51.3, 47.8, 51.2, 52.6, 52.4, 53.6, 52.1,
    ])  # fmt: skip
    averages, half = ewma(x, 50, 2.0539)
    expected = [
        50.60, 49.52, 50.56, 50.18, 50.16, 49.21, 49.75, 49.85, 50.26, 50.33, 50.11, 49.36, 49.52, 50.05, 49.38, 49.92, 50.73,
        51.23, 51.94, 51.99,
    ]  # fmt: skip
    assert averages == pytest.approx(expected, abs=6e-3)
    assert half[:2] == pytest.approx([1.8485, 2.2564], abs=6e-5)
    assert (50 + half[-1], 50 - half[-1]) == (pytest.approx(52.5884, abs=1e-3), pytest.approx(47.4116, abs=1e-3))
    assert not (np.abs(averages - 50) > half).any()


def test_cusum_of_montgomery_and_runger():
    """Montgomery & Runger, Applied Statistics and Probability for Engineers, Table 16-8: T 99, K 1, H 10."""
    x = np.array([
        102.0, 94.8, 98.3, 98.4, 102.0, 98.5, 99.0, 97.7, 100.0, 98.1, 101.3, 98.7, 101.1, 98.4, 97.0, 96.7, 100.3, 101.4, 97.2,
        101.0,
    ])  # fmt: skip
    high, low = cusum(x, 99, 1)
    assert high == pytest.approx([2, 0, 0, 0, 2, 0.5, 0, 0, 0, 0, 1.3, 0, 1.1, 0, 0, 0, 0.3, 1.7, 0, 1], abs=1e-9)
    assert low == pytest.approx([0, 3.2, 2.9, 2.5, 0, 0, 0, 0.3, 0, 0, 0, 0, 0, 0, 1, 2.3, 0, 0, 0.8, 0], abs=1e-9)
    assert max(high.max(), low.max()) < 10


@given(
    st.lists(st.floats(-50, 50).map(lambda x: round(x, 2)), min_size=6, max_size=15, unique=True), st.floats(0.1, 30)
)
@settings(max_examples=30, deadline=None)
def test_units_and_order_do_not_matter(values, factor):
    x = np.array(values)
    assert outliers.grubbs(x * factor)[0] == pytest.approx(outliers.grubbs(x)[0], rel=1e-6)
    assert outliers.grubbs(x[::-1])[0] == pytest.approx(outliers.grubbs(x)[0], rel=1e-6)
    high, low = cusum(x, 0, 0.5)
    mirrored = cusum(-x, 0, 0.5)
    assert np.allclose(high, mirrored[1])
    assert np.allclose(low, mirrored[0])


def test_deviation_agrees_with_scipy():
    """SciPy's scaled median absolute deviation starts algorithm A (constant 1.4826 against the standard's 1.483)."""
    start = outliers.algorithm_a(ROUND).rounds[0][1]
    assert start == pytest.approx(1.483 * stats.median_abs_deviation(ROUND), rel=1e-12)
