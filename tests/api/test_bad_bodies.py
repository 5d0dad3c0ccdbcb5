"""Bodies and parameters that cannot be right, and what each is told."""

import json

import pytest

from tests.api.conftest import client_for, client_of
from tests.factories import PASSWORD, MembershipFactory
from tests.release.scene import bare_scene, release_of

pytestmark = pytest.mark.django_db
MULTIPART = "multipart/form-data; boundary=x"


@pytest.fixture
def bare(db):
    """A project with its people and nothing measured."""
    return bare_scene()


def told(answer, status=400):
    """The problem document, after looking that it is one."""
    assert answer.status_code == status, answer.content
    assert answer["Content-Type"] == "application/problem+json"
    body = answer.json()
    assert {"type", "title", "status", "detail", "code"} <= body.keys()
    assert body["status"] == status
    return body


def post(client, route, body):
    text = body if isinstance(body, str) else json.dumps(body)
    return client.post(f"/api/v1/{route}", text, content_type="application/json")


DECISIONS = [
    ({}, "decisions", "This field is required."),
    ({"decisions": []}, "decisions", "Ensure this field has at least 1 elements."),
    ({"decisions": {}}, "decisions", 'Expected a list of items but got type "dict".'),
    ({"decisions": ["accept"]}, "decisions[0]", "Invalid data. Expected a dictionary, but got str."),
    ({"decisions": [{"verdict": "accepted"}]}, "decisions[0]", "Name either a result or an analysis."),
    (
        {"decisions": [{"result": 1, "analysis": 2, "verdict": "accepted"}]},
        "decisions[0]",
        "Name either a result or an analysis.",
    ),
    ({"decisions": [{"result": 1, "verdict": "fine"}]}, "decisions[0].verdict", '"fine" is not a valid choice.'),
    ({"decisions": [{"result": "one", "verdict": "accepted"}]}, "decisions[0].result", "A valid integer is required."),
    (
        {"decisions": [{"result": 10**30, "verdict": "accepted"}]},
        "decisions[0].result",
        "Ensure this value is less than or equal to 1000000000000000000.",
    ),
    (
        {"decisions": [{"result": 999999, "verdict": "accepted"}]},
        "decisions[0].result",
        "There is no result 999999 under review.",
    ),
    (
        {"decisions": [{"result": 1, "verdict": "accepted", "value": 3}]},
        "decisions[0].value",
        "This field is not known here; known: result, analysis, verdict, reason, text.",
    ),
    (
        {"decisions": [{"result": 1, "verdict": "rejected", "reason": ["ugly"]}]},
        "decisions[0].reason",
        "Not a valid string.",
    ),
    (
        {"decisions": [{"result": 1, "verdict": "accepted", "text": "a\x00b"}]},
        "decisions[0].text",
        "Null characters are not allowed.",
    ),
    (
        {"expected_version": 3, "decisions": [{"result": 1, "verdict": "accepted"}]},
        "expected_version",
        "A version is of one set: name the review_set too.",
    ),
]


@pytest.mark.parametrize(("body", "field", "message"), DECISIONS)
def test_decisions(bare, body, field, message):
    problem = told(post(client_for(bare, "geochemist"), "decisions", body))
    assert problem["errors"][field] == [message]
    assert problem["code"] == "invalid"


def test_a_rejection_without_a_reason(scene):
    result = scene.sets[0].analyses.first().results.first()
    body = {"decisions": [{"result": result.pk, "verdict": "rejected"}]}
    problem = told(post(client_for(scene, "geochemist"), "decisions", body))
    assert problem["detail"].startswith("A result is not rejected without a reason.")


def test_one_bad_decision_stops_the_batch(scene):
    result = scene.sets[0].analyses.first().results.first()
    body = {"decisions": [{"result": result.pk, "verdict": "accepted"}, {"result": 999999, "verdict": "accepted"}]}
    told(post(client_for(scene, "geochemist"), "decisions", body))
    assert not result.decisions.exists()


def test_a_decision_on_another_set_than_named(scene):
    first, second = scene.sets
    result = second.analyses.first().results.first()
    body = {"review_set": first.pk, "decisions": [{"result": result.pk, "verdict": "accepted"}]}
    problem = told(post(client_for(scene, "geochemist"), "decisions", body))
    assert problem["errors"]["decisions[0].result"] == [
        f"The result {result.pk} is in review set {second.pk}, not {first.pk}."
    ]


def test_a_stale_version(scene):
    held = scene.sets[0]
    result = held.analyses.first().results.first()
    body = {"review_set": held.pk, "expected_version": 77, "decisions": [{"result": result.pk, "verdict": "accepted"}]}
    assert told(post(client_for(scene, "geochemist"), "decisions", body), 409)["code"] == "conflict"


