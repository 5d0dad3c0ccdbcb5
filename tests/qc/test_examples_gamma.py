"""The worked examples of core against log and of lag."""

import numpy as np
import pytest

from qc.rules.gamma import match, resample, sliding, smooth
from qc.rules.lag_depth_error import annular_volume, depth_error, interval_means, lag_minutes
from tests.qc.asking import ask, only, outcomes

LOG = np.array([60, 62, 61, 80, 120, 118, 85, 64, 60, 58, 75, 95, 70, 61, 60], dtype=float)
CORE = np.array([61, 79, 121, 117, 86, 63, 61], dtype=float)


def test_worked_correlations():
    made = sliding(CORE, LOG)
    assert made == pytest.approx([-0.245, 0.551, 0.999, 0.559, -0.225, -0.722, -0.758, 0.083, 0.837], abs=6e-4)
    best = match(made, 0.5 * np.arange(9), 1.0)
    assert best.shift == 1.0  # two samples
    assert best.runner_up == pytest.approx(0.837, abs=5e-4)
    assert best.accepted(0.7, 0.1)
    assert not best.accepted(0.7, 0.2)


def test_correlation_is_that_of_numpy():
    stream = np.random.default_rng(5)
    short, long = stream.normal(size=12), stream.normal(size=30)
    expected = [np.corrcoef(short, long[at : at + 12])[0, 1] for at in range(19)]
    assert sliding(short, long) == pytest.approx(expected)
    assert sliding(short * 7 + 3, long) == pytest.approx(expected)
    assert np.isnan(sliding(np.ones(5), long)).all()  # flat gamma
    assert len(sliding(long, short)) == 0


def test_resampling_leaves_gaps():
    depth, values = np.array([0.0, 1.0, 2.0, 6.0]), np.array([0.0, 10.0, 20.0, 60.0])
    made = resample(depth, values, np.array([0.5, 2.0, 4.0, 6.0, 7.0]), gap_max=2.0)
    assert made == pytest.approx([5.0, 20.0, np.nan, 60.0, np.nan], nan_ok=True)
    assert smooth(np.array([0.0, 3.0, 6.0]), 3) == pytest.approx([1.5, 3.0, 4.5])


BEDS_AT = np.arange(2400.0, 2650.0, 0.8)
BEDS_GAMMA = 80 + 25 * np.random.default_rng(7).standard_normal(len(BEDS_AT))


def rock(depth):
    """Gamma of a made-up section of beds of 0.8 m [API]: no two stretches of it are alike."""
    return np.interp(depth, BEDS_AT, BEDS_GAMMA)


def cored(shift, top=2500.0, count=90, gamma=None, number=1):
    depth = top + 0.2 * np.arange(count)
    values = rock(depth + shift) if gamma is None else gamma
    return [
        {"label": f"G{number}-{n}", "kind": "core", "method": "gamma", "top_m": float(z), "GR": f"{one:.1f}"}
        for n, (z, one) in enumerate(zip(depth, np.broadcast_to(values, depth.shape), strict=True))
    ]


DEPTH = np.arange(2450.0, 2600.0, 0.1524)
CURVES = [(0, "GR", "gamma", DEPTH, rock(DEPTH))]
RUNS = [(0, 1, 2500.0, 2518.0, None, 18.0)]


def test_core_log_shift():
    finding = only("core_log_shift", *cored(2.4), cores=RUNS, curves=CURVES)
    assert (finding.severity, finding.row, finding.analyte) == ("info", None, "GR")
    assert finding.computed == pytest.approx(2.4, abs=0.16)
    assert "to be applied by a person" in finding.more["proposal"]


