"""``demo --once`` walks every room, its counts are those of a pull, and every fault is caught by its rules."""

import json
import os
import signal
import subprocess
import sys
import time
import urllib.request
from pathlib import Path

import pandas as pd
import pytest

from labdata.demo.faults import FAULTS
from labdata.demo.workbooks import files
from labdata.env import CHECKOUT

PASSWORD = "a long enough phrase"
FORGOTTEN = ("DATABASE_URL", "CELERY_BROKER_URL", "KEROGATE_DEMO_PASSWORD")


def kept_environment() -> dict[str, str]:
    return {name: value for name, value in os.environ.items() if name not in FORGOTTEN}


def manage(home: Path, *words: str, **environment: str) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [sys.executable, "manage.py", *words, "--home", str(home)],
        cwd=CHECKOUT, env={**kept_environment(), **environment}, capture_output=True, text=True, timeout=120, check=False,
    )  # fmt: skip


@pytest.fixture(scope="module")
def home(tmp_path_factory) -> Path:
    return tmp_path_factory.mktemp("demo") / "home"


@pytest.fixture(scope="module")
def once(home) -> dict:
    """The summary of the first run."""
    done = manage(home, "demo", "--once", "--json", KEROGATE_DEMO_PASSWORD=PASSWORD)
    assert done.returncode == 0, done.stderr
    assert done.stdout.count("\n") == 1
    assert PASSWORD not in done.stderr
    return json.loads(done.stdout)


LOOKS = """
import sys
import django
django.setup()
from django.core.management import call_command
release, folder = sys.argv[1:]
for shape in ("long", "wide"):
    call_command("pull", release=int(release), format="parquet", shape=shape, out=f"{folder}/{shape}.parquet")
call_command("audit")
"""


@pytest.fixture(scope="module")
def pulled(home, once) -> dict[str, pd.DataFrame]:
    """The release as ``pull`` gives it, in one process that also verifies the audit trail."""
    place = {"DJANGO_SETTINGS_MODULE": "labdata.settings", "KEROGATE_HOME": str(home)}
    words = [sys.executable, "-c", LOOKS, str(once["release"]["id"]), str(home)]
    subprocess.run(words, cwd=CHECKOUT, env={**kept_environment(), **place}, timeout=120, check=True)
    return {shape: pd.read_parquet(home / f"{shape}.parquet") for shape in ("long", "wide")}


def test_every_file_ends_as_it_should(once):
    outcomes = {file["file"]: file["outcome"] for file in once["files"]}
    for file in files():
        assert outcomes[file.name].startswith(file.outcome), file.name


def test_counts_agree_with_what_a_pull_returns(once, pulled):
    assert len(pulled["long"]) == once["release"]["results"] > 3000
    assert len(pulled["wide"]) == once["release"]["analyses"]
    assert pulled["long"]["well"].nunique() == once["wells"] == 4
    assert set(pulled["long"]["project"]) == {once["project"]}
    assert set(pulled["long"]["verdict"]) == {"accepted"}


def test_everything_is_decided_and_signed_by_someone_else(once, pulled):
    assert once["decisions"]["held"] == 0
    assert once["decisions"]["accepted"] + once["decisions"]["rejected"] == once["results"]
    assert once["decisions"]["rejected"] > 20
    assert once["signed_sets"] >= once["wells"]
    assert set(pulled["long"]["decided_by"]).isdisjoint(set(pulled["long"]["signed_by"]))


@pytest.mark.parametrize("fault", FAULTS, ids=lambda fault: fault.code)
def test_every_fault_is_caught_by_its_rules(fault, once):
    found = next(entry for entry in once["faults"] if entry["fault"] == fault.code)
    assert set(fault.rules) <= set(found["caught_by"])
    assert found["caught"]


def test_the_amended_report_is_what_is_released(once, pulled):
    """Of the report sent twice only the second version's values are current."""
    tarrow = pulled["long"].query("well == 'Tarrow 1' and method == 'pyrolysis'")
    assert set(tarrow["report_version"]) == {2}


def test_contaminated_values_are_not_in_the_release(pulled):
    oily = pulled["long"].query("well == 'Tarrow 1' and top_m >= 2520 and analyte in ['S1', 'PI']")
    assert oily.empty


def test_a_second_run_continues_the_same_home(home, once):
    done = manage(home, "demo", "--once", "--json")
    assert done.returncode == 0, done.stderr
    again = json.loads(done.stdout)
    assert again["release"] == once["release"]
    assert again["results"] == once["results"]
    assert "shown this once" in done.stderr


def test_the_service_answers_and_stops_when_told(home, once, tmp_path):
    """On the home of the first run, so that nothing is left to set up but the service itself."""
    words = [sys.executable, "manage.py", "demo", "--port", "0", "--home", str(home)]
    with (tmp_path / "messages").open("w") as messages:
        service = subprocess.Popen(
            words, cwd=CHECKOUT, env=kept_environment(), stdout=subprocess.PIPE, stderr=messages, text=True
        )
    try:
        line = service.stdout.readline()
        assert line.startswith("Ready: http://127.0.0.1:"), (tmp_path / "messages").read_text()
        with urllib.request.urlopen(line.split()[1] + "healthz", timeout=10) as answer:
            assert answer.status == 200
    finally:
        asked = time.monotonic()
        service.send_signal(signal.SIGTERM)
        service.wait(timeout=20)
    assert time.monotonic() - asked < 5
