"""Posts do what the services do, once."""

import json
from uuid import uuid4

import pytest
from django.core.files.uploadedfile import SimpleUploadedFile

from labdata.models import AuditEntry, IdempotencyRecord, Job, Release, Upload
from labdata.release.services import prepare_release
from qc.models import Decision, SignOff
from tests.api.conftest import client_for, signed_in
from tests.factories import PASSWORD
from tests.release.scene import HandContext, release_of

pytestmark = [pytest.mark.both, pytest.mark.django_db]


def post(client, route, body, **headers):
    return client.post(f"/api/v1/{route}", json.dumps(body), content_type="application/json", **headers)


def key(text=""):
    return {"HTTP_IDEMPOTENCY_KEY": text or str(uuid4())}


def decision(scene, verdict="accepted", **more):
    result = scene.sets[0].analyses.first().results.first()
    return {"decisions": [{"result": result.pk, "verdict": verdict, **more}]}


def test_decisions_on_results_and_analyses_in_one_go(scene):
    first, second = (held.analyses.first() for held in scene.sets)
    wanted = [
        {"analysis": first.pk, "verdict": "accepted"},
        {"result": second.results.first().pk, "verdict": "rejected", "reason": "depth", "text": "10 m off"},
    ]
    answer = post(client_for(scene, "geochemist"), "decisions", {"decisions": wanted})
    assert answer.status_code == 201
    assert [(batch["review_set"], batch["decisions"]) for batch in answer.json()["batches"]] == [
        (scene.sets[0].pk, 4), (scene.sets[1].pk, 1),
    ]  # fmt: skip
    assert Decision.objects.get(review_set=scene.sets[1]).text == "10 m off"


@pytest.mark.parametrize(
    ("said", "code", "text"),
    [("depth", "depth", ""), ("Signal too small", "low_signal", ""), ("doubtful trace", "other", "doubtful trace")],
)
def test_a_reason_may_be_a_code_or_plain_words(scene, said, code, text):
    answer = post(client_for(scene, "geochemist"), "decisions", decision(scene, "rejected", reason=said))
    assert answer.status_code == 201
    made = Decision.objects.get()
    assert (made.reason, made.text) == (code, text)


def test_from_decision_to_withdrawal_over_http(scene):
    geochemist, approver = client_for(scene, "geochemist"), client_for(scene, "approver")
    analyses = geochemist.get("/api/v1/analyses").json()["results"]
    wanted = [{"analysis": row["id"], "verdict": "accepted"} for row in analyses]
    assert post(geochemist, "decisions", {"decisions": wanted}).status_code == 201
    for held in scene.sets:
        signed = post(approver, "sign-offs", {"review_set": held.pk, "password": PASSWORD, "meaning": "reviewed"})
        assert (signed.status_code, signed.json()["state"]) == (201, "in_force")
    asked = post(approver, "releases", {"project": scene.project.slug, "title": "All of it"})
    assert asked.status_code == 202
    assert asked["Location"] == f"/api/v1/jobs/{asked.json()['job']['id']}"
    job = Job.objects.get(pk=asked.json()["job"]["id"])
    made = prepare_release(HandContext(job))()
    told = approver.get(f"/api/v1/releases/{made['release']}").json()
    assert (told["number"], told["state"], told["counts"]["usable"]) == (1, "valid", 30)
    ended = post(approver, f"releases/{made['release']}/withdrawal", {"reason": "Depths were off"})
    assert (ended.status_code, ended.json()["state"]) == (200, "withdrawn")
    assert approver.get(f"/api/v1/releases/{made['release']}/data")["Kerogate-Release-State"] == "withdrawn"


def test_the_same_key_does_it_once(scene):
    client, headers = client_for(scene, "geochemist"), key()
    first, again = (post(client, "decisions", decision(scene), **headers) for _ in range(2))
    assert first.status_code == again.status_code == 201
    assert first.json() == again.json()
    assert again["Idempotent-Replayed"] == "true"
    assert Decision.objects.count() == 1


def test_without_a_key_it_is_done_twice(scene):
    client = client_for(scene, "geochemist")
    for _ in range(2):
        post(client, "decisions", decision(scene))
    assert Decision.objects.count() == 2


def test_the_same_key_for_something_else_is_refused(scene):
    client, headers = client_for(scene, "geochemist"), key()
    post(client, "decisions", decision(scene), **headers)
    other = post(client, "decisions", decision(scene, "held", reason="depth"), **headers)
    assert (other.status_code, other.json()["code"]) == (422, "idempotency_key_reused")
    assert Decision.objects.count() == 1


def test_a_key_is_ones_own(signed):
    headers = key("release-of-today")
    body = {"project": signed.project.slug, "title": "Today"}
    assert post(client_for(signed, "approver"), "releases", body, **headers).status_code == 202
    assert post(client_for(signed, "geochemist"), "releases", body, **headers).status_code == 403


