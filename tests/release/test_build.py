"""A release holds what was signed, cannot be altered, and can be built again."""

import json

import pytest
from django.core.files.storage import default_storage
from django.db import IntegrityError, connection, transaction

from labdata.errors import Conflict, InvalidInput, NotAllowed, NotFound, NothingSigned
from labdata.models import AuditEntry, Release, Result, Role, SurveyStation, Well
from labdata.release import manifest as manifests
from labdata.release import parquet
from labdata.release.services import build_release, rebuild, withdraw
from qc.models import Flag, QcRun, QcRunWell, RuleSet, Severity
from qc.review.services import Choice, decide, reopen
from tests.factories import UserFactory
from tests.release.scene import signed_scene, small_scene

pytestmark = pytest.mark.django_db(transaction=True)


@pytest.fixture
def scene():
    return signed_scene()


@pytest.fixture
def release(scene):
    return build_release(project=scene.project, user=scene.person("approver"), title="First look")


def stored(release):
    return parquet.load(release.stored_as, release.data_sha256).to_pylist()


def test_a_release_holds_every_signed_result_with_its_verdict(scene, release):
    rows = stored(release)
    assert len(rows) == Result.objects.count() == release.result_count == 30
    assert release.analysis_count == 12
    assert [row["verdict"] for row in rows].count("rejected") == 1
    assert {row["decided_by"] for row in rows} == {scene.person("geochemist").username}
    assert {row["signed_by"] for row in rows} == {scene.person("approver").username}


def test_numbers_follow_each_other_in_a_project(scene, release):
    again = build_release(project=scene.project, user=scene.person("approver"), title="Second look")
    other = signed_scene()
    theirs = build_release(project=other.project, user=other.person("approver"), title="Theirs")
    assert [release.number, again.number, theirs.number] == [1, 2, 1]


def test_the_same_data_gives_the_same_bytes(scene, release):
    again = build_release(project=scene.project, user=scene.person("approver"), title="Second look")
    assert again.data_sha256 == release.data_sha256
    assert again.manifest_sha256 != release.manifest_sha256


def test_an_index_goes_with_its_input_and_the_manifest_says_so(release):
    lost = release.manifest["unavailable"]
    assert [(row["well"], row["sample"], row["analyte"], row["lost_inputs"]) for row in lost] == [
        ("Quill 1", "S-0", "HI", "S2")
    ]
    assert release.manifest["counts"] == {
        "wells": 2, "analyses": 12, "results": 30, "accepted": 29, "rejected": 1, "unavailable": 1, "usable": 28,
        "qualified": 2,
    }  # fmt: skip


def test_the_manifest_names_files_signatures_and_checksums(scene, release):
    manifest = release.manifest
    assert [row["sha256"] for row in manifest["inputs"]] == sorted({row["file_sha256"] for row in stored(release)})
    assert [row["sign_off"] for row in manifest["signatures"]] == [s.pk for s in release.sign_offs.order_by("pk")]
    assert manifest["data"]["sha256"] == release.data_sha256
    assert manifests.sha256_of(json.loads(json.dumps(manifest))) == release.manifest_sha256


def test_making_and_withdrawing_are_on_record(scene, release):
    withdraw(release=release, user=scene.person("approver"), reason="Wrong formation names")
    actions = AuditEntry.objects.filter(object_type="release").order_by("seq").values_list("action", "reason")
    assert list(actions) == [("release.made", ""), ("release.withdrawn", "Wrong formation names")]


def test_a_release_is_built_again_after_everything_changed(scene, release):
    first = scene.sets[0]
    reopen(user=scene.person("approver"), review_set=first, reason="Look again")
    first.refresh_from_db()
    changed = Result.objects.filter(analysis__review_item__review_set=first, analyte__code="TMAX").first()
    decide(user=scene.person("geochemist"), review_set=first, choices=[Choice(changed.pk, "rejected", "low_signal")])
    Well.objects.filter(pk=first.well_id).update(name="Renamed 7")
    SurveyStation.objects.create(well=first.well, md_m=0, inclination_deg=0, azimuth_deg=0)
    SurveyStation.objects.create(well=first.well, md_m=3000, inclination_deg=30, azimuth_deg=0)
    Result.objects.filter(pk=changed.pk).update(current=False)
    rules, _ = RuleSet.objects.get_or_create(name="standard", version=1, project=None, defaults={"thresholds": {}})
    run = QcRun.objects.create(project=scene.project, rule_set=rules)
    QcRunWell.objects.create(run=run, well=first.well)
    Flag.objects.create(
        run=run, well=first.well, analysis=changed.analysis, result=changed, rule="late", family="validity",
        severity=Severity.WARN, message="late", source="made up", fingerprint="f",
    )  # fmt: skip
    assert rebuild(release) == release.data_sha256


@pytest.mark.parametrize("statement", [
    "UPDATE labdata_release SET title = 'Better' WHERE id = %s",
    "UPDATE labdata_release SET data_sha256 = 'x' WHERE id = %s",
    "DELETE FROM labdata_release WHERE id = %s",
])  # fmt: skip
def test_the_database_refuses_to_alter_a_release(release, statement):
    with pytest.raises(IntegrityError), transaction.atomic(), connection.cursor() as cursor:
        cursor.execute(statement, [release.pk])
    assert Release.objects.get().title == "First look"


def test_withdrawal_needs_a_reason_and_happens_once(scene, release):
    approver = scene.person("approver")
    with pytest.raises(InvalidInput, match="The reason is blank"):
        withdraw(release=release, user=approver, reason="  ")
    withdraw(release=release, user=approver, reason="Superseded")
    with pytest.raises(Conflict, match="was withdrawn already"):
        withdraw(release=release, user=approver, reason="Again")
    assert stored(release)


def test_nothing_signed_nothing_released():
    scene = small_scene()
    with pytest.raises(NothingSigned, match="No review set of project"):
        build_release(project=scene.project, user=scene.person("approver"), title="Too early")


@pytest.mark.parametrize("role", [role.value for role in Role if role != Role.APPROVER])
def test_only_approvers_release(scene, role):
    with pytest.raises(NotAllowed, match="Roles that may: approver"):
        build_release(project=scene.project, user=scene.person(role), title="Mine")


def test_a_stranger_finds_no_project(scene):
    with pytest.raises(NotFound):
        build_release(project=scene.project, user=UserFactory(), title="Mine")


def test_a_broken_seal_stops_the_release(scene):
    Well.objects.filter(pk=scene.sets[0].well_id).update(name="Slipped in 9")
    with pytest.raises(Conflict, match=r"is not what .* signed"):
        build_release(project=scene.project, user=scene.person("approver"), title="Not so")
    assert not Release.objects.exists()


def test_a_damaged_file_is_told(release):
    with default_storage.open(release.stored_as, "wb") as stream:
        stream.write(b"something else")
    with pytest.raises(parquet.Damaged, match="was altered"):
        parquet.load(release.stored_as, release.data_sha256)
