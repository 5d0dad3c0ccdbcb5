"""The worked examples of trends with depth and of shifted Tmax and reflectance."""

import numpy as np
import pytest

from qc.rules.robust import modified_z
from qc.rules.survey import at_depth, path
from tests.qc.asking import ask, only, outcomes, series

DEPTHS = range(1000, 3401, 400)
RO = ("0.38", "0.44", "0.50", "0.58", "0.45", "0.77", "0.89")


def reflectances(values=RO, **more):
    return [
        {"label": f"R-{n}", "method": "reflectance", "top_m": float(z), "RO": ro, **more}
        for n, (z, ro) in enumerate(zip(DEPTHS, values, strict=True))
    ]


def test_ro_depth_trend():
    finding = only("ro_depth_trend", *reflectances())
    fit = finding.more["fit"]
    assert fit["slope"] == pytest.approx(1.5335e-4, abs=5e-9)
    assert fit["intercept"] == pytest.approx(-0.57357, abs=5e-6)
    assert 10 ** fit["intercept"] == pytest.approx(0.267, abs=5e-4)
    assert (finding.row, finding.severity, finding.analyte) == (4, "warn", "RO")
    assert finding.more["residual_log10"] == pytest.approx(-0.172, abs=5e-4)
    assert "0.669 %" in finding.message


def test_ro_depth_trend_preconditions():
    assert outcomes("ro_depth_trend", *reflectances()[:5]) == {"not_applicable"}
    short = [{**record, "top_m": 1000.0 + n} for n, record in enumerate(reflectances())]
    assert outcomes("ro_depth_trend", *short) == {"not_applicable"}
    assert outcomes("ro_depth_trend", {"method": "reflectance", "RO": "<0.4", "top_m": 1000.0}) == {"cannot_evaluate"}
    clean = (*RO[:4], "0.67", *RO[5:])
    assert outcomes("ro_depth_trend", *reflectances(clean)) == {"pass"}
    mature = [f"{float(ro) + 2:.2f}" for ro in RO]
    assert outcomes("ro_depth_trend", *reflectances(mature)) == {"not_applicable"}  # kinetics bend the line


def test_ro_line_as_a_whole():
    falling = only("ro_depth_trend", *reflectances(("0.80", "0.75", "0.70", "0.66", "0.62", "0.58", "0.55")))
    assert (falling.row, falling.severity) == (None, "warn")
    eroded = only("ro_depth_trend", *reflectances(("0.60", "0.66", "0.72", "0.79", "0.86", "0.95", "1.04")))
    assert (eroded.row, eroded.severity) == (None, "info")
    assert eroded.computed == pytest.approx(0.477, abs=0.01)


def tmaxes(scatter=(2, -2, 1, 0, -2, 2, -1, 2, -2, 0, 1), **odd):
    return [
        {"label": f"T-{n}", "top_m": 1000.0 + 320 * n, "TMAX": odd.get(f"at{n}", str(418 + 4 * n + away)), "S2": "3.0", "TOC": "1.5"}
        for n, away in enumerate(scatter)
    ]  # fmt: skip


def test_tmax_depth_trend():
    """Trend 438 at 2600 m, sample 426, MAD 2: -12 degC and z -4.05."""
    assert modified_z(np.array([-12.0, 2.0, -2.0, 2.0, -2.0, 0.0, 0.0, 2.0, -2.0]))[0] == pytest.approx(
        -4.05, abs=0.005
    )
    finding = only("tmax_depth_trend", *tmaxes(at5="426"))
    assert (finding.row, finding.analyte, finding.severity) == (5, "TMAX", "warn")
    assert finding.more["residual"] == pytest.approx(-12, abs=1.5)
    assert outcomes("tmax_depth_trend", *tmaxes()) == {"pass"}
    assert outcomes("tmax_depth_trend", *tmaxes(at5="435")) == {"pass"}
    assert outcomes("tmax_depth_trend", *tmaxes()[:5]) == {"not_applicable"}
    noise = tmaxes(at5="380")
    noise[5]["S2"] = "0.1"
    assert outcomes("tmax_depth_trend", *noise) == {"pass"}
    unknown = [{**record, "S2": None} for record in tmaxes()]
    assert outcomes("tmax_depth_trend", *unknown) == {"cannot_evaluate"}


