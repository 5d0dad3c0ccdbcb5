"""Worker and enqueuer processes on a home of their own, to be killed at random moments."""

import os
import random
import signal
import sqlite3
import subprocess
import sys
import time
from collections import Counter
from contextlib import suppress
from pathlib import Path

import psycopg

from labdata.env import CHECKOUT

BUSY = "SELECT worker FROM labdata_job WHERE state = 'running'"
LEASE_SECONDS, SWEEP_SECONDS = 2, 0.5


class Fleet:
    """Processes that share one database and one broker, seen from outside by plain SQL.

    Use as a context manager: whatever still runs at the end is killed.
    """

    def __init__(self, home: Path, *, database_url="", broker_url="", settings="tests.jobs.settings"):
        self.home = home
        self.database_url = database_url
        self.environment = {
            **{name: value for name, value in os.environ.items() if not name.startswith("PYTEST")},
            "KEROGATE_HOME": str(home), "DATABASE_URL": database_url, "CELERY_BROKER_URL": broker_url,
            "KEROGATE_INSTALLATION": home.name, "KEROGATE_LEASE": str(LEASE_SECONDS),
            "KEROGATE_SWEEP": str(SWEEP_SECONDS), "DJANGO_SETTINGS_MODULE": settings,
        }  # fmt: skip
        self.prefork = bool(broker_url)
        self.started = []

    def __enter__(self):
        return self

    def __exit__(self, *_):
        for process in self.started:
            self.kill(process)

    def manage(self, *words, check=True):
        """Run one command of manage.py to its end."""
        line = [sys.executable, str(CHECKOUT / "manage.py"), *words]
        done = subprocess.run(line, env=self.environment, cwd=CHECKOUT, capture_output=True, text=True, check=False)
        assert not check or done.returncode == 0, done.stderr
        return done

    def python(self, *words):
        """Start a Python process with its own process group and an open standard input."""
        log = (self.home / "processes.log").open("ab")
        process = subprocess.Popen(
            [sys.executable, *words], env=self.environment, cwd=CHECKOUT, stdin=subprocess.PIPE, stdout=log, stderr=log,
            start_new_session=True,
        )  # fmt: skip
        log.close()
        self.started.append(process)
        return process

    def worker(self):
        """Start a worker: solo as the embedded service does, prefork as in production."""
        if not self.prefork:
            return self.python("-m", "labdata.child", "worker", "1")
        name = f"w{len(self.started)}.{os.getpid()}@%h"
        options = ["--pool=prefork", "--concurrency=1", "--hostname", name, "--loglevel=WARNING"]
        return self.python("-m", "celery", "--app=labdata.celery", "worker", *options)

    def kill(self, process):
        """SIGKILL for the whole process group."""
        with suppress(ProcessLookupError):
            os.killpg(process.pid, signal.SIGKILL)
        process.wait()

    def rows(self, query):
        """Rows of a query, asked past all of our own code."""
        if self.database_url:
            with psycopg.connect(self.database_url) as connection:
                return connection.execute(query).fetchall()
        connection = sqlite3.connect(self.home / "kerogate.sqlite3", timeout=30)
        try:
            return connection.execute(query).fetchall()
        finally:
            connection.close()

    def states(self):
        return Counter(state for (state,) in self.rows("SELECT state FROM labdata_job"))

    def unsettled(self):
        return self.states()["queued"] + self.states()["running"]

    def settle(self, seconds, expected):
        """Wait until ``expected`` jobs have ended. Raises AssertionError with all states when they do not."""
        latest = time.monotonic() + seconds
        while self.unsettled() or self.states().total() < expected:
            assert time.monotonic() < latest, f"not settled: {self.states()}\n{self.log()}"
            time.sleep(0.2)

    def log(self):
        return (self.home / "processes.log").read_text(errors="replace")[-4000:]


def kill_at_random(fleet, processes, start, *, seed, kills, first, between):
    """Kill one of ``processes`` ``kills`` times while work is left, starting another at once.

    ``between``: shortest and longest gap in seconds. Returns how many were killed.
    """
    dice = random.Random(seed)
    time.sleep(first)
    done = 0
    while done < kills and fleet.unsettled():
        victim = dice.randrange(len(processes))
        fleet.kill(processes[victim])
        processes[victim] = start()
        done += 1
        time.sleep(dice.uniform(*between))
    return done


def kill_busy_workers(fleet, workers, *, seed, kills, longest=0.3, seconds=60):
    """Kill whichever worker has a job, at a random moment of it, ``kills`` times while work is left.

    For jobs so short that a blind kill seldom meets one. Killed workers are replaced at once.
    """
    dice = random.Random(seed)
    latest = time.monotonic() + seconds
    done = 0
    while done < kills and fleet.unsettled() and time.monotonic() < latest:
        busy = {int(name.rsplit(":", 1)[1]) for (name,) in fleet.rows(BUSY)}
        victims = [place for place, worker in enumerate(workers) if worker.pid in busy]
        if not victims:
            time.sleep(0.01)
            continue
        time.sleep(dice.uniform(0, longest))
        place = dice.choice(victims)
        fleet.kill(workers[place])
        workers[place] = fleet.worker()
        done += 1
    return done