@pytest.mark.parametrize(("text", "message"), [
    ("{", "JSON parse error"),
    ('{"decisions": NaN}', "JSON parse error"),
    ("", "decisions: This field is required."),
    ("[1, 2]", "Invalid data. Expected a dictionary, but got list."),
    ('"text"', "Invalid data. Expected a dictionary, but got str."),
    ("null", "No data provided"),
    ("\xff\xfe", "JSON parse error"),
])  # fmt: skip
def test_what_is_no_object(bare, text, message):
    content = text.encode("latin-1")
    answer = client_for(bare, "geochemist").post("/api/v1/decisions", content, content_type="application/json")
    assert message in told(answer)["detail"]


def test_a_form_where_json_is_wanted(bare):
    answer = client_for(bare, "geochemist").post("/api/v1/decisions", {"a": "b"}, format="multipart")
    assert "Unsupported media type" in told(answer, 415)["detail"]


def test_json_where_a_form_is_wanted(bare):
    answer = post(client_for(bare, "analyst"), "uploads", {"project": bare.project.slug})
    assert "Unsupported media type" in told(answer, 415)["detail"]


def test_a_method_that_is_not_there(bare):
    assert told(client_for(bare, "geochemist").delete("/api/v1/decisions"), 405)["code"] == "method_not_allowed"


def test_a_broken_form(bare):
    answer = client_for(bare, "analyst").post("/api/v1/uploads", b"no parts at all", content_type=MULTIPART)
    assert set(told(answer)["errors"]) == {"file", "project"}


@pytest.mark.parametrize(("change", "field", "message"), [
    ({"file": None}, "file", "No file was submitted."),
    ({"file": "text"}, "file", "The submitted data was not a file. Check the encoding type on the form."),
    ({"project": None}, "project", "This field is required."),
    ({"create_wells": "perhaps"}, "create_wells", "Must be a valid boolean."),
    ({"answers": "{"}, "answers", "Answers are an object of question id and answer text."),
    ({"answers": '["a"]'}, "answers", "Answers are an object of question id and answer text."),
    ({"answers": '{"a": 1}'}, "answers", "Answers are an object of question id and answer text."),
    ({"wells": "Quill 1"}, "wells", "This field is not known here"),
    ({"lab": "x" * 161}, "lab", "Ensure this field has no more than 160 characters."),
])  # fmt: skip
def test_uploads(bare, change, field, message):
    from django.core.files.uploadedfile import SimpleUploadedFile  # noqa: PLC0415

    form = {"project": bare.project.slug, "file": SimpleUploadedFile("a.csv", b"Well,TOC\n"), **change}
    form = {name: value for name, value in form.items() if value is not None}
    answer = client_for(bare, "analyst").post("/api/v1/uploads", form, format="multipart")
    assert told(answer)["errors"][field][0].startswith(message)


@pytest.mark.parametrize(("route", "role", "body", "field", "message"), [
    ("qc-runs", "geochemist", {}, "project", "This field is required."),
    ("qc-runs", "geochemist", {"project": 7.5, "wells": [None]}, "wells[0]", "This field may not be null."),
    ("qc-runs", "geochemist", {"project": "P", "wells": ["Nowhere 9"]}, "wells[0]", "There is no well «Nowhere 9»"),
    ("qc-runs", "geochemist", {"project": "P", "wells": "Quill 1"}, "wells", "Expected a list of items"),
    ("sign-offs", "approver", {}, "review_set", "This field is required."),
    ("sign-offs", "approver", {"review_set": 1, "meaning": "", "password": "x"}, "meaning", "This field may not be blank."),
    ("sign-offs", "approver", {"review_set": True, "meaning": "m", "password": "x"}, "review_set", "A valid integer"),
    ("releases", "approver", {"project": "P"}, "title", "This field is required."),
    ("releases", "approver", {"project": "P", "title": "x" * 201}, "title", "Ensure this field has no more than 200"),
    ("releases", "approver", {"project": "P", "title": ["x"]}, "title", "Not a valid string."),
    ("releases", "approver", {"project": "P", "title": "x", "number": 9}, "number", "This field is not known here"),
])  # fmt: skip
def test_other_posts(bare, route, role, body, field, message):  # noqa: PLR0917
    if body.get("project") == "P":
        body = {**body, "project": bare.project.slug}
    problem = told(post(client_for(bare, role), route, body))
    assert problem["errors"][field][0].startswith(message)
    assert f"{field}: " in problem["detail"]


def test_nothing_is_signed_yet(bare):
    body = {"project": bare.project.slug, "title": "Too early"}
    assert told(post(client_for(bare, "approver"), "releases", body), 409)["code"] == "nothing_signed"


def test_a_set_that_is_not_decided(scene):
    body = {"review_set": scene.sets[0].pk, "password": PASSWORD, "meaning": "reviewed"}
    problem = told(post(client_for(scene, "approver"), "sign-offs", body), 409)
    assert (problem["code"], problem["undecided"], problem["results"]) == ("open_results", 15, 15)


