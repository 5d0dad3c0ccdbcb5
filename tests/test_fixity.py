"""Facts changed behind the triggers, and a trail cut at its end, are found though every trigger is back in place."""

import pytest
from django.db import connection, transaction

from labdata import audit, fixity, triggers
from labdata.errors import AuditBroken
from labdata.models import AuditEntry
from tests.release.scene import release_of, signed_scene

pytestmark = [pytest.mark.both, pytest.mark.django_db]


@pytest.fixture
def released():
    scene = signed_scene()
    with transaction.atomic():
        for report in scene.project.reports.all():
            kept = {"facts": fixity.facts("results of report", report.pk)}
            audit.record("report.imported", report, actor=None, project=scene.project, after=kept)
    release_of(scene)
    return scene


def behind_the_triggers(*statements: str) -> None:
    triggers.remove(connection)
    with connection.cursor() as cursor:
        for statement in statements:
            cursor.execute(statement)
    triggers.install(connection)
    assert triggers.missing(connection) == []


def test_what_was_recorded_holds(released):
    counts = fixity.verify()
    assert counts["release"] == 1
    assert counts["signature"] >= 1
    assert counts["decisions"] >= 1


@pytest.mark.parametrize(("statement", "named"), [
    ("UPDATE labdata_release SET title = 'another'", r"«release \d+» was altered"),
    ("UPDATE qc_decision SET verdict = 'rejected', reason = 'depth'", r"«decisions .*» was altered"),
    ("UPDATE labdata_result SET value = value + 1", r"«results of report \d+» was altered"),
    ("UPDATE qc_signoff SET signer_name = 'Somebody Else'", r"«signature \d+» was altered"),
])  # fmt: skip
def test_an_altered_fact_is_named(released, statement, named):
    behind_the_triggers(statement)
    with pytest.raises(AuditBroken, match=named):
        fixity.verify()


def test_a_trail_cut_at_its_end_is_found(released):
    last = AuditEntry.objects.filter(action="release.made").get().seq
    behind_the_triggers(f"DELETE FROM labdata_auditentry WHERE seq >= {last}")
    audit.verify()
    with pytest.raises(AuditBroken, match=r"«release \d+» is in the database, and no audit entry speaks of it"):
        fixity.verify()


def test_a_fact_removed_is_named(released):
    behind_the_triggers("DELETE FROM labdata_release_sign_offs", "DELETE FROM labdata_release")
    with pytest.raises(AuditBroken, match=r"«release \d+» is in the audit trail and no longer in the database"):
        fixity.verify()
