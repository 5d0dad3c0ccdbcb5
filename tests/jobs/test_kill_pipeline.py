"""The real jobs under SIGKILL: every file lands whole and once, QC follows once, one release is built."""

import json
import time

from tests.jobs.fleet import kill_at_random, kill_busy_workers
from tests.jobs.real_work import FILES


def step(fleet, name):
    """Start one step as a process of its own."""
    return fleet.python("-m", "tests.jobs.real_work", name)


def done(fleet, name):
    assert step(fleet, name).wait(120) == 0, fleet.log()


def look(fleet):
    done(fleet, "look")
    line = [line for line in (fleet.home / "processes.log").read_text().splitlines() if line.startswith('{"files"')]
    return json.loads(line[-1])


def test_a_project_comes_through_whatever_dies(fleet):
    asking, workers = [step(fleet, "receive_all")], [fleet.worker(), fleet.worker()]
    until_jobs(fleet)
    kill_at_random(fleet, asking, lambda: step(fleet, "receive_all"), seed=3, kills=1, first=0.1, between=(0, 0.1))
    kill_busy_workers(fleet, workers, seed=5, kills=3)
    assert asking[0].wait(120) == 0, fleet.log()
    fleet.settle(120, 2 * FILES)
    done(fleet, "release")
    kill_busy_workers(fleet, workers, seed=9, kills=1)
    fleet.settle(120, 2 * FILES + 1)
    seen = look(fleet)
    assert (len(seen["files"]), seen["reports"]) == (FILES, FILES), seen
    assert seen["landed"] == seen["promised"], seen
    assert (len(seen["qc_jobs"]), seen["qc_runs"]) == (FILES, FILES), seen
    assert seen["jobs"] == [[kind, "succeeded", ""] for kind in ("intake", "qc", "release")]
    assert [number for number, _ in seen["releases"]] == [1]
    assert seen["releases"][0][1] > 0
    assert seen["again"] > 0, "no kill met a running job; the test proved nothing"


def until_jobs(fleet):
    latest = time.monotonic() + 60
    while not fleet.states().total():
        assert time.monotonic() < latest, fleet.log()
        time.sleep(0.05)
