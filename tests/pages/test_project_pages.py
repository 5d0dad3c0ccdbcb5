"""Work lists, rules, members, tokens, audit, new projects, and how a refusal looks."""

import pytest
from django.contrib.auth.models import User
from django.db import connection
from django.test import Client
from django.urls import reverse

from labdata import triggers
from labdata.models import ApiToken, AuditEntry, Membership, Project, Role, SweeperBeat
from qc.models import RuleSet
from qc.review.services import Choice, decide
from qc.review.standing import results_of
from tests.factories import UserFactory

RULE = "s2_floor_for_tmax"


def waiting(client) -> list[str]:
    desk = client.get(reverse("home")).context["desks"][0]
    return [f"{item.count} {item.what}" for item in desk["waiting"]]


def test_each_role_sees_what_waits_for_it(made, as_):
    assert waiting(as_("analyst")) == ["1 file with questions to answer"]
    assert waiting(as_("geochemist")) == ["1 review set to decide", "1 of your jobs failed"]
    assert waiting(as_("approver")) == []
    made.release.sign_offs.clear()
    assert waiting(as_("approver")) == ["1 signed set not in a release yet"]
    assert waiting(as_("interpreter")) == []


def test_a_decided_set_waits_for_an_approver_who_did_not_decide(made, as_):
    approver, held = made.person("approver"), made.scene.sets[1]
    made.scene.accept(held)
    assert "1 review set to sign" in waiting(as_("approver"))
    Membership.objects.create(user=approver, project=made.scene.project, role=Role.GEOCHEMIST)
    some = results_of(held).first()
    decide(user=approver, review_set=held, choices=[Choice(some.pk, "accepted")])
    assert "1 review set to sign" not in waiting(as_("approver"))


def test_the_start_tells_somebody_without_a_project_what_to_do(client, db):
    client.force_login(UserFactory(username="newcomer"))
    assert "Ask the administrator of your project to add your account, newcomer" in client.get("/").content.decode()


def test_a_silent_worker_is_announced_on_every_page(made, as_, at):
    client = as_("interpreter")
    assert "No worker is running" not in client.get(at("wells")).content.decode()
    SweeperBeat.objects.all().delete()
    assert "No worker is running" in client.get(at("wells")).content.decode()


def test_a_rule_is_told_in_full(made, as_, at):
    text = as_("interpreter").get(at("rule", RULE)).content.decode()
    for said in ("What it tests", "Worked example", "Must not fire", "Peters 1986", "Tmax was read from an S2 peak"):
        assert said in text
    assert "Make a new version" not in text
    assert as_("interpreter").get(at("rule", "no-such-rule")).status_code == 404


def change(**values) -> dict:
    sent = {
        "enabled": "on",
        "s2_min": "0.2",
        "s2_warn": "0.5",
        "hydrocarbon_min": "0.2",
        "reason": "lean rock",
        **values,
    }
    return {f"rule-{name}": value for name, value in sent.items()}


def test_a_threshold_changes_by_a_new_version(made, as_, at):
    client = as_("geochemist")
    assert client.post(at("rule", RULE), change(s2_min="0.3")).status_code == 302
    made_version = RuleSet.objects.get(project=made.scene.project)
    assert (made_version.version, made_version.reason) == (1, "lean rock")
    assert made_version.thresholds[RULE]["s2_min"]["value"] == 0.3
    rows = client.get(at("rules_compare")).context["differences"]
    assert [(row["rule"], row["before"], row["after"]) for row in rows] == [(RULE, 0.2, 0.3)]


def test_a_rule_is_switched_off_and_on(made, as_, at):
    client = as_("geochemist")
    client.post(at("rule", RULE), change(enabled=""))
    assert RuleSet.objects.get(project=made.scene.project).disabled == [RULE]
    client.post(at("rule", RULE), change())
    assert RuleSet.objects.filter(project=made.scene.project).first().disabled == []


