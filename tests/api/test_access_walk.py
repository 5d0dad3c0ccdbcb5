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


CASES = [(name, method) for name, methods in TABLE.items() for method in methods]


@pytest.mark.parametrize(("name", "method"), CASES)
def test_a_route(world, name, method):
    """Nobody and strangers learn nothing, a read token does not post, and of the members those may who should."""
    scene, things = world
    url, body, may = things.address(name), things.body(name), TABLE[name][method]
    nobody(things.call(APIClient(), method, url, body), may)
    other = bare_scene()
    for role in ("coordinator", "geochemist", "approver", "administrator"):
        a_stranger(scene, things, client_of(other.person(role), other.project), name, method)
    if method == "post":
        reader = client_of(scene.person(min(may)), scene.project, "read")
        refused = things.call(reader, method, url, body)
        assert (refused.status_code, "This token only reads" in refused.json()["detail"]) == (403, True)
        refused = things.call(signed_in(scene.person(min(may))), method, url, body)
        assert (refused.status_code, "CSRF" in refused.json()["detail"]) == (403, True)
    for role in sorted(EVERYONE):
        answer = things.call(client_of(scene.person(role), scene.project), method, url, body)
        a_member(answer, role, may == "public" or role in may)


def nobody(answer, may):
    if may == "public":
        assert answer.status_code == 200
    else:
        assert (answer.status_code, answer["WWW-Authenticate"]) == (401, "Token")
        assert answer.json()["code"] == "not_authenticated"


def a_member(answer, role, may):
    """Who may gets an answer, at worst that the state of things forbids it; who may not gets 403."""
    told = (role, answer.status_code, getattr(answer, "data", None))
    if may:
        assert answer.status_code < 300 or answer.status_code in {400, 409}, told
    else:
        assert (answer.status_code, answer["Content-Type"]) == (403, "application/problem+json"), told


def a_stranger(scene, things, client, name, method):
    """A member of another project learns nothing of this one."""
    answer = things.call(client, method, things.address(name), things.body(name))
    told = (name, answer.status_code, getattr(answer, "data", None))
    if TABLE[name][method] == "public" or things.shared(name):
        assert answer.status_code == 200, told
    elif "{" in things.template(name):
        assert answer.status_code == 404 or (method == "post" and answer.status_code == 403), told
    elif method == "get" and answer.status_code == 200:
        slugs = {row.get("project") or row.get("slug") for row in answer.json()["results"]}
        assert scene.project.slug not in slugs
        asked = client.get(f"{things.address(name)}?project={scene.project.slug}")
        assert asked.status_code == 404
        assert f"There is no project «{scene.project.slug}»" in asked.json()["detail"]
    else:
        assert answer.status_code in {400, 403, 404}, told
        assert scene.sets[0].well.name not in answer.content.decode()


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
