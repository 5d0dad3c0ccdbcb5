"""Every route, as every role, as a member of another project and as nobody. A new route must be entered here."""

import pytest
from django.urls import URLPattern
from rest_framework.test import APIClient

from labdata.api.urls import urlpatterns
from labdata.models import Role
from labdata.tokens import issue_token
from tests.api.conftest import client_of, signed_in
from tests.api.things import one_of_everything
from tests.factories import MembershipFactory, UserFactory
from tests.release.scene import bare_scene, release_of, signed_scene

EVERYONE = {role.value for role in Role}
AUDITORS = {"geochemist", "approver", "administrator"}
# name of the route -> method -> who may. "public" needs no login.
TABLE = {
    "api-schema": {"get": "public"},
    "api-projects": {"get": EVERYONE}, "api-projects-one": {"get": EVERYONE},
    "api-wells": {"get": EVERYONE}, "api-wells-one": {"get": EVERYONE},
    "api-samples": {"get": EVERYONE}, "api-samples-one": {"get": EVERYONE},
    "api-analyses": {"get": EVERYONE}, "api-analyses-one": {"get": EVERYONE},
    "api-results": {"get": EVERYONE}, "api-results-one": {"get": EVERYONE},
    "api-flags": {"get": EVERYONE}, "api-flags-one": {"get": EVERYONE},
    "api-uploads": {"get": EVERYONE, "post": {"coordinator", "analyst"}}, "api-uploads-one": {"get": EVERYONE},
    "api-upload-answers": {"post": {"coordinator", "analyst"}},
    "api-jobs-one": {"get": EVERYONE},
    "api-rule-sets": {"get": EVERYONE}, "api-rule-sets-one": {"get": EVERYONE},
    "api-qc-runs": {"get": EVERYONE, "post": {"coordinator", "analyst", "geochemist"}},
    "api-qc-runs-one": {"get": EVERYONE},
    "api-decisions": {"get": EVERYONE, "post": {"geochemist"}}, "api-decisions-one": {"get": EVERYONE},
    "api-review-sets": {"get": EVERYONE}, "api-review-sets-one": {"get": EVERYONE},
    "api-sign-offs": {"get": EVERYONE, "post": {"approver"}}, "api-sign-offs-one": {"get": EVERYONE},
    "api-releases": {"get": EVERYONE, "post": {"approver"}}, "api-releases-one": {"get": EVERYONE},
    "api-release-manifest": {"get": EVERYONE}, "api-release-data": {"get": EVERYONE},
    "api-release-changes": {"get": EVERYONE}, "api-release-withdrawal": {"post": {"approver"}},
    "api-audit": {"get": AUDITORS},
    "api-other": {},
}  # fmt: skip


@pytest.fixture
def world(db):
    """A signed and released project with one of everything, and the addresses into it."""
    scene = signed_scene()
    return scene, one_of_everything(scene, release_of(scene))


def routes():
    return [pattern.name for pattern in urlpatterns if isinstance(pattern, URLPattern)]


def test_every_route_is_in_the_table():
    assert set(routes()) == set(TABLE)
    assert len(routes()) == len(set(routes()))


def cases():
    return [(name, method) for name, methods in TABLE.items() for method in methods]


@pytest.mark.parametrize(("name", "method"), cases())
def test_who_may(world, name, method):
    scene, things = world
    may = TABLE[name][method]
    url, body = things.address(name), things.body(name)
    for role in sorted(EVERYONE):
        client = client_of(scene.person(role), scene.project)
        answer = things.call(client, method, url, body)
        if may == "public" or role in may:
            assert answer.status_code < 300 or (method == "post" and answer.status_code in {400, 409}), (
                role, answer.status_code, getattr(answer, "data", None),
            )  # fmt: skip
            assert answer.status_code not in {401, 403, 404, 405}, role
        else:
            assert answer.status_code == 403, (role, answer.status_code)
            assert answer["Content-Type"] == "application/problem+json"