@pytest.mark.parametrize(("records", "around", "outcome"), [
    (cored(0.0), {}, "pass"),
    (cored(2.4), {"cores": [(0, 1, 2500.0, 2518.0, 2.4, 18.0)]}, "pass"),  # the recorded shift fits
    (cored(2.4, count=20), {}, "not_applicable"),  # 3.8 m
    (cored(0.0, gamma=75.0), {}, "not_applicable"),  # flat
    (cored(2.4), {"curves": []}, "cannot_evaluate"),
    (cored(2.4), {"cores": []}, "cannot_evaluate"),
])  # fmt: skip
def test_core_log_outcomes(records, around, outcome):
    assert outcomes("core_log_shift", *records, **{"cores": RUNS, "curves": CURVES, **around}) == {outcome}


def test_neighbouring_runs_that_differ():
    runs = [(0, 1, 2500.0, 2517.9, 2.0, 18.0), (0, 2, 2518.0, 2536.0, -2.0, 18.0)]
    both = [*cored(2.0), *cored(-2.0, top=2518.0, number=2)]
    finding = only("core_log_shift", *both, cores=runs, curves=CURVES)
    assert finding.severity == "warn"
    assert "needs +1.98 m" in finding.message


def test_lag_arithmetic():
    """8.5 in hole, 5 in pipe, 3000 m: 71.8 m3; 2.0 m3/min 35.9 min; 20 m/h 12.0 m."""
    volume = annular_volume(8.5, 5.0, 3000.0)
    assert volume == pytest.approx(71.8, abs=0.05)
    assert lag_minutes(volume, 2.0) == pytest.approx(35.9, abs=0.05)
    assert depth_error(20.0, lag_minutes(volume, 2.0)) == pytest.approx(12.0, abs=0.05)


def beds(depth):
    """Slow changes, that cuttings of 5 m can follow."""
    return 80 + 25 * np.sin(depth / 9.0) + 20 * np.sin(depth / 17.0 + depth**2 / 90_000)


def cuttings(late, count=25):
    """TOC of 5 m samples booked ``late`` metres too deep."""
    tops = 2400.0 + 5 * np.arange(count)
    values = [beds(np.linspace(top - late, top - late + 5, 20)).mean() / 40 for top in tops]
    return [
        {"label": f"C-{n}", "kind": "cuttings", "top_m": float(top), "base_m": float(top) + 5, "TOC": f"{toc:.2f}"}
        for n, (top, toc) in enumerate(zip(tops, values, strict=True))
    ]


LOGGED = np.arange(2300.0, 2700.0, 0.1524)
BEDS = [(0, "GR", "gamma", LOGGED, beds(LOGGED))]


def test_lag_depth_error():
    finding = only("lag_depth_error", *cuttings(12.0), curves=BEDS)
    assert (finding.severity, finding.analyte) == ("warn", "TOC")
    assert finding.computed == pytest.approx(12.0, abs=1.3)


@pytest.mark.parametrize(("records", "curves", "outcome"), [
    (cuttings(0.0), BEDS, "pass"), (cuttings(4.0), BEDS, "pass"),  # less than a sample
    (cuttings(12.0, count=19), BEDS, "not_applicable"), (cuttings(12.0), [], "cannot_evaluate"),
    (cuttings(12.0), [(0, "GR", "gamma", LOGGED, np.full(len(LOGGED), 80.0))], "not_applicable"),
])  # fmt: skip
def test_lag_outcomes(records, curves, outcome):
    assert outcomes("lag_depth_error", *records, curves=curves) == {outcome}


def test_means_of_intervals():
    log = (np.arange(0.0, 10.0), np.arange(0.0, 10.0))
    assert interval_means(log, np.array([0.0, 4.0, 20.0]), np.array([3.0, 5.0, 30.0])) == pytest.approx(
        [1.0, 4.0, np.nan], nan_ok=True
    )


def test_a_curve_without_values_is_no_curve():
    empty = [(0, "GR", "gamma", DEPTH, np.full(len(DEPTH), np.nan))]
    assert not ask("core_log_shift", *cored(2.4), cores=RUNS, curves=empty).findings