@pytest.mark.parametrize(
    ("sent", "said"),
    [
        (change(), "Nothing changed"),
        (change(s2_min="0.3", reason=""), "This field is required"),
        (change(s2_min="much"), "Enter a number"),
        (change(s2_min="nan"), "Enter a number"),
    ],
)
def test_a_change_of_thresholds_that_says_nothing_is_refused(made, as_, at, sent, said):
    answer = as_("geochemist").post(at("rule", RULE), sent)
    assert answer.status_code == 200
    assert said in answer.content.decode()
    assert not RuleSet.objects.filter(project=made.scene.project).exists()


def test_flags_of_a_run_are_filtered(made, as_, at):
    client = as_("interpreter")
    assert len(client.get(at("qc_run", made.run.pk), {"rule": RULE, "severity": "warn"}).context["page"]) == 1
    assert len(client.get(at("qc_run", made.run.pk), {"severity": "info"}).context["page"]) == 0


def test_a_role_is_given_and_taken_and_the_last_administrator_stays(made, as_, at):
    client, newcomer = as_("administrator"), UserFactory()
    give = {"role-username": newcomer.username, "role-role": "approver"}
    assert client.post(at("members"), give).status_code == 302
    assert "already" in client.post(at("members"), give).content.decode()
    assert "There is no account" in client.post(at("members"), {**give, "role-username": "ghost"}).content.decode()
    taken = {"username": newcomer.username, "role": "approver"}
    assert client.post(at("member_remove"), taken).status_code == 302
    assert client.post(at("member_remove"), taken).status_code == 404
    own = {"username": made.person("administrator").username, "role": "administrator"}
    assert client.post(at("member_remove"), own).status_code == 409
    assert [entry.action for entry in AuditEntry.objects.filter(action__startswith="member.").order_by("seq")] == [
        "member.role_added", "member.role_removed",
    ]  # fmt: skip


def account(**values) -> dict:
    sent = {"username": "newcomer", "role": "analyst", "password": "three words and more", **values}
    return {f"account-{name}": value for name, value in sent.items()}


def test_an_account_is_made_with_its_first_role(made, as_, at):
    assert as_("administrator").post(at("member_create"), account()).status_code == 302
    user = User.objects.get(username="newcomer")
    assert user.check_password("three words and more")
    assert user.memberships.get().role == Role.ANALYST
    assert "password" not in str(AuditEntry.objects.get(action="account.created").after)


@pytest.mark.parametrize(
    ("values", "said"),
    [({"password": "short"}, "too short"), ({"username": "a b"}, "is no account name"), ({"username": "PERSON"}, "is taken"),
     ({"role": "king"}, "Select a valid choice")],
)  # fmt: skip
def test_an_account_that_cannot_be_is_refused(made, as_, at, values, said):
    UserFactory(username="person")
    answer = as_("administrator").post(at("member_create"), account(**values))
    assert answer.status_code == 200
    assert said in answer.content.decode()


def test_a_token_is_shown_once_and_kept_as_a_fingerprint(made, as_):
    client = as_("interpreter")
    answer = client.post(reverse("tokens"), {"project": made.slug, "scope": "read", "days": "30"})
    key = answer.context["key"]
    assert key in answer.content.decode()
    assert key not in client.get(reverse("tokens")).content.decode()
    token = ApiToken.objects.get(user=made.person("interpreter"))
    assert key not in (
        token.key_sha256,
        str(AuditEntry.objects.get(object_id=str(token.pk), action="token.issued").after),
    )


@pytest.mark.parametrize("sent", [{"scope": "all"}, {"days": "0"}, {"days": "9999"}, {"project": "unseen"}])
def test_a_token_that_cannot_be_is_refused(made, as_, sent):
    Project.objects.create(slug="unseen", name="Unseen")
    asked = {"project": made.slug, "scope": "read", "days": "30", **sent}
    answer = as_("interpreter").post(reverse("tokens"), asked)
    assert answer.context["key"] is None
    assert answer.context["form"].errors


