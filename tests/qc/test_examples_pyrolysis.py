"""The worked examples of the rule catalogue for pyrolysis, each with what must pass beside it."""

import pytest

from qc.rules.index_recalc import suspects
from qc.rules.pyro_carbon_balance import full_cycle_carbon
from qc.rules.records import table_of
from qc.rules.toc_floor_for_indices import relative_uncertainty
from tests.qc.asking import ask, only, outcomes, series


@pytest.mark.parametrize(("record", "outcome"), [
    ({"TOC": "0.87", "S2": "3.47", "HI": "399"}, "pass"),  # 396.00-401.73 allowed
    ({"TOC": "0.87", "S2": "3.47", "HI": "403"}, "fire"),
    ({"S1": "0.12", "S2": "3.47", "PI": "0.03"}, "pass"),  # 0.03203-0.03482 allowed, 0.025-0.035 reported
    ({"S1": "0.12", "S2": "3.47", "PI": "0.04"}, "fire"),
    ({"TOC": "0.2", "S2": "0.4", "HI": "160"}, "pass"),  # 140-300 at one decimal
    ({"S1": "1.00", "S2": "2.00", "GP": "3.00"}, "pass"),
    ({"S1": "0.25", "S2": "6.86", "GP": "6.84"}, "fire"),
    ({"TOC": "1.00", "S1": "0.50", "OSI": "50"}, "pass"),
    ({"S2": "6.00", "S3": "0.50", "S2S3": "12"}, "pass"),
    ({"S2": "6.00", "S3": "0.50", "S2S3": "14"}, "fire"),
    ({"TOC": "0.0", "S2": "0.4", "HI": "160"}, "not_applicable"),  # the divisor is within rounding of zero
    ({"TOC": "1.00", "HI": "160"}, "cannot_evaluate"),  # no S2
    ({"TOC": "1.00", "S2": "<0.05", "HI": "3"}, "cannot_evaluate"),  # anything from 0 to 5
    ({"TOC": "1.00", "S2": "<0.05", "HI": "90"}, "fire"),  # whatever S2 was
    ({"TOC": "1.00", "S2": "2.00"}, "not_applicable"),  # nothing reported to check
])  # fmt: skip
def test_index_recalc(record, outcome):
    assert outcomes("index_recalc", record) == {outcome}


def test_index_recalc_shows_the_allowed_interval():
    finding = only("index_recalc", {"TOC": "0.87", "S2": "3.47", "HI": "410"})
    assert finding.more["allowed"] == pytest.approx([396.00, 401.73], abs=0.01)
    assert finding.more["reported"] == [409.5, 410.5]
    assert finding.severity == "warn"


def test_index_recalc_knows_a_unit_slip_and_swapped_columns():
    slip = only("index_recalc", {"TOC": "1.00", "S2": "4.00", "HI": "40"})
    assert slip.severity == "reject-candidate"
    assert "0.1 times" in slip.message
    swapped = ask("index_recalc", {"TOC": "1.00", "S2": "4.00", "S3": "0.70", "HI": "70", "OI": "400"})
    assert [finding.severity for finding in swapped.findings] == ["reject-candidate"] * 2
    assert "swapped" in swapped.findings[0].message


def test_index_recalc_accepts_the_toc_of_the_separate_carbon_analysis():
    record = {"TOC": "1.00", "S2": "4.00", "HI": "364"}
    assert outcomes("index_recalc", record) == {"fire"}
    assert outcomes("index_recalc", {**record, "TOC_CARBON": "1.10"}) == {"pass"}


def test_index_recalc_takes_decimals_from_the_column_not_the_cell():
    """A spreadsheet shows 0.90 as 0.9: the cell alone would allow 0.85 to 0.95."""
    rows = [
        {"label": "S-1", "TOC": "0.9", "S2": "0.90", "HI": "104"},
        {"label": "S-2", "TOC": "1.25", "S2": "1.25", "HI": "100"},
    ]
    assert only("index_recalc", *rows).row == 0


def test_index_recalc_takes_the_decimals_of_a_coarser_batch():
    """Five values and more of one batch with one decimal were given to one decimal."""
    coarse = [{"label": f"E17-{n}", "TOC": "0.9", "S2": "0.90", "HI": "104"} for n in range(5)]
    assert outcomes("index_recalc", *coarse, {"label": "E18-1", "TOC": "1.25", "S2": "1.25", "HI": "100"}) == {"pass"}


@pytest.mark.parametrize(("failing", "passing", "made"), [
    ({"HI", "OI"}, {"PI"}, ["TOC"]), ({"HI", "PI"}, {"OI"}, ["S2"]), ({"HI"}, {"OI", "PI"}, ["HI"]),
    ({"HI"}, set(), ["HI", "S2", "TOC"]), ({"HI"}, {"OI"}, ["HI", "S2"]), ({"GP", "S2S3"}, {"OI", "OSI"}, ["S2"]),
])  # fmt: skip
def test_the_other_indices_point_to_the_wrong_value(failing, passing, made):
    assert suspects(failing, passing) == made


