"""``bench`` measures in a home of its own and answers with ratios."""

import json
import subprocess
import sys

import pytest
from django.core.management import CommandError, call_command

from labdata.bench import plain, timing, workload
from labdata.env import CHECKOUT
from labdata.management.commands.bench import NAMES


def test_the_workbook_holds_what_the_script_reads():
    frame = plain.numeric(plain.read_excel(workload.workbook(60), "openpyxl"))
    assert len(frame) == 60
    assert list(frame["toc"]) == list(workload.table(60)["toc"])
    assert (frame["s1_qualifier"] == "<").sum() == (workload.table(60)["s1"] < workload.LIMIT).sum()


def test_the_loop_and_the_columns_flag_the_same_rows():
    table = workload.table(400)
    columns = plain.flagged(plain.with_indices(table))
    loop = plain.row_by_row(table.to_dict("records"))
    for check in ("carbon", "lean", "small_s2", "pi_high", "bad_hi"):
        assert columns[check].sum() == sum(fired == check for _, fired in loop), check


def test_a_ratio_is_ours_over_the_baseline():
    measured = timing.Measured("x", "work", "1 row", 3.0, {"plain": 1.5}, 1, {"plain": 2.0})
    assert measured.as_dict()["baselines"]["plain"] == {"seconds": 1.5, "ratio": 2.0, "aim": 2.0}


@pytest.mark.parametrize("words", [["--rows", "0"], ["nothing"]])
def test_wrong_usage_is_status_2(words):
    with pytest.raises(CommandError) as refusal:
        call_command("bench", *words)
    assert words[0] == "nothing" or refusal.value.returncode == 2


def test_every_benchmark_answers_with_ratios(tmp_path):
    small = ["--rows", "120", "--files", "2", "--file-rows", "40", "--runs", "1"]
    done = subprocess.run(
        [sys.executable, "manage.py", "bench", *small, "--json", "--home", str(tmp_path)],
        cwd=CHECKOUT, capture_output=True, text=True, check=False,
    )  # fmt: skip
    assert done.returncode == 0, done.stderr
    answer = json.loads(done.stdout)
    assert [one["name"] for one in answer["benchmarks"]] == list(NAMES)
    for one in answer["benchmarks"]:
        assert all(baseline["ratio"] > 0 for baseline in one["baselines"].values())
    assert not (tmp_path / "kerogate.sqlite3").exists()
