"""The audit trail holds: chained, append-only in the database, verifiable."""

import pytest
from django.db import IntegrityError, connection, transaction

from labdata import audit, triggers
from labdata.errors import AuditBroken
from labdata.models import AuditEntry
from tests.factories import ProjectFactory, UserFactory

pytestmark = [pytest.mark.both, pytest.mark.django_db]


def entries(count: int) -> None:
    project, user = ProjectFactory(), UserFactory()
    for number in range(count):
        with transaction.atomic():
            audit.record("project.renamed", project, actor=user, project=project, after={"n": number, "x": 0.1})


def test_a_chain_of_entries_verifies():
    entries(3)
    assert audit.verify()["entries"] == 3


@pytest.mark.parametrize("statement", [
    "UPDATE labdata_auditentry SET reason = 'nothing happened' WHERE seq = 2",
    "DELETE FROM labdata_auditentry WHERE seq = 3",
])  # fmt: skip
def test_the_database_refuses_to_change_an_entry(statement):
    entries(3)
    with pytest.raises(IntegrityError), transaction.atomic(), connection.cursor() as cursor:
        cursor.execute(statement)
    assert audit.verify()["entries"] == 3


def test_the_database_refuses_an_entry_beside_the_chain():
    entries(2)
    stray = AuditEntry.objects.get(seq=1)
    stray.seq, stray.prev_hash, stray.hash = 9, "e" * 64, "f" * 64
    with pytest.raises(IntegrityError), transaction.atomic():
        stray.save(force_insert=True)


def test_an_entry_changed_behind_the_triggers_is_named():
    entries(3)
    triggers.remove(connection)
    AuditEntry.objects.filter(seq=2).update(actor_name="somebody else")
    triggers.install(connection)
    with pytest.raises(AuditBroken, match=r"Entry 2 .* was altered"):
        audit.verify()


def test_no_entry_outside_a_transaction(transactional_db):
    project = ProjectFactory()
    with pytest.raises(RuntimeError):
        audit.record("project.renamed", project, actor=None, project=project)


def test_every_trigger_is_there():
    assert triggers.missing(connection) == []
