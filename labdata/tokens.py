"""Keys by which programs come in: made, shown once, revoked."""

import hashlib
import secrets
from datetime import timedelta

from django.contrib.auth.models import User
from django.db import transaction
from django.utils import timezone

from labdata import audit
from labdata.access import Action, actions, require
from labdata.errors import Conflict, InvalidInput, NotAllowed
from labdata.models import ApiToken, Project, TokenScope

LONGEST_DAYS = 3650


def issue_token(user: User, project: Project, scope: str, days: int | None = None) -> str:
    """A new key for ``user`` in ``project``. Only its SHA-256 is kept, so this is the one time it is seen.

    ``days`` None means until revoked. Raises InvalidInput for a scope or a number of days that is none, NotFound
    for a user without membership.
    """
    require(user, project, Action.PULL)
    if scope not in TokenScope.values:
        raise InvalidInput(f"«{scope}» is no scope.", remedy=f"Scopes: {', '.join(TokenScope.values)}.", field="scope")
    if days is not None and not 1 <= days <= LONGEST_DAYS:
        raise InvalidInput(f"A token cannot last {days} days.", remedy=f"Give 1 to {LONGEST_DAYS} days.", field="days")
    key = secrets.token_urlsafe(32)
    with transaction.atomic():
        token = ApiToken.objects.create(
            user=user,
            project=project,
            scope=scope,
            key_sha256=hashlib.sha256(key.encode()).hexdigest(),
            expires_at=timezone.now() + timedelta(days=days) if days else None,
        )
        audit.record(
            "token.issued",
            token,
            actor=user,
            project=project,
            after={"user": user.username, "scope": scope, "expires_at": token.expires_at},
        )
    return key


def revoke_token(*, user: User, token: ApiToken) -> None:
    """End a token, by its owner or the project's administrator. Raises NotAllowed, Conflict when ended already."""
    if token.user_id != user.pk and Action.ADMINISTER not in actions(user, token.project):
        raise NotAllowed("This token is somebody else's.", remedy="Its owner or an administrator may revoke it.")
    with transaction.atomic():
        ended = ApiToken.objects.filter(pk=token.pk, revoked_at__isnull=True).update(revoked_at=timezone.now())
        if not ended:
            raise Conflict("This token was revoked already.")
        audit.record("token.revoked", token, actor=user, project=token.project, after={"user": token.user.username})
