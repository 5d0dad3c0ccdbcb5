"""What the page may ask for, and how a request that does not hold together is refused."""

import json

import pytest
from django.urls import reverse

from labdata.models import Role
from qc.models import Decision
from qc.review import figures
from qc.review.data import review_data
from qc.review.services import Choice, decide
from qc.review.standing import results_of
from tests.factories import PASSWORD, UserFactory
from tests.qc.review.wells import flag, people, person, small_set

pytestmark = [pytest.mark.django_db, pytest.mark.both]


@pytest.fixture
def desk(client):
    """A set on the desk of its signed-in geochemist."""
    review_set = small_set(samples=2)
    chemist, approver = people(review_set.project)
    client.force_login(chemist)
    return review_set, chemist, approver


def post(client, name, review_set, body):
    address = reverse(f"review_{name}", args=[review_set.project.slug, review_set.pk])
    content = body if isinstance(body, str) else json.dumps(body)
    return client.post(address, content, content_type="application/json")


def good(review_set):
    return {"results": [results_of(review_set).first().pk], "verdict": "accepted", "version": review_set.version}


@pytest.mark.parametrize(("change", "says"), [
    ({"version": None}, "The version looked at is missing"),
    ({"version": "1"}, "The version looked at is missing"),
    ({"version": True}, "The version looked at is missing"),
    ({"results": "all"}, "must be a list of numbers"),
    ({"results": [True]}, "must be a list of numbers"),
    ({"results": []}, "No result was chosen"),
    ({"results": [10**12]}, "not current results"),
    ({"verdict": 7}, "«verdict» must be text"),
    ({"verdict": "fine"}, "is no verdict"),
    ({"verdict": "held"}, "not held without a reason"),
    ({"reason": ["depth"]}, "«reason» must be text"),
])  # fmt: skip
def test_a_body_that_does_not_hold_together_is_refused(desk, client, change, says):
    review_set, *_ = desk
    answer = post(client, "decide", review_set, {**good(review_set), **change})
    assert answer.status_code == 400
    assert says in answer.json()["error"]["message"]
    assert not Decision.objects.exists()


@pytest.mark.parametrize(("name", "body", "says"), [
    ("decide", "no JSON", "is not JSON"),
    ("decide", "[1]", "is not a JSON object"),
    ("undo", {"batch": "last"}, "is no UUID"),
    ("answer", {"flags": ["tmax_range"], "answer": "agreed", "answer_reason": "yes", "version": 1}, "pairs of rule"),
    ("answer", {"flags": [], "answer": "agreed", "answer_reason": "yes", "version": 1}, "No flag was chosen"),
])  # fmt: skip
def test_other_requests_that_make_no_sense(desk, client, name, body, says):
    review_set, *_ = desk
    answer = post(client, name, review_set, body)
    assert (answer.status_code, says in answer.json()["error"]["message"]) == (400, True)


def test_a_stranger_finds_nothing_and_nobody_gets_in_unsigned(desk, client):
    review_set, *_ = desk
    names = ("review", "review_data", "review_plain")
    addresses = [reverse(name, args=[review_set.project.slug, review_set.pk]) for name in names]
    client.force_login(UserFactory())
    assert [client.get(address).status_code for address in addresses] == [404, 404, 404]
    assert post(client, "decide", review_set, good(review_set)).status_code == 404
    client.logout()
    assert [client.get(address).status_code for address in addresses] == [302, 302, 302]
    assert post(client, "decide", review_set, good(review_set)).status_code == 302


def test_a_set_of_another_project_is_not_there(desk, client):
    review_set, *_ = desk
    other = small_set(samples=1)
    assert client.get(reverse("review_data", args=[review_set.project.slug, other.pk])).status_code == 404


def test_a_change_needs_a_post(desk, client):
    review_set, *_ = desk
    assert client.get(reverse("review_decide", args=[review_set.project.slug, review_set.pk])).status_code == 405


def test_signing_and_re_opening_by_the_page(desk, client):
    review_set, chemist, approver = desk
    decide(user=chemist, review_set=review_set, choices=[Choice(r.pk, "accepted") for r in results_of(review_set)])
    review_set.refresh_from_db()
    client.force_login(approver)
    body = {"password": PASSWORD, "meaning": "reviewed", "version": review_set.version}
    assert post(client, "sign", review_set, {**body, "version": 1}).status_code == 409
    assert post(client, "sign", review_set, body).status_code == 200
    signature = review_data(review_set, approver)["signature"]
    assert signature["holds"] and signature["by"]
    assert post(client, "reopen", review_set, {"reason": ""}).status_code == 400
    assert post(client, "reopen", review_set, {"reason": "late duplicate"}).status_code == 200


def test_the_data_are_columns_over_rows_by_depth(desk):
    review_set, chemist, _ = desk
    tmax = results_of(review_set).get(analyte__code="TMAX", analysis__sample__label="A-2")
    flag(tmax)
    data = review_data(review_set, chemist)
    assert data["rows"]["label"] == ["A-1", "A-2"]
    by_key = {column["key"]: column for column in data["columns"]}
    assert list(by_key) == ["TOC", "S1", "S2", "TMAX", "HI", "PI"]
    assert by_key["TMAX"]["value"] == [431.0, 432.0]
    assert by_key["TMAX"]["flag"] == [0, data["severities"].index("warn")]
    assert data["flags"][0]["row"] == 1
    assert data["counts"] == {"results": 8, "accepted": 0, "rejected": 0, "held": 0, "undecided": 8}


def test_computed_indices_are_said_to_be_and_go_with_a_rejected_input(desk):
    review_set, chemist, _ = desk
    toc = results_of(review_set).get(analyte__code="TOC", analysis__sample__label="A-1")
    decide(user=chemist, review_set=review_set, choices=[Choice(toc.pk, "rejected", "measurement")])
    hi = next(column for column in review_data(review_set, chemist)["columns"] if column["key"] == "HI")
    assert hi["computed"] and hi["result"] == [None, None]
    assert hi["value"] == [None, pytest.approx(100 * 5 / 1.2, rel=1e-5)]


def test_the_same_version_is_answered_shortly(desk, client):
    review_set, *_ = desk
    address = reverse("review_data", args=[review_set.project.slug, review_set.pk])
    assert client.get(f"{address}?version={review_set.version}").json() == {"unchanged": True, "version": 1}
    assert "columns" in client.get(f"{address}?version=0").json()


def test_every_state_has_a_marker_colour_and_sign_of_its_own():
    markers = figures.MARKERS.values()
    for field in ("shape", "colour", "label", "sign"):
        assert len({getattr(marker, field) for marker in markers}) == len(figures.STATES)
    assert set(figures.MARKERS) == set(figures.STATES)


@pytest.mark.parametrize("role", list(Role))
def test_every_member_may_look(client, role):
    review_set = small_set(samples=1)
    client.force_login(person(review_set.project, role))
    for name in ("review", "review_data", "review_plain"):
        assert client.get(reverse(name, args=[review_set.project.slug, review_set.pk])).status_code == 200
    assert client.get(reverse("review_sets", args=[review_set.project.slug])).status_code == 200
