"""The worked examples of the depth rules."""

import pytest

from qc.rules.sample_sequence import suggestion
from tests.qc.asking import ask, only, outcomes, series


def test_depth_interval_order():
    finding = only("depth_interval_order", {"top_m": 2510.0, "base_m": 2501.0}, {"top_m": 2501.0, "base_m": 2510.0})
    assert (finding.row, finding.severity) == (0, "reject-candidate")
    assert outcomes("depth_interval_order", {"top_m": 2510.0, "base_m": 2510.0, "kind": "plug"}) == {"pass"}
    assert outcomes("depth_interval_order", {"top_m": 2510.0}) == {"not_applicable"}
    assert outcomes("depth_interval_order", {"label": "no depth"}) == {"cannot_evaluate"}


def test_swapped_columns_are_one_message():
    rows = [{"top_m": 2510.0 + n, "base_m": 2500.0 + n} for n in range(9)]
    assert "swapped" in only("depth_interval_order", *rows).message


def test_cuttings_without_length_among_others_with_one():
    rows = [{"top_m": 2500.0 + 10 * n, "base_m": 2510.0 + 10 * n, "kind": "cuttings"} for n in range(4)]
    point = {"top_m": 2540.0, "base_m": 2540.0, "kind": "cuttings"}
    assert only("depth_interval_order", *rows, point).severity == "warn"
    assert outcomes("depth_interval_order", point, {**point, "top_m": 2550.0, "base_m": 2550.0}) == {"pass"}


def feet_as_metres(table=1, **more):
    return [
        {"label": f"C-{n}", "top_m": 8202.1 + 3.28084 * n, "kind": "core", "table": table, **more} for n in range(4)
    ]


def test_depth_unit_mixup():
    """8202.1 for a core cut at 2500 m: r = 3.28084."""
    metres = [{"label": f"C-{n}", "top_m": 2500.0 + n, "kind": "core", "table": 0} for n in range(4)]
    by_labels = only("depth_unit_mixup", *metres, *feet_as_metres())
    assert by_labels.computed == pytest.approx(3.28084, abs=5e-5)
    assert by_labels.rows == (4, 5, 6, 7)
    assert by_labels.more["examples"][0] == [8202.1, pytest.approx(2500.0, abs=0.01)]
    assert "core runs" in only("depth_unit_mixup", *feet_as_metres(), cores=[(0, 1, 2495.0, 2510.0, None)]).message
    assert (
        "total depth"
        in only("depth_unit_mixup", *feet_as_metres(), wells=[{"name": "Quill 1", "td_m": 3120.0}]).message
    )
    assert outcomes("depth_unit_mixup", *metres, wells=[{"name": "Quill 1", "td_m": 3120.0}]) == {"pass"}
    assert outcomes("depth_unit_mixup", *metres) == {"cannot_evaluate"}
    assert outcomes("depth_unit_mixup", *metres[:2]) == {"not_applicable"}
    one_deep = [*metres, {"label": "C-9", "top_m": 3500.0, "table": 0}]
    assert outcomes("depth_unit_mixup", *one_deep, wells=[{"name": "Quill 1", "td_m": 3120.0}]) == {"pass"}


@pytest.mark.parametrize(("top", "td", "outcome"), [
    (3125.5, 3120.0, "fire"), (3122.0, 3120.0, "pass"), (3125.5, None, "cannot_evaluate"), (None, 3120.0, "cannot_evaluate"),
])  # fmt: skip
def test_depth_beyond_td(top, td, outcome):
    record = {"label": "S-1"} if top is None else {"label": "S-1", "top_m": top}
    assert outcomes("depth_beyond_td", record, wells=[{"name": "Quill 1", "td_m": td}]) == {outcome}


def test_outcrop_has_no_total_depth():
    assert outcomes("depth_beyond_td", {"kind": "outcrop", "top_m": 5.0}) == {"not_applicable"}
    assert outcomes("depth_above_surface", {"kind": "outcrop", "top_m": 5.0}) == {"not_applicable"}


@pytest.mark.parametrize(("well", "top", "outcome"), [
    ({"datum_m": 25.0, "water_m": 310.0}, 290.0, "fire"),  # air gap 25 m and 310 m of water
    ({"datum_m": 25.0, "water_m": 310.0}, 340.0, "pass"),
    ({"datum_m": 220.0, "ground_m": 212.0}, 5.0, "fire"),
    ({"datum_m": 220.0, "ground_m": 212.0}, 8.0, "pass"),
    ({}, 290.0, "cannot_evaluate"),
])  # fmt: skip
def test_depth_above_surface(well, top, outcome):
    assert outcomes("depth_above_surface", {"top_m": top}, wells=[{"name": "Quill 1", **well}]) == {outcome}


def test_outside_core():
    cores = [(0, 2, 2500.0, 2518.0, 1.5)]
    plug = {"kind": "plug", "top_m": 2519.4}
    assert only("outside_core", {**plug, "depth_kind": "driller"}, cores=cores).severity == "warn"
    assert outcomes("outside_core", {**plug, "depth_kind": "logger"}, cores=cores) == {"pass"}  # shifted to the log
    assert outcomes("outside_core", {**plug, "top_m": 2518.3}, cores=cores) == {"pass"}
    assert outcomes("outside_core", plug) == {"cannot_evaluate"}
    assert outcomes("outside_core", {**plug, "kind": "cuttings"}, cores=cores) == {"not_applicable"}


