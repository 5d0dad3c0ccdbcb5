"""Every page as every role, as a stranger and as nobody: one table says what each may expect."""

from dataclasses import dataclass, field

import pytest
from django.urls import URLPattern, URLResolver, get_resolver, reverse

from labdata.access import GRANTS, Action
from labdata.models import Role
from tests.factories import UserFactory
from tests.pages.world import World

pytestmark = pytest.mark.django_db


@dataclass(frozen=True)
class Page:
    """How a page is asked for, and which right it needs. ``ok``: the answer for those who may."""

    needs: Action = Action.VIEW
    method: str = "get"
    names: tuple[str, ...] = ()
    ok: int = 200
    data: dict = field(default_factory=dict)


VIEW = Page()
PAGES = {
    "project": VIEW,
    "wells": VIEW,
    "well": Page(names=("well",)),
    "well_edit": Page(Action.REGISTER, names=("well",)),
    "well_add": Page(Action.REGISTER, "post", ("well", "kind")),
    "well_remove": Page(Action.REGISTER, "post", ("well", "kind", "thing"), ok=400),  # no reason was given
    "sample": Page(names=("sample",)),
    "result": Page(names=("result",)),
    "file_download": Page(names=("file",)),
    "uploads": VIEW,
    "upload": Page(names=("upload",)),
    "upload_progress": Page(names=("upload",)),
    "upload_sheet": Page(names=("upload", "table")),
    "upload_again": Page(Action.UPLOAD, "post", ("upload",), ok=302),
    "upload_answer": Page(Action.UPLOAD, "post", ("upload",), ok=302),
    "desk": Page(names=("landed",)),
    "desk_look": Page(Action.UPLOAD, "post", ("landed",)),
    "desk_store": Page(Action.UPLOAD, "post", ("landed",), ok=302),
    "upload_withdraw": Page(Action.UPLOAD, "post", ("landed",), ok=409),  # what is in cannot be withdrawn
    "layouts": VIEW,
    "layout_forget": Page(Action.UPLOAD, "post", ("layout",), ok=404),  # no such layout
    "template_out": Page(names=("method",)),
    "jobs": VIEW,
    "job": Page(names=("job",)),
    "job_progress": Page(names=("job",)),
    "qc_runs": VIEW,
    "qc_start": Page(Action.RUN_QC, "post", data={"well": "999999"}, ok=404),  # no such well
    "rehearse": VIEW,
    "qc_run": Page(names=("run",)),
    "rules": VIEW,
    "rules_compare": VIEW,
    "rule": Page(names=("rule",)),
    "releases": VIEW,
    "release_new": Page(Action.RELEASE),
    "release": Page(names=("release",)),
    "release_data": Page(Action.PULL, names=("release",)),
    "release_manifest": Page(Action.PULL, names=("release",)),
    "release_withdraw": Page(Action.WITHDRAW, "post", ("release",)),
    "audit": Page(Action.READ_AUDIT),
    "members": Page(Action.ADMINISTER),
    "member_create": Page(Action.ADMINISTER, "post"),
    "member_password": Page(Action.ADMINISTER, "post"),
    "member_remove": Page(Action.ADMINISTER, "post", ok=404),  # nobody was named
}
#: Pages outside a project, or whose right is not a role's: (method, names, status by who asks)
ELSEWHERE = {"home", "login", "logout", "password_change", "tokens", "token_revoke", "project_new", "job_cancel"}
#: Pages of other rooms, walked by their own tests.
OTHER_ROOMS = ("review", "healthz")


def names_in(patterns) -> set[str]:
    """The names of every address outside the API."""
    found = set()
    for pattern in patterns:
        if isinstance(pattern, URLResolver):
            if not str(pattern.pattern).startswith("api/"):
                found |= names_in(pattern.url_patterns)
        elif isinstance(pattern, URLPattern):
            found.add(pattern.name)
    return found


def test_every_page_is_in_the_table():
    own = {name for name in names_in(get_resolver().url_patterns) if not str(name).startswith(OTHER_ROOMS)}
    assert own == PAGES.keys() | ELSEWHERE


def address(name: str, page: Page, made: World) -> str:
    values = {
        "well": made.well.pk, "kind": "casing", "thing": made.well.casing_shoes.get().pk,
        "sample": made.result.analysis.sample_id, "result": made.result.pk, "upload": made.upload.pk,
        "file": made.upload.source_file_id, "job": made.job.pk, "run": made.run.pk, "rule": "s2_floor_for_tmax", "table": 0,
        "release": made.release.number, "landed": made.landed.pk, "layout": 999_999, "method": "carbon",
    }  # fmt: skip
    return reverse(name, args=[made.slug, *(values[part] for part in page.names)])


def test_every_page_as_every_role(made, client):
    wrong = []
    for role in Role:
        client.force_login(made.person(role))
        for name, page in PAGES.items():
            expected = page.ok if page.needs in GRANTS[role] else 403
            got = getattr(client, page.method)(address(name, page, made), page.data).status_code
            if got != expected:
                wrong.append(f"{name} as {role}: {got}, not {expected}")
    assert not wrong


def test_a_project_does_not_exist_for_a_stranger(made, client):
    client.force_login(UserFactory())
    for name, page in PAGES.items():
        assert getattr(client, page.method)(address(name, page, made), page.data).status_code == 404, name


def test_nobody_is_asked_to_sign_in(made, client):
    for name, page in PAGES.items():
        answer = getattr(client, page.method)(address(name, page, made), page.data)
        assert (answer.status_code, answer["Location"].split("?")[0]) == (302, reverse("login")), name


def test_pages_outside_a_project(made, client):
    for name in ("home", "password_change", "tokens", "project_new", "login"):
        expected = 200 if name == "login" else 302
        assert client.get(reverse(name)).status_code == expected, name
    for who, may_open in [(UserFactory(), False), (UserFactory(is_staff=True), True), (made.person("analyst"), False),
                          (made.person("administrator"), True)]:  # fmt: skip
        client.force_login(who)
        for name in ("home", "password_change", "tokens"):
            assert client.get(reverse(name)).status_code == 200, name
        assert client.get(reverse("project_new")).status_code == (200 if may_open else 403)


def test_only_its_owner_ends_a_token(made, client):
    address = reverse("token_revoke", args=[made.token])
    assert client.post(address).status_code == 302
    client.force_login(made.person("analyst"))
    assert client.post(address).status_code == 404
    client.force_login(made.person("coordinator"))
    assert client.post(address).status_code == 302
    assert client.post(address).status_code == 409


def test_a_job_is_cancelled_by_its_author_or_an_administrator(made, client):
    address = reverse("job_cancel", args=[made.slug, made.job.pk])
    for role in Role:
        client.force_login(made.person(role))
        may = role in {Role.COORDINATOR, Role.ADMINISTRATOR}
        assert client.post(address).status_code == (302 if may else 403), role
    client.force_login(UserFactory())
    assert client.post(address).status_code == 404


def test_signing_out_is_a_post(made, client):
    client.force_login(made.person("analyst"))
    assert client.get(reverse("logout")).status_code == 405
    assert client.post(reverse("logout")).status_code == 302
