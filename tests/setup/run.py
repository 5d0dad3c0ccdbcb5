"""The whole test run: packages, private servers, pytest on SQLite and again on PostgreSQL, one summary at the end."""

import json
import os
import shutil
import subprocess
import sys
import time
import xml.etree.ElementTree as ET
from collections.abc import Callable
from contextlib import ExitStack
from dataclasses import dataclass
from pathlib import Path
from typing import TextIO

from labdata.env import CHECKOUT
from tests.setup import debian, servers
from tests.setup.services import GIVEN_POSTGRESQL

NOTHING_COLLECTED = 5
Say = Callable[[str], None]


@dataclass
class Pass:
    """One run of pytest: its exit status, how many tests ended how, and the seconds it took."""

    name: str
    status: int
    counts: dict[str, int]
    seconds: float

    def __str__(self) -> str:
        found = ", ".join(f"{count} {word}" for word, count in self.counts.items() if count) or "no tests"
        return f"{self.name}: {found} in {self.seconds:.0f} s (exit status {self.status})"


def run(arguments: list[str], home: Path, *, as_json: bool = False) -> int:
    """Set up, run, sum up. With ``arguments`` pytest runs once with just these. Returns the exit status.

    ``as_json`` keeps stdout for one JSON object; what pytest prints then goes to stderr.
    """
    work = home / f"test-{os.getpid()}"
    work.mkdir(parents=True)
    try:
        lacking = set_up_machine(say)
        passes = _passes(arguments, work, sys.stderr if as_json else None)
    finally:
        shutil.rmtree(work, ignore_errors=True)
    status = sum_up(passes, lacking)
    if as_json:
        told = [{"name": one.name, "exit_status": one.status, "counts": one.counts} for one in passes]
        print(json.dumps({"passes": told, "missing": lacking, "exit_status": status}))
    return status


def say(text: str) -> None:
    print(text, file=sys.stderr, flush=True)


def set_up_machine(tell: Say) -> list[str]:
    """Install what is missing where that is possible. Returns what is still missing."""
    lacking = debian.missing()
    if lacking and debian.may_install():
        debian.install(lacking, tell)
        lacking = debian.missing()
    if lacking:
        tell(f"Not installed: {', '.join(lacking)}. The tests that need them are left out and named at the end.")
    return lacking


def _passes(arguments: list[str], work: Path, output: TextIO | None) -> list[Pass]:
    if arguments:
        return [pytest("the tests asked for", arguments, work, {}, output)]
    with ExitStack() as stack:
        given = {}
        if servers.find_postgresql():
            say("Starting a private PostgreSQL server.")
            given = {GIVEN_POSTGRESQL: stack.enter_context(servers.postgresql())}
        passes = [pytest("everything, on SQLite", [], work, given, output)]
        if given:
            again = {**given, "DATABASE_URL": given[GIVEN_POSTGRESQL]}
            passes.append(pytest("what must hold on both, on PostgreSQL", ["-m", "both"], work, again, output))
    return passes


def pytest(name: str, arguments: list[str], work: Path, environment: dict[str, str], output: TextIO | None) -> Pass:
    """Run pytest once in its own home."""
    home = work / f"home-{len(list(work.iterdir()))}"
    home.mkdir()
    report = home / "report.xml"
    say(f"Running {name}.")
    began = time.monotonic()
    status = subprocess.call(
        [sys.executable, "-m", "pytest", f"--junitxml={report}", "-p", "no:cacheprovider", *arguments],
        cwd=CHECKOUT,
        stdout=output,
        env={**os.environ, "KEROGATE_HOME": str(home), "DJANGO_SETTINGS_MODULE": "labdata.settings", **environment},
    )
    return Pass(name, status, count(report), time.monotonic() - began)


def count(report: Path) -> dict[str, int]:
    """Tests by how they ended, from pytest's own report; empty when there is none."""
    if not report.exists():
        return {}
    suites = ET.parse(report).getroot().iter("testsuite")
    told = dict.fromkeys(("tests", "failures", "errors", "skipped"), 0)
    for suite in suites:
        for word in told:
            told[word] += int(suite.get(word, 0))
    bad = told["failures"] + told["errors"] + told["skipped"]
    return {
        "passed": told["tests"] - bad, "failed": told["failures"], "in error": told["errors"],
        "skipped": told["skipped"],
    }  # fmt: skip


def sum_up(passes: list[Pass], lacking: list[str]) -> int:
    """Print the closing lines. Returns the first exit status of pytest that is not 0."""
    status = next((done.status for done in passes if done.status), 0)
    lines = [str(done) for done in passes]
    if lacking:
        lines.append(f"left out for want of {', '.join(lacking)}: see «left out» above")
    lines.append("Everything passed." if status == 0 else f"NOT passed: exit status {status}.")
    say("\n" + "\n".join(["=" * 30 + " Kerogate tests " + "=" * 30, *lines]))
    return status
