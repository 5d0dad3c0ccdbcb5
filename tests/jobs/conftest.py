import shutil

import pytest
from django.db import connection

from tests.jobs import probes
from tests.jobs.fleet import Fleet


@pytest.fixture
def probe_kinds(settings):
    """The probes as further kinds of job, and a place for what they leave."""
    settings.JOB_KINDS_EXTRA = "tests.jobs.probes.KINDS"
    settings.JOB_LEASE_SECONDS = 1.0
    probes.CALLS.clear()


@pytest.fixture
def probe_table(probe_kinds, db):
    probes.make_table()
    yield
    with connection.cursor() as cursor:
        cursor.execute("DROP TABLE IF EXISTS probe_effect")


@pytest.fixture(scope="session")
def blank_database(tmp_path_factory):
    """A migrated SQLite file with the probes' table, to be copied."""
    home = tmp_path_factory.mktemp("blank")
    with Fleet(home) as fleet:
        prepare(fleet)
        fleet.rows("PRAGMA wal_checkpoint(TRUNCATE)")
    return home / "kerogate.sqlite3"


@pytest.fixture
def fleet(tmp_path, blank_database):
    """An embedded fleet on a home of its own."""
    shutil.copyfile(blank_database, tmp_path / "kerogate.sqlite3")
    with Fleet(tmp_path) as started:
        yield started


def prepare(fleet):
    """Schema and the probes' table."""
    fleet.manage("migrate", "--verbosity=0")
    fleet.manage("shell", "--no-imports", "--command=from tests.jobs.probes import make_table; make_table()")
    return fleet
