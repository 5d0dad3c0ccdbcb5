"""The demonstration's project, its accounts and who may do what."""

import os
import secrets

from django.contrib.auth.models import User
from django.db import transaction

from labdata import audit
from labdata.demo.basin import PEOPLE, PROJECT_NAME, PROJECT_SLUG
from labdata.models import Membership, Project

PASSWORD_VARIABLE = "KEROGATE_DEMO_PASSWORD"
DESCRIPTION = (
    "A made-up study of a made-up basin: cuttings and core of four wells, measured by two laboratories. "
    "Every number follows from a stated geological model; a handful of faults was put in on purpose."
)


def chosen_password() -> tuple[str, bool]:
    """The password for the demonstration's accounts, and whether it was given rather than made up now."""
    given = os.environ.get(PASSWORD_VARIABLE, "")
    return (given, True) if given else (secrets.token_urlsafe(12), False)


@transaction.atomic
def set_up_project() -> Project:
    """The demonstration's project, made if it is not there."""
    project, made = Project.objects.get_or_create(
        slug=PROJECT_SLUG, defaults={"name": PROJECT_NAME, "description": DESCRIPTION}
    )
    if made:
        audit.record("project.created", project, actor=None, project=project, after={"name": project.name})
    return project


@transaction.atomic
def set_up_people(project: Project, password: str, *, renew: bool) -> dict[str, User]:
    """One account per role with its membership. New accounts get ``password``; with ``renew`` all do."""
    people = {}
    for account, role, first, last in PEOPLE:
        user, made = User.objects.get_or_create(username=account, defaults={"first_name": first, "last_name": last})
        if made or (renew and not user.check_password(password)):
            user.set_password(password)
            user.save(update_fields=["password"])
            audit.record("account.password_set", user, actor=None, project=project, after={"account": account})
        membership, joined = Membership.objects.get_or_create(project=project, user=user, role=role)
        if joined:
            after = {"account": account, "role": str(role)}
            audit.record("membership.granted", membership, actor=None, project=project, after=after)
        people[account] = user
    return people
