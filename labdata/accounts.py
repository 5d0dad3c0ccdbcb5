"""Accounts: who may sign in at all. What an account may do is a matter of its memberships (labdata/access.py)."""

import os
import secrets

from django.contrib.auth.models import User
from django.contrib.auth.password_validation import validate_password
from django.core.exceptions import ValidationError
from django.db import transaction

from labdata import audit
from labdata.errors import Conflict, InvalidInput

ADMINISTRATOR = "administrator"


def create_account(
    username: str, password: str, *, actor: User | None = None, administrator: bool = False, **names: str
) -> User:
    """Make one account. Raises Conflict when the name is taken, InvalidInput for a poor name or password."""
    if User.objects.filter(username__iexact=username).exists():
        raise Conflict(f"There is already an account «{username}».", remedy="Choose another name.", user=username)
    user = User(username=username, is_staff=administrator, is_superuser=administrator, **names)
    _check(user, password)
    user.set_password(password)
    with transaction.atomic():
        user.save(force_insert=True)
        audit.record("account.created", user, actor=actor, project=None, after={"username": username})
    return user


def _check(user: User, password: str) -> None:
    try:
        user.clean_fields(exclude=["password"])
        validate_password(password, user)
    except ValidationError as error:
        raise InvalidInput(" ".join(error.messages), remedy="Name and password must meet these rules.") from None


def first_administrator() -> tuple[str, str] | None:
    """Make the administrator's account if there is no account at all.

    Returns (name, password) when it was made; the password comes from KEROGATE_ADMIN_PASSWORD, else it is random,
    and this is the only time that it can be read.
    """
    if User.objects.exists():
        return None
    password = os.environ.get("KEROGATE_ADMIN_PASSWORD") or secrets.token_urlsafe(12)
    create_account(ADMINISTRATOR, password, administrator=True)
    return ADMINISTRATOR, password