def test_a_refusal_is_not_kept(scene):
    client, headers = client_for(scene, "approver"), key()
    body = {"project": scene.project.slug, "title": "Soon"}
    assert post(client, "releases", body, **headers).status_code == 409
    for held in scene.sets:
        scene.accept(held)
        scene.sign(held)
    assert post(client, "releases", body, **headers).status_code == 202


def test_a_wrong_password_under_a_key_is_on_record_all_the_same(scene):
    scene.accept(scene.sets[0])
    client = client_for(scene, "approver")
    body = {"review_set": scene.sets[0].pk, "password": "wrong", "meaning": "reviewed"}
    before = AuditEntry.objects.count()
    for _ in range(5):
        assert post(client, "sign-offs", body, **key()).status_code == 403
    assert AuditEntry.objects.count() == before + 5
    locked = post(client, "sign-offs", {**body, "password": PASSWORD}, **key())
    assert (locked.status_code, locked.json()["code"]) == (403, "signing_locked")
    assert not SignOff.objects.exists()


def test_no_password_is_kept_with_a_key(scene):
    scene.accept(scene.sets[0])
    body = {"review_set": scene.sets[0].pk, "password": PASSWORD, "meaning": "reviewed"}
    assert post(client_for(scene, "approver"), "sign-offs", body, **key()).status_code == 201
    record = IdempotencyRecord.objects.get()
    assert PASSWORD not in json.dumps(record.body)


@pytest.mark.parametrize("bad", ["x" * 201, "a\tb"])
def test_a_key_that_is_none(scene, bad):
    answer = post(client_for(scene, "geochemist"), "decisions", decision(scene), **key(bad))
    assert answer.json()["errors"] == {"Idempotency-Key": ["A key has 1 to 200 printable characters."]}


def send(client, scene, content=b"Well,Depth (m),TOC (wt%)\nQuill 1,2500,1.5\n", headers=None, **more):
    form = {"project": scene.project.slug, "file": SimpleUploadedFile("late.csv", content), "lab": "Lab", **more}
    return client.post("/api/v1/uploads", form, format="multipart", **(headers or {}))


def test_an_upload_is_answered_with_its_job(scene):
    answer = send(client_for(scene, "analyst"), scene)
    told = answer.json()
    assert answer.status_code == 202
    assert answer["Location"] == f"/api/v1/jobs/{told['job']['id']}"
    assert (told["job"]["kind"], told["job"]["state"], told["upload"]["outcome"]) == ("intake", "queued", "received")
    assert client_for(scene, "analyst").get(answer["Location"]).json()["id"] == told["job"]["id"]


def test_an_upload_under_a_key_is_one_upload(scene):
    client, headers = client_for(scene, "analyst"), key()
    first, again = (send(client, scene, headers=headers) for _ in range(2))
    assert first.json() == again.json()
    assert Upload.objects.count() == 1
    assert send(client, scene, b"other bytes", headers=headers).status_code == 422


def test_a_dry_run_writes_nothing(scene):
    answer = send(client_for(scene, "analyst"), scene, dry_run="true")
    assert (answer.status_code, answer.json()["file"]) == (200, "late.csv")
    assert not Upload.objects.exists()


def test_a_qc_run_is_queued(scene):
    answer = post(client_for(scene, "analyst"), "qc-runs", {"project": scene.project.slug, "wells": ["quill 1"]})
    assert answer.status_code == 202
    job = Job.objects.get(pk=answer.json()["job"]["id"])
    assert (job.kind, job.params["wells"]) == ("qc", [scene.sets[0].well_id])


def test_a_session_with_its_csrf_token_posts_too(scene):
    client = signed_in(scene.person("geochemist"))
    client.get("/api/v1/projects")
    from django.middleware.csrf import _get_new_csrf_string  # noqa: PLC0415

    secret = _get_new_csrf_string()
    client.cookies["csrftoken"] = secret
    answer = post(client, "decisions", decision(scene), HTTP_X_CSRFTOKEN=secret)
    assert answer.status_code == 201


def test_changes_between_two_releases(signed):
    first = release_of(signed)
    well, held = signed.well("Quill 3")
    analysis = signed.analysis(held, (signed.table(), 5), signed.sample(well, 900.0), "carbon", {"TOC": 3.5})
    signed.accept(held)
    signed.sign(held)
    second = release_of(signed, "Second look")
    told = client_for(signed, "interpreter").get(f"/api/v1/releases/{second.pk}/changes?since={first.pk}").json()
    assert [(row["well"], row["analyte"], row["value"]) for row in told["added"]] == [("Quill 3", "TOC", 3.5)]
    assert (told["changed"], told["withdrawn"]) == ([], [])
    back = client_for(signed, "interpreter").get(f"/api/v1/releases/{first.pk}/changes?since={second.pk}").json()
    assert [row["cell"] for row in back["withdrawn"]] == [told["added"][0]["cell"]]
    assert analysis.pk and Release.objects.count() == 2
