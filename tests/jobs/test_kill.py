"""SIGKILL at random moments: no job is lost and none is applied twice, on every broker and database."""

import os
import re
import signal
import time

import pytest

from tests.jobs.conftest import prepare
from tests.jobs.fleet import Fleet, kill_at_random
from tests.setup import servers

JOBS, SECONDS = 32, 0.25
QUEUE_BAD_JOBS = """
from labdata.jobs import enqueue
for kind, params in (("die", {}), ("hang", {"seconds": 60, "hangs": 9}), ("probe", {})):
    enqueue(kind, params, project=None, user=None)
"""


def assert_each_applied_once(fleet, count):
    jobs = dict(fleet.rows("SELECT CAST(id AS TEXT), state FROM labdata_job"))
    effects = dict(fleet.rows("SELECT REPLACE(job, '-', ''), COUNT(*) FROM probe_effect GROUP BY 1"))
    ids = {job.replace("-", "") for job in jobs}
    assert (len(jobs), set(jobs.values())) == (count, {"succeeded"}), fleet.log()
    assert (ids - effects.keys(), effects.keys() - ids) == (set(), set()), "lost, or applied without a job"
    assert {job for job, times in effects.items() if times > 1} == set(), "applied twice"


def killed_while_working(fleet):
    """How many attempts ended without a word: their worker was killed."""
    return fleet.rows("SELECT COALESCE(SUM(attempt), 0) - COUNT(*) FROM labdata_job")[0][0]


def kill_workers_while_jobs_run(fleet, *, seed):
    """Two workers, one killed again and again until most of the work is done."""
    count = JOBS
    enqueuer = fleet.python("-m", "tests.jobs.enqueuer", str(count), str(SECONDS))
    workers = [fleet.worker(), fleet.worker()]
    until_begun(fleet)
    kill_at_random(fleet, workers, fleet.worker, seed=seed, kills=4, first=0.3, between=(0.7, 1.8))
    assert enqueuer.wait(60) == 0, fleet.log()
    fleet.settle(90, count)
    assert killed_while_working(fleet) > 0, "no kill met a running job; the test proved nothing"
    assert_each_applied_once(fleet, count)


def until_begun(fleet, seconds=60):
    """Wait until some job has ended well: workers are up."""
    latest = time.monotonic() + seconds
    while not fleet.states()["succeeded"]:
        assert time.monotonic() < latest, fleet.log()
        time.sleep(0.1)


def test_workers_killed_embedded(fleet):
    kill_workers_while_jobs_run(fleet, seed=7)


def test_the_process_that_asks_for_work_killed(fleet):
    fleet.worker()

    def start():
        return fleet.python("-m", "tests.jobs.enqueuer", str(JOBS), "0.02")

    asking = [start()]
    latest = time.monotonic() + 60
    while not fleet.states().total():
        assert time.monotonic() < latest, fleet.log()
        time.sleep(0.05)
    kill_at_random(fleet, asking, start, seed=11, kills=4, first=0.2, between=(1.2, 1.8))
    assert asking[0].wait(60) == 0, fleet.log()
    fleet.settle(90, JOBS)
    assert_each_applied_once(fleet, JOBS)


def test_a_worker_that_wakes_up_too_late_writes_nothing(fleet):
    """Stopped in mid-job until another has done its work, then woken."""
    first = fleet.worker()
    fleet.python("-m", "tests.jobs.enqueuer", "1", "1.5").wait(60)
    wait_for(fleet, "running", 30)
    os.killpg(first.pid, signal.SIGSTOP)
    fleet.worker()
    fleet.settle(60, 1)
    os.killpg(first.pid, signal.SIGCONT)
    time.sleep(2.5)
    assert fleet.rows("SELECT attempt FROM labdata_job") == [(2,)]
    assert_each_applied_once(fleet, 1)


def test_a_lost_broker_file_loses_no_job(fleet):
    fleet.python("-m", "tests.jobs.enqueuer", "10", "0.02").wait(60)
    for part in fleet.home.glob("broker.sqlite3*"):
        part.unlink()
    fleet.manage("shell", "--no-imports", "--command=from labdata.jobs.sweeper import republish_all as r; r()")
    fleet.worker()
    fleet.settle(60, 10)
    assert_each_applied_once(fleet, 10)


def test_poison_and_hanging_jobs_end_with_a_reason(fleet):
    """A job that kills its workers, and one that hangs: the service goes on, and both say what happened."""
    fleet.manage("shell", "--no-imports", f"--command={QUEUE_BAD_JOBS}")
    workers = [fleet.worker(), fleet.worker()]
    latest = time.monotonic() + 60
    while fleet.unsettled():
        assert time.monotonic() < latest, fleet.log()
        workers = [fleet.worker() if worker.poll() is not None else worker for worker in workers]
        time.sleep(0.2)
    told = dict(fleet.rows("SELECT kind, error_message FROM labdata_job"))
    assert re.fullmatch(
        r"Tried 2 times; the last time the worker \(.+:\d+\) died at step «reading sheet 3»\.", told["die"]
    )
    assert re.fullmatch(r"Tried 2 times; the last time no progress for \d s at step «before the hang»\.", told["hang"])
    assert fleet.states() == {"failed": 2, "succeeded": 1}


@pytest.mark.services
def test_workers_killed_on_postgresql_and_redis(tmp_path, postgresql_url, redis_url):
    database = servers.create_database(postgresql_url, f"redis_{os.getpid()}")
    with Fleet(tmp_path, database_url=database, broker_url=redis_url) as fleet:
        kill_workers_while_jobs_run(prepare(fleet), seed=13)


@pytest.mark.services
def test_workers_killed_on_postgresql_and_rabbitmq(tmp_path, postgresql_url, rabbitmq_url):
    database = servers.create_database(postgresql_url, f"rabbitmq_{os.getpid()}")
    with Fleet(tmp_path, database_url=database, broker_url=rabbitmq_url) as fleet:
        kill_workers_while_jobs_run(prepare(fleet), seed=17)


def wait_for(fleet, state, seconds):
    latest = time.monotonic() + seconds
    while not fleet.states()[state]:
        assert time.monotonic() < latest, fleet.log()
        time.sleep(0.05)