def test_the_audit_page_finds_and_verifies(made, as_, at):
    client = as_("approver")
    assert [entry.action for entry in client.get(at("audit"), {"q": "release.made"}).context["page"]] == [
        "release.made"
    ]
    assert client.get(at("audit"), {"since": "2100-01-01"}).context["page"].object_list.count() == 0
    assert "The chain holds" in client.get(at("audit"), {"verify": "1"}).content.decode()


def test_the_audit_page_names_the_broken_entry(made, as_, at):
    triggers.remove(connection)
    AuditEntry.objects.filter(action="release.made").update(reason="rewritten")
    text = as_("approver").get(at("audit"), {"verify": "1"}).content.decode()
    assert "The chain is broken" in text
    assert "was altered after it was written" in text


def test_a_project_is_opened_by_staff_with_themselves_as_administrator(client, db):
    user = UserFactory(is_staff=True)
    client.force_login(user)
    answer = client.post(reverse("project_new"), {"name": "Quill Basin"})
    assert answer["Location"] == reverse("members", args=["quill-basin"])
    assert Membership.objects.get(project__slug="quill-basin").user == user
    assert "is taken" in client.post(reverse("project_new"), {"name": "Quill Basin"}).content.decode()
    assert "no short name" in client.post(reverse("project_new"), {"name": "???"}).content.decode()


def test_a_refusal_says_what_was_found_and_what_would_do(made, as_, at):
    answer = as_("interpreter").get(at("members"), headers={"referer": "http://testserver" + at("wells")})
    text = answer.content.decode()
    assert answer.status_code == 403
    assert "may not administer" in text
    assert "Roles that may: administrator." in text
    assert at("wells") in text
    elsewhere = as_("interpreter").get(at("members"), headers={"referer": "https://elsewhere.test/"})
    assert "elsewhere.test" not in elsewhere.content.decode()


def test_an_unknown_address_and_a_form_without_key_have_their_pages(made, at):
    client = Client(enforce_csrf_checks=True)
    client.force_login(made.person("analyst"))
    assert "There is nothing at this address" in client.get("/nowhere/").content.decode()
    refused = client.post(at("uploads"), {})
    assert refused.status_code == 403
    assert "The form was too old" in refused.content.decode()


def test_a_fault_of_ours_has_a_page_too(made, at, monkeypatch):
    client = Client(raise_request_exception=False)
    client.force_login(made.person("analyst"))
    monkeypatch.setattr("labdata.pages.wells.page_of", lambda *_: 1 / 0)
    answer = client.get(at("wells"))
    assert answer.status_code == 500
    assert "Something broke on our side" in answer.content.decode()


def new_password(username: str, password: str = "another phrase of words") -> dict:
    return {"password-username": username, "password-password": password}


def test_a_lost_password_is_set_anew(made, as_, at):
    user = made.person("analyst")
    assert as_("administrator").post(at("member_password"), new_password(user.username)).status_code == 302
    user.refresh_from_db()
    assert user.check_password("another phrase of words")
    assert AuditEntry.objects.get(action="account.password_set").object_id == str(user.pk)


def test_a_password_that_opens_other_projects_is_not_set_here(made, as_, at):
    analyst, staff, stranger = made.person("analyst"), UserFactory(is_staff=True), UserFactory()
    Membership.objects.create(
        user=analyst, project=Project.objects.create(slug="other", name="Other"), role=Role.ANALYST
    )
    Membership.objects.create(user=staff, project=made.scene.project, role=Role.ANALYST)
    for user, said in [(analyst, "do not administer"), (staff, "do not administer"), (stranger, "is no member")]:
        answer = as_("administrator").post(at("member_password"), new_password(user.username))
        assert said in answer.content.decode()
        before = user.password
        user.refresh_from_db()
        assert user.password == before