def test_depth_of_the_trend_is_true_vertical():
    """In a hole at 60 degrees half the measured depth is gained: the slope per metre doubles."""
    flat = [(0, 0.0, 60.0, 0.0), (0, 4000.0, 60.0, 0.0)]
    vertical = only("ro_depth_trend", *reflectances()).more["fit"]
    deviated = only("ro_depth_trend", *reflectances(), survey=flat).more["fit"]
    assert deviated["slope"] == pytest.approx(2 * vertical["slope"], rel=1e-5)
    wells = [{"name": "Quill 1", "datum_m": 130.0, "ground_m": 100.0}]
    assert ask("ro_depth_trend", *reflectances(), wells=wells).findings[0].more["fit"]["z_m"][0] == 970.0


def test_tvd_between_stations_follows_the_arc():
    """A quarter circle of 900 m from vertical: TVD is r sin(s/r), r = 1800/pi."""
    stations = (np.array([0.0, 900.0]), np.array([0.0, 90.0]), np.array([0.0, 0.0]))
    radius = 1800 / np.pi
    wanted = np.array([0.0, 300.0, 450.0, 900.0, 1000.0])
    expected = [*(radius * np.sin(wanted[:4] / radius)), radius]
    assert at_depth(*stations, wanted) == pytest.approx(expected, abs=1e-6)
    assert at_depth(*stations, np.array([900.0]))[0] == pytest.approx(path(*stations)[0][-1])


def shifted(tmax, **more):
    return [*series(9, TMAX="440", S2="4.0", TOC="1.5"), {
        "label": "X", "top_m": 2017.0, "formation": "Ashgrove Shale", "TMAX": tmax, "S2": "4.0", "TOC": "1.5", **more
    }]  # fmt: skip


def test_tmax_shift_suspect():
    finding = only("tmax_shift_suspect", *shifted("422"))
    assert (finding.row, finding.computed) == (9, -18.0)
    assert "heavy bitumen" in finding.more["alternatives"][0]
    assert "weathering" in only("tmax_shift_suspect", *shifted("455")).more["alternatives"][0]
    assert outcomes("tmax_shift_suspect", *shifted("431")) == {"pass"}
    assert outcomes("tmax_shift_suspect", *shifted("422", S2="0.1")) == {"pass"}  # S2 too small: not asked
    assert "cannot_evaluate" in outcomes("tmax_shift_suspect", *shifted("422", S2=None))
    assert outcomes("tmax_shift_suspect", shifted("422")[-1]) == {"not_applicable"}


def test_tmax_shift_against_reflectance_where_neighbours_are_few():
    alone = {"TMAX": "422", "S2": "4.0", "RO": "0.85"}
    assert "reflectance" in only("tmax_shift_suspect", alone).message
    assert outcomes("tmax_shift_suspect", {**alone, "TMAX": "448"}) == {"pass"}


LOW = {"RO": "0.48", "RO_N": "25", "S2": "8.4", "TOC": "2.0", "TMAX": "445"}


def test_vr_low_suspect():
    finding = only("vr_low_suspect", LOW)
    assert finding.more["schemes"]["evenick2021"] == pytest.approx(0.785)
    assert finding.limit == pytest.approx(0.585)
    assert "bitumen misidentified" in finding.more["alternatives"][0]


@pytest.mark.parametrize(("change", "outcome"), [
    ({"RO": "0.60"}, "pass"), ({"RO_N": "19"}, "not_applicable"), ({"S2": "5.0"}, "not_applicable"),
    ({"formation": "Silurian shale"}, "not_applicable"), ({"RO_N": None}, "cannot_evaluate"), ({"RO": None}, "not_applicable"),
    ({"TOC": None}, "cannot_evaluate"),
])  # fmt: skip
def test_vr_low_outcomes(change, outcome):
    assert outcomes("vr_low_suspect", {**LOW, **change}) == {outcome}