def test_cuttings_interval():
    rows = [{"kind": "cuttings", "top_m": 2400.0 + 10 * n, "base_m": 2410.0 + 10 * n} for n in range(6)]
    overlapping = {"kind": "cuttings", "top_m": 2455.0, "base_m": 2465.0}
    assert "overlaps the interval above by 5.00 m" in only("cuttings_interval", *rows, overlapping).message
    assert outcomes("cuttings_interval", *rows) == {"pass"}
    assert outcomes("cuttings_interval", *rows[:2]) == {"cannot_evaluate"}
    assert outcomes("cuttings_interval", {"kind": "composite", "top_m": 2400.0, "base_m": 2500.0}) == {"not_applicable"}
    long = {"kind": "cuttings", "top_m": 2460.0, "base_m": 2500.0}
    assert "usual 10.00 m" in only("cuttings_interval", *rows, long).message


def test_sample_sequence():
    depths = {"41": 2510.0, "42": 2250.0, "43": 2530.0}
    finding = only(
        "sample_sequence", *({"label": label, "top_m": top, "kind": "cuttings"} for label, top in depths.items())
    )
    assert finding.row == 1
    assert finding.more["suggestion"] == "2520"
    ordered = series(12)
    assert outcomes("sample_sequence", *ordered) == {"pass"}
    assert outcomes("sample_sequence", *ordered[:2]) == {"not_applicable"}
    assert outcomes("sample_sequence", {"label": "top shale", "top_m": 2000.0}) == {"cannot_evaluate"}


def test_sample_sequence_by_another_order_is_said_once():
    depths = (2500.0, 2100.0, 2700.0, 2050.0, 2300.0, 2010.0, 2600.0, 2200.0)
    shuffled = [{"label": f"K-{n}", "top_m": top, "kind": "core"} for n, top in enumerate(depths)]
    finding = only("sample_sequence", *shuffled)
    assert (finding.severity, finding.row) == ("info", None)


@pytest.mark.parametrize(("text", "low", "high", "made"), [
    ("2250", 2510, 2530, "2520"), ("2537", 2350, 2360, "2357"), ("9999", 100, 200, ""),
])  # fmt: skip
def test_digit_slip(text, low, high, made):
    assert suggestion(text, low, high, (low + high) / 2) == made


def test_duplicate_depth():
    first, second = {"label": "A-1", "top_m": 2510.0, "TOC": "2.1"}, {"label": "A-2", "top_m": 2510.0, "TOC": "3.4"}
    finding = only("duplicate_depth", first, second)
    assert (finding.row, finding.severity, finding.analyte, finding.rows) == (1, "warn", "TOC", (0,))
    assert only("duplicate_depth", first, {**second, "TOC": "2.1"}).severity == "info"
    assert outcomes("duplicate_depth", first, {**second, "replicate": 2, "replicate_stated": True}) == {"pass"}
    assert outcomes("duplicate_depth", {"label": "no depth", "TOC": "2.1"}) == {"not_applicable"}
    other_report = {**second, "file": "other.csv"}
    assert not ask("duplicate_depth", first, other_report).findings


def test_one_label_at_two_depths():
    rows = [{"label": f"S-{n}", "top_m": 2000.0 + 10 * n, "TOC": "1.0"} for n in range(12)]
    finding = only("duplicate_depth", *rows, {"label": "S-3", "top_m": 2444.0, "TOC": "1.0"})
    assert (finding.severity, finding.computed) == ("reject-candidate", [2030.0, 2444.0])


def test_strat_top_mismatch():
    tops = [(0, "X Formation", 2500.0, "1"), (0, "W Formation", 2300.0, "1")]
    assert only("strat_top_mismatch", {"top_m": 2480.0, "formation": "X"}, tops=tops).severity == "warn"
    assert outcomes("strat_top_mismatch", {"top_m": 2480.0, "formation": "W Fm."}, tops=tops) == {"pass"}
    assert outcomes("strat_top_mismatch", {"top_m": 2499.0, "formation": "X"}, tops=tops) == {"pass"}  # within 2 m
    assert outcomes("strat_top_mismatch", {"top_m": 2480.0, "formation": "Zed"}, tops=tops) == {
        "cannot_evaluate"
    }  # an alias?
    assert outcomes("strat_top_mismatch", {"top_m": 2480.0, "formation": "X"}) == {"cannot_evaluate"}
    assert outcomes("strat_top_mismatch", {"top_m": 2480.0}, tops=tops) == {"not_applicable"}
    newer = [*tops, (0, "X Formation", 2470.0, "2"), (0, "W Formation", 2300.0, "2")]
    assert outcomes("strat_top_mismatch", {"top_m": 2480.0, "formation": "X"}, tops=newer) == {"pass"}
