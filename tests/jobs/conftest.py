import pytest

from tests.jobs import probes


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
    from django.db import connection  # noqa: PLC0415

    with connection.cursor() as cursor:
        cursor.execute("DROP TABLE IF EXISTS probe_effect")
