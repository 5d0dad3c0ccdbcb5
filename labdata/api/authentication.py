"""Tokens: ``Authorization: Token KEY``."""

import hashlib

from django.utils import timezone
from rest_framework.authentication import BaseAuthentication, get_authorization_header
from rest_framework.exceptions import AuthenticationFailed
from rest_framework.request import Request

from labdata.models import ApiToken


class TokenAuthentication(BaseAuthentication):
    """The token's user, with ``request.auth`` the token: it sees its own project only."""

    def authenticate(self, request: Request) -> tuple[object, ApiToken] | None:
        words = get_authorization_header(request).decode("latin-1").split()
        if not words or words[0].lower() != "token":
            return None
        if len(words) != 2:
            raise AuthenticationFailed("The header is «Authorization: Token KEY», with one key.")
        digest = hashlib.sha256(words[1].encode()).hexdigest()
        token = ApiToken.objects.select_related("user", "project").filter(key_sha256=digest).first()
        if token is None or token.revoked_at or not token.user.is_active:
            raise AuthenticationFailed("This token is not known or was revoked.")
        if token.expires_at and token.expires_at <= timezone.now():
            raise AuthenticationFailed("This token has expired.")
        return token.user, token

    def authenticate_header(self, request: Request) -> str:
        return "Token"
