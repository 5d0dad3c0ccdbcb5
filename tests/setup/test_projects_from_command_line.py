"""A project made at the command line can be worked in: it has members, and more can be named."""

import json

import pytest
from django.contrib.auth.models import User
from django.core.management import call_command

from labdata.access import Action, allowed
from labdata.errors import InvalidInput
from labdata.models import Membership, Project, Role
from labdata.projects import open_from_command_line
from tests.factories import MembershipFactory, ProjectFactory, UserFactory

pytestmark = pytest.mark.django_db


def test_the_installations_administrator_administers_it():
    owner = UserFactory(is_superuser=True)
    project = open_from_command_line("west-flank")
    assert allowed(owner, project, Action.ADMINISTER)


def test_members_of_the_demonstration_come_along():
    demo = ProjectFactory(slug="demo")
    geochemist = MembershipFactory(project=demo, role=Role.GEOCHEMIST).user
    stranger = MembershipFactory(role=Role.GEOCHEMIST).user
    project = open_from_command_line("own-files")
    assert allowed(geochemist, project, Action.DECIDE)
    assert not allowed(stranger, project, Action.VIEW)


def test_a_poor_short_name_is_refused_and_nothing_made():
    with pytest.raises(InvalidInput, match="«West Flank» cannot be a project"):
        open_from_command_line("West Flank")
    assert not Project.objects.exists()


def test_the_member_command_makes_account_and_role(capsys, monkeypatch):
    monkeypatch.delenv("KEROGATE_PASSWORD", raising=False)
    ProjectFactory(slug="west-flank")
    call_command("member", "ilse", project="west-flank", role="approver", create=True, json=True)
    answer = json.loads(capsys.readouterr().out)
    assert User.objects.get(username="ilse").check_password(answer["password"])
    assert Membership.objects.filter(user__username="ilse", role=Role.APPROVER).exists()


def test_a_role_held_already_is_refused(capsys):
    membership = MembershipFactory(role=Role.ANALYST)
    with pytest.raises(SystemExit) as end:
        call_command("member", membership.user.username, project=membership.project.slug, role="analyst", json=True)
    assert end.value.code == 1
    assert "already" in json.loads(capsys.readouterr().out)["error"]["message"]