@pytest.mark.parametrize(("record", "outcome"), [
    ({"TOC": "1.00", "S1": "0.50", "S2": "12.60"}, "fire"),  # PC 1.087, RC -0.087
    ({"TOC": "2.15", "S1": "0.35", "S2": "8.62"}, "pass"),  # PC 0.745, RC 1.405
    ({"TOC": "1.00", "S1": "0.50", "S2": "12.60", "kind": "fluid"}, "not_applicable"),
    ({"TOC": "1.00", "S1": "0.50", "S2": "12.60", "remark": "kerogen isolate"}, "not_applicable"),
    ({"TOC": "1.00", "S1": "0.50", "S2": "12.60", "remark": "extracted rock"}, "fire"),
    ({"S1": "0.50", "S2": "12.60"}, "cannot_evaluate"),
    ({"TOC": "<1.00", "S1": "0.50", "S2": "12.60"}, "fire"),
    ({"TOC": ">0.90", "S1": "0.50", "S2": "12.60"}, "cannot_evaluate"),
])  # fmt: skip
def test_pyro_carbon_balance(record, outcome):
    assert outcomes("pyro_carbon_balance", record) == {outcome}


def test_pyro_carbon_balance_shows_both_conventions():
    finding = only("pyro_carbon_balance", {"TOC": "1.00", "S1": "0.50", "S2": "12.60"})
    assert finding.more["pc_two_peak"] == pytest.approx(1.087, abs=5e-4)
    assert finding.computed == pytest.approx(-0.087, abs=5e-4)
    # Behar, Beaumont & Penteado 2001, OGST 56:111 (from memory), peaks of the catalogue's example
    assert full_cycle_carbon(0.35, 8.62, 0.55, 0.20, 0.10) == pytest.approx(0.770, abs=1e-3)


@pytest.mark.parametrize(("toc", "outcome"), [("2.15", "pass"), ("2.18", "fire")])
def test_toc_sum_check(toc, outcome):
    assert outcomes("toc_sum_check", {"TOC": toc, "PC": "0.77", "RC": "1.38"}) == {outcome}


def test_toc_sum_check_needs_both_parts_and_all_three_values():
    assert outcomes("toc_sum_check", {"TOC": "2.18", "PC": "0.77"}) == {"not_applicable"}
    assert outcomes("toc_sum_check", {"PC": "0.77", "RC": "1.38"}) == {"cannot_evaluate"}


@pytest.mark.parametrize(("s2", "severity"), [("6.4", "reject-candidate"), ("5.2", "warn"), ("4.6", "info")])
def test_hi_ceiling(s2, severity):
    assert only("hi_ceiling", {"TOC": "0.50", "S1": "0.0", "S2": s2}).severity == severity


def test_hi_ceiling_outcomes():
    assert outcomes("hi_ceiling", {"TOC": "0.50", "S1": "0.01", "S2": "4.6", "ALGINITE": "40"}) == {"pass"}
    assert outcomes("hi_ceiling", {"S1": "0.01", "S2": "4.6"}) == {"cannot_evaluate"}
    assert outcomes("hi_ceiling", {"TOC": "0.50", "S1": "0.01", "S2": "6.4", "remark": "bitumen"}) == {"not_applicable"}


@pytest.mark.parametrize(("record", "analyte"), [
    ({"S1": "-0.01"}, "S1"), ({"TOC": "101"}, "TOC"), ({"PI": "1.2"}, "PI"), ({"TMAX": "250"}, "TMAX"),
    ({"TMAX": "651"}, "TMAX"), ({"S1": "600", "S2": "600"}, "S2"), ({"S3": "-1"}, "S3"),
])  # fmt: skip
def test_pyro_value_range(record, analyte):
    finding = only("pyro_value_range", record)
    assert (finding.analyte, finding.severity) == (analyte, "reject-candidate")


def test_pyro_value_range_leaves_what_is_possible():
    assert outcomes("pyro_value_range", {"S1": "0.00", "S2": "0.10", "TMAX": "430", "PI": "0", "TOC": "<0.05"}) == {
        "pass"
    }
    assert outcomes("pyro_value_range", {"RO": "0.6"}) == {"not_applicable"}
    assert "cannot_evaluate" in outcomes("pyro_value_range", {"TOC": ">90"})


def test_pyro_value_range_zero_beside_a_reporting_limit_and_copied_rows():
    limited = ask("pyro_value_range", {"S1": "0", "table": 1}, {"S1": "<0.02", "table": 1})
    assert [(finding.row, finding.severity) for finding in limited.findings] == [(0, "warn")]
    twin = {"S1": "0.31", "S2": "4.18", "S3": "0.77"}
    copied = only("pyro_value_range", {**twin, "TOC": "1.1"}, {**twin, "TOC": "1.4"})
    assert (copied.row, copied.rows, copied.severity) == (1, (0,), "warn")


