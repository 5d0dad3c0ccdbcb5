"""The worked examples of core recovery, datums and surveys."""

import pytest

from tests.qc.asking import ask, only, outcomes

FOOT = 0.3048
PLUG = {"label": "P-1", "kind": "plug", "top_m": 2505.0}


def runs(recovered, cut=9.0):
    return [(0, 1, 2500.0, 2500.0 + cut, None, recovered)]


def test_core_recovery():
    finding = only("core_recovery", PLUG, cores=runs(9.4))
    assert (finding.severity, finding.row, finding.computed) == ("warn", None, pytest.approx(104.4, abs=0.05))
    assert only("core_recovery", PLUG, cores=runs(9.6)).severity == "reject-candidate"
    assert outcomes("core_recovery", PLUG, cores=runs(9.05)) == {"pass"}
    assert outcomes("core_recovery", PLUG, cores=runs(None)) == {"cannot_evaluate"}
    assert outcomes("core_recovery", PLUG) == {"not_applicable"}


def test_sample_below_what_was_recovered():
    deep = {**PLUG, "top_m": 2508.0}
    finding = only("core_recovery", deep, cores=runs(6.0))
    assert (finding.row, finding.severity, finding.limit) == (0, "warn", 2506.0)
    assert not ask("core_recovery", {**deep, "depth_kind": "logger"}, cores=runs(6.0)).findings
    assert not ask("core_recovery", {**deep, "top_m": 2506.2}, cores=runs(6.0)).findings


WELL = {"name": "Quill 1", "datum_kind": "KB", "datum_m": 28.5, "ground_m": 20.1}


def reports(offset, count=4):
    return [
        {"label": f"S-{n}", "top_m": 3171.5 + 10 * n + (offset if report == "A" else 0), "report": report, "depth_kind": "driller"}
        for report in ("A", "B") for n in range(count)
    ]  # fmt: skip


def test_datum_mix():
    """KB 28.5 m; report A 3200.0, report B 3171.5 for the same samples."""
    finding = only("datum_missing_or_mixed", *reports(28.5), wells=[WELL])
    assert (finding.computed, finding.severity, finding.rows) == (28.5, "warn", (4, 5, 6, 7))
    assert "mean sea level" in finding.message
    assert "ground level" in only("datum_missing_or_mixed", *reports(-8.4), wells=[WELL]).message


@pytest.mark.parametrize(("offset", "well", "outcome"), [
    (0.0, WELL, {"pass"}), (12.0, WELL, {"pass"}), (0.1, {**WELL, "ground_m": 28.5}, {"pass"}),
    (28.5, {**WELL, "datum_m": None, "ground_m": None}, {"fire", "cannot_evaluate"}),  # missing, hence not compared
])  # fmt: skip
def test_datum_outcomes(offset, well, outcome):
    assert outcomes("datum_missing_or_mixed", *reports(offset), wells=[well]) == outcome


def test_datum_missing():
    record = {"top_m": 2000.0, "depth_kind": "driller"}
    assert only("datum_missing_or_mixed", record).severity == "warn"
    assert only("datum_missing_or_mixed", {"top_m": 2000.0}, wells=[WELL]).severity == "info"
    assert outcomes("datum_missing_or_mixed", record, wells=[WELL]) == {"pass"}
    assert outcomes("datum_missing_or_mixed", {"label": "no depth"}) == {"not_applicable"}


SURVEY = [(0, 3500 * FOOT, 15.0, 20.0), (0, 3600 * FOOT, 25.0, 45.0)]


def both(tvd, md=3600 * FOOT):
    return [{"label": "S-1", "top_m": md}, {"label": "S-1", "top_m": tvd, "depth_kind": "TVD"}]


def test_md_tvd_consistency():
    """drillingformulas.com «Minimum Curvature Method»: 94.01 ft of TVD between the stations."""
    computed = (3500 + 94.01) * FOOT
    finding = only("md_tvd_consistency", *both(3600.0 * FOOT), survey=SURVEY)
    assert finding.computed == pytest.approx(computed, abs=0.005)
    assert finding.severity == "warn"
    assert not ask("md_tvd_consistency", *both(computed), survey=SURVEY).findings
    assert only("md_tvd_consistency", *both(3700 * FOOT), survey=SURVEY).severity == "reject-candidate"


def test_md_tvd_outcomes():
    assert outcomes("md_tvd_consistency", *both(1090.0)) == {"cannot_evaluate"}
    assert outcomes("md_tvd_consistency", both(1090.0)[1], survey=SURVEY) == {"pass", "cannot_evaluate"}
    assert outcomes("md_tvd_consistency", both(1090.0)[0]) == {"not_applicable"}
    assert outcomes("md_tvd_consistency", {"label": "no depth"}) == {"not_applicable"}


def test_survey_stations():
    bend = [(0, 0.0, 0.0, 0.0), (0, 900.0, 0.0, 0.0), (0, 1100.0, 30.0, 0.0)]
    finding = only("md_tvd_consistency", {"top_m": 950.0}, survey=bend)
    assert (finding.severity, finding.computed) == ("info", 200.0)
    twice = [(0, 900.0, 0.0, 0.0), (0, 900.0, 1.0, 0.0)]
    assert only("md_tvd_consistency", {"top_m": 950.0}, survey=twice).severity == "warn"
    straight = [(0, 0.0, 30.0, 0.0), (0, 900.0, 30.2, 0.0)]
    assert outcomes("md_tvd_consistency", {"top_m": 950.0}, survey=straight) == {"pass"}
