"""Whether a request may reach a view at all; which rows it sees is the queryset's matter."""

from typing import TYPE_CHECKING

from rest_framework.permissions import SAFE_METHODS, BasePermission
from rest_framework.request import Request

from labdata.models import ApiToken, TokenScope

if TYPE_CHECKING:  # the views import the default permissions
    from rest_framework.views import APIView


class MembershipPermission(BasePermission):
    """Signed in; a read token only reads."""

    message = "This token only reads; a token of scope write may do this."

    def has_permission(self, request: Request, view: "APIView") -> bool:
        if not request.user.is_authenticated:
            return False
        token = request.auth
        reads_only = isinstance(token, ApiToken) and token.scope == TokenScope.READ
        return request.method in SAFE_METHODS or not reads_only