@pytest.mark.parametrize(("name", "method"), cases())
def test_a_stranger_finds_nothing(world, name, method):
    """A member of another project, with a token of his own project or a session, learns nothing of this one."""
    scene, things = world
    other = bare_scene()
    person = other.person("approver")
    for role in ("coordinator", "geochemist", "approver", "administrator"):
        person = other.person(role)
        client = client_of(person, other.project)
        url, body = things.address(name), things.body(name)
        answer = things.call(client, method, url, body)
        if TABLE[name][method] == "public" or things.shared(name):
            assert answer.status_code == 200
        elif "{" in things.template(name):
            assert answer.status_code == 404 or (method == "post" and answer.status_code == 403), answer.data
        elif method == "get" and answer.status_code == 200:
            slugs = {row.get("project") or row.get("slug") for row in answer.json().get("results", [])}
            assert scene.project.slug not in slugs
            told = things.call(client, method, f"{url}?project={scene.project.slug}", None)
            assert told.status_code == 404
            assert f"There is no project «{scene.project.slug}»" in told.json()["detail"]
        else:
            assert answer.status_code in {400, 403, 404}, (role, answer.status_code, answer.data)
            assert scene.sets[0].well.name not in answer.content.decode()


@pytest.mark.parametrize(("name", "method"), cases())
def test_nobody_gets_nothing(world, name, method):
    _, things = world
    answer = things.call(APIClient(), method, things.address(name), things.body(name))
    if TABLE[name][method] == "public":
        assert answer.status_code == 200
    else:
        assert answer.status_code == 401
        assert answer["WWW-Authenticate"] == "Token"
        assert answer.json()["code"] == "not_authenticated"


@pytest.mark.parametrize("name", [name for name, methods in TABLE.items() if "post" in methods])
def test_a_read_token_does_not_post(world, name):
    scene, things = world
    may = sorted(TABLE[name]["post"])[0]
    client = client_of(scene.person(may), scene.project, "read")
    answer = things.call(client, "post", things.address(name), things.body(name))
    assert answer.status_code == 403
    assert "This token only reads" in answer.json()["detail"]


@pytest.mark.parametrize("name", [name for name, methods in TABLE.items() if "post" in methods])
def test_a_session_needs_a_csrf_token(world, name):
    scene, things = world
    may = sorted(TABLE[name]["post"])[0]
    client = signed_in(scene.person(may))
    assert client.get("/api/v1/projects").status_code == 200
    answer = things.call(client, "post", things.address(name), things.body(name))
    assert answer.status_code == 403
    assert "CSRF" in answer.json()["detail"]


def test_a_token_sees_its_own_project_only(world):
    """Though its user is a member of two."""
    scene, _ = world
    other = bare_scene()
    user = scene.person("geochemist")
    MembershipFactory(project=other.project, user=user, role="geochemist")
    seen = {row["slug"] for row in client_of(user, other.project).get("/api/v1/projects").json()["results"]}
    assert seen == {other.project.slug}
    assert client_of(user, other.project).get("/api/v1/wells").json()["results"] == []
    both = {row["slug"] for row in signed_in(user).get("/api/v1/projects").json()["results"]}
    assert both == {other.project.slug, scene.project.slug}


def test_a_member_without_membership_any_more_sees_nothing(world):
    scene, _ = world
    user = scene.person("interpreter")
    client = client_of(user, scene.project)
    user.memberships.all().delete()
    assert client.get("/api/v1/wells").json()["results"] == []
    assert client.get(f"/api/v1/projects/{scene.project.slug}").status_code == 404


@pytest.mark.parametrize("key", ["", "nonsense", "two words"])
def test_a_bad_token_is_refused(world, key):
    answer = APIClient().get("/api/v1/wells", HTTP_AUTHORIZATION=f"Token {key}")
    assert answer.status_code == 401
    assert answer["Content-Type"] == "application/problem+json"


def test_an_account_switched_off_is_refused(world):
    scene, _ = world
    user = UserFactory()
    scene.project.memberships.create(user=user, role="interpreter")
    key = issue_token(user, scene.project, "read")
    user.is_active = False
    user.save()
    assert APIClient().get("/api/v1/wells", HTTP_AUTHORIZATION=f"Token {key}").status_code == 401
