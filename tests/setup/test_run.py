"""The closing summary of the test run."""

from tests.setup import run

REPORT = (
    """<testsuites><testsuite name="pytest" errors="1" failures="2" skipped="0" tests="10" time="3"/></testsuites>"""
)


def test_counts_come_from_pytests_own_report(tmp_path):
    (tmp_path / "report.xml").write_text(REPORT)
    assert run.count(tmp_path / "report.xml") == {"passed": 7, "failed": 2, "in error": 1, "skipped": 0}
    assert run.count(tmp_path / "none.xml") == {}


def test_the_first_bad_status_is_the_status(capsys):
    passes = [run.Pass("first", 0, {"passed": 3}, 1), run.Pass("second", 1, {"passed": 2, "failed": 1}, 2)]
    assert run.sum_up(passes, ["redis-server"]) == 1
    said = capsys.readouterr().err
    assert "first: 3 passed in 1 s (exit status 0)" in said
    assert "left out for want of redis-server" in said
    assert said.endswith("NOT passed: exit status 1.\n")