def test_a_wrong_password(scene):
    scene.accept(scene.sets[0])
    body = {"review_set": scene.sets[0].pk, "password": "not it", "meaning": "reviewed"}
    assert told(post(client_for(scene, "approver"), "sign-offs", body), 403)["code"] == "wrong_password"


def test_ones_own_decisions(scene):
    held = scene.sets[0]
    geochemist = scene.person("geochemist")
    MembershipFactory(project=scene.project, user=geochemist, role="approver")
    scene.accept(held)
    body = {"review_set": held.pk, "password": PASSWORD, "meaning": "reviewed"}
    answer = post(client_of(geochemist, scene.project), "sign-offs", body)
    assert told(answer, 403)["code"] == "self_sign_off"


def test_a_project_that_is_not_there_and_one_that_may_not_be_seen_are_told_alike(bare):
    other = bare_scene().project.slug
    client = client_for(bare, "approver")
    for slug in (other, "never-was"):
        problem = told(post(client, "releases", {"project": slug, "title": "x"}), 404)
        assert problem["message"] == f"There is no project «{slug}»."
        assert told(client.get(f"/api/v1/wells?project={slug}"), 404)["message"] == f"There is no project «{slug}»."


@pytest.mark.parametrize(("query", "field", "message"), [
    ("wells?colour=red", "colour", "This parameter is not known here; known: changed_since, cursor, page_size, project, well."),
    ("wells?well=Nowhere 9", "well", "There is no well «Nowhere 9»"),
    ("results?verdict=fine", "verdict", "«fine» is not known; known: accepted, rejected, held, undecided."),
    ("results?state=fine", "state", "«fine» is not known"),
    ("results?method=alchemy", "method", "There is no method «alchemy»; known: "),
    ("results?analyte=GOLD9", "analyte", "There is no analyte «GOLD9»"),
    ("results?top_m__gte=deep", "top_m__gte", "This is no depth; write metres measured depth"),
    ("results?top_m__gte=nan", "top_m__gte", "This is no depth"),
    ("results?base_m__lte=inf", "base_m__lte", "This is no depth"),
    ("results?changed_since=yesterday", "changed_since", "«yesterday» is no time"),
    ("results?changed_since=2026-02-30", "changed_since", "«2026-02-30» is no time"),
    ("results?review_set=1.5", "review_set", "«1.5» is no id."),
    ("results?analysis=99999999999999999999", "analysis", "«99999999999999999999» is no id."),
    ("results?page_size=0", "page_size", "«0» is no number of rows from 1 to 2000."),
    ("results?page_size=many", "page_size", "«many» is no number of rows"),
    ("results?cursor=forged", "cursor", "This is no cursor that a list gave out."),
    ("results?cursor=cD14", "cursor", "This is no cursor that a list gave out."),
    ("results?superseded=maybe", "superseded", "«maybe» is neither true nor false."),
    ("flags?severity=dire", "severity", "«dire» is not known; known: info, warn, reject-candidate."),
    ("uploads?state=lost", "state", "«lost» is not known"),
    ("review-sets?state=shut", "state", "«shut» is not known; known: open, signed."),
    ("releases?state=old", "state", "«old» is not known; known: valid, withdrawn."),
    ("projects?page_size=9999", "page_size", "«9999» is no number of rows"),
    ("wells?well=a%00b", "well", "Null characters are not allowed."),
])  # fmt: skip
def test_parameters(bare, query, field, message):
    problem = told(client_for(bare, "interpreter").get(f"/api/v1/{query}"))
    assert problem["errors"][field][0].startswith(message)


@pytest.mark.parametrize(("query", "status", "message"), [
    ("data?format=pdf", 400, "«pdf» is no format."),
    ("data?shape=tall", 400, "«tall» is no shape."),
    ("data?include=held", 400, "«held» is nothing to include."),
    ("data?fromat=csv", 400, "This parameter is not known here; known: format, include, shape."),
    ("changes", 400, "«» is no release id."),
    ("changes?since=first", 400, "«first» is no release id."),
    ("changes?since=99999", 404, "There is no release 99999."),
])  # fmt: skip
def test_parameters_of_a_release(signed, query, status, message):
    release = release_of(signed)
    problem = told(client_for(signed, "interpreter").get(f"/api/v1/releases/{release.pk}/{query}"), status)
    assert message in problem["detail"]


@pytest.mark.parametrize("path", [
    "nothing", "wells/abc", "wells/99999999999999999999", "jobs/1", "releases/1/data/more", "projects/no such",
])  # fmt: skip
def test_addresses_that_are_not_there(bare, path):
    assert told(client_for(bare, "interpreter").get(f"/api/v1/{path}"), 404)["code"] == "not_found"