def test_toc_floor_for_indices():
    lean = only("toc_floor_for_indices", {"TOC": "0.25", "S2": "0.60", "HI": "240"})
    assert (lean.analyte, lean.severity) == ("HI", "warn")
    assert "not for interpretation" in lean.message
    assert outcomes("toc_floor_for_indices", {"TOC": "2.15", "S2": "8.62", "HI": "401"}) == {"pass"}
    assert outcomes("toc_floor_for_indices", {"TOC": "0.25", "S2": "0.60"}) == {"not_applicable"}
    assert outcomes("toc_floor_for_indices", {"S2": "0.60", "HI": "240"}) == {"cannot_evaluate"}
    assert outcomes("toc_floor_for_indices", {"TOC": "<0.2", "S3": "0.60", "OI": "40"}) == {"fire"}


def test_relative_uncertainty_of_hi():
    assert relative_uncertainty(0.30, 0.30, 0.05, 0.03) == pytest.approx(0.194, abs=5e-4)
    assert relative_uncertainty(8.62, 2.15, 0.05 * 8.62, 0.03 * 2.15) == pytest.approx(0.058, abs=5e-4)


@pytest.mark.parametrize(("s2", "outcome", "severity"), [
    ("0.14", "fire", "reject-candidate"), ("0.20", "fire", "warn"), ("0.50", "pass", None), ("<0.5", "fire", "warn"),
    ("<0.2", "fire", "reject-candidate"), ("<0.6", "cannot_evaluate", None), (None, "cannot_evaluate", None),
])  # fmt: skip
def test_s2_floor_for_tmax(s2, outcome, severity):
    answer = ask("s2_floor_for_tmax", {"S2": s2, "TMAX": "358", "TOC": "1.0"})
    assert answer.outcome[0].iloc[0] == outcome
    assert [(finding.analyte, finding.severity) for finding in answer.findings] == (
        [("TMAX", severity)] if severity else []
    )


def test_s2_floor_speaks_of_pi_too_and_never_without_a_tmax():
    pi = only("s2_floor_for_tmax", {"S1": "0.05", "S2": "0.10", "PI": "0.33"})
    assert (pi.analyte, pi.severity) == ("PI", "warn")
    assert outcomes("s2_floor_for_tmax", {"S2": "0.10"}) == {"not_applicable"}


@pytest.mark.parametrize(("record", "severity"), [
    ({"TMAX": "352", "S2": "3.1"}, "reject-candidate"), ({"TMAX": "395", "S2": "3.1"}, "warn"),
    ({"TMAX": "515", "S2": "0.3"}, "warn"), ({"TMAX": "575", "S2": "0.3"}, "reject-candidate"),
])  # fmt: skip
def test_tmax_range(record, severity):
    assert only("tmax_range", record).severity == severity


def test_tmax_range_believes_peat_and_overmature_rock():
    assert outcomes("tmax_range", {"TMAX": "395", "S2": "60", "TOC": "45"}) == {"pass"}
    assert outcomes("tmax_range", {"TMAX": "540", "S2": "0.4", "RO": "2.1"}) == {"pass"}
    overmature = series(8, TMAX="520", S2="0.6")
    assert outcomes("tmax_range", *overmature) == {"pass"}
    assert outcomes("tmax_range", {"S2": "3.1"}) == {"not_applicable"}
    assert outcomes("tmax_range", {"TMAX": ">390", "S2": "3.1"}) == {"cannot_evaluate"}


def test_s3_carbonate_interference():
    finding = only("s3_carbonate_interference", {"S3": "0.90", "TOC": "0.42", "SIDERITE": "4"})
    assert finding.computed == pytest.approx(214, abs=0.5)
    assert finding.severity == "warn"
    assert only("s3_carbonate_interference", {"S3": "0.20", "TOC": "0.42"}).severity == "info"  # lean, and nothing else
    assert outcomes("s3_carbonate_interference", {"S3": "0.50", "TOC": "2.0"}) == {"pass"}
    assert outcomes("s3_carbonate_interference", {"S3": "2.40", "TOC": "2.0"}) == {
        "cannot_evaluate"
    }  # carbonate unknown
    assert outcomes("s3_carbonate_interference", {"S3": "2.40", "TOC": "2.0", "CARB": "5"}) == {"pass"}
    assert outcomes("s3_carbonate_interference", {"S3": "2.40", "TOC": "2.0", "TIC": "4"}) == {"fire"}
    assert outcomes("s3_carbonate_interference", {"S3": "2.40", "TOC": "1.0", "kind": "outcrop"}) == {"not_applicable"}
    assert outcomes("s3_carbonate_interference", {"TOC": "1.0"}) == {"not_applicable"}


def test_tables_read_bare_points_and_refuse_words():
    assert table_of([{"TOC": ".23"}]).rows["TOC"].tolist() == [0.23]
    with pytest.raises(ValueError, match="not a number"):
        table_of([{"TOC": "trace"}])
