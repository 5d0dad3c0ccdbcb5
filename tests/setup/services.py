"""Fixtures of private servers, started by the first test that asks for one; and leaving out what cannot run.

A test that needs a server this machine lacks is left out by name and said so, never counted as skipped.
"""

import os
import shutil

import pytest

from tests.setup import servers

NEEDS = {
    "postgresql_url": ("PostgreSQL", servers.find_postgresql),
    "redis_url": ("Redis", servers.find_redis),
    "rabbitmq_url": ("RabbitMQ", servers.find_rabbitmq),
}
GIVEN_POSTGRESQL = "KEROGATE_TEST_POSTGRESQL"


def find_chromium():
    """Chromium as Debian, or another system, calls it."""
    return next(filter(None, map(shutil.which, ("chromium", "chromium-browser", "google-chrome"))), None)


@pytest.fixture(scope="session")
def postgresql_url():
    """An empty PostgreSQL database."""
    if given := os.environ.get(GIVEN_POSTGRESQL):
        yield servers.create_database(given, f"apart_{os.getpid()}")
    else:
        with servers.postgresql() as url:
            yield url


@pytest.fixture(scope="session")
def redis_url():
    with servers.redis() as url:
        yield url


@pytest.fixture(scope="session")
def rabbitmq_url():
    with servers.rabbitmq() as url:
        yield url


def absent():
    """What this machine lacks: fixture or marker name -> what to install."""
    lacking = {fixture: name for fixture, (name, find) in NEEDS.items() if not find()}
    if not find_chromium():
        lacking["browser"] = "Chromium"
    return lacking


def leave_out(config, items):
    """Deselect the tests whose server or browser this machine lacks, and name what was left out."""
    lacking = absent()
    kept, left = [], []
    for item in items:
        needs = {*getattr(item, "fixturenames", ()), *(mark.name for mark in item.iter_markers())}
        (left if needs & lacking.keys() else kept).append(item)
    if left:
        items[:] = kept
        config.hook.pytest_deselected(items=left)
        config.stash[LEFT_OUT] = (sorted(set(lacking.values())), left)


LEFT_OUT = pytest.StashKey()


def say_left_out(terminal, config):
    """Print which tests did not run for want of a server or browser."""
    if LEFT_OUT in config.stash:
        lacking, left = config.stash[LEFT_OUT]
        terminal.section("left out")
        terminal.write_line(f"Not installed: {', '.join(lacking)}. Left out for that: {len(left)} tests")
        for item in left:
            terminal.write_line(f"  {item.nodeid}")
