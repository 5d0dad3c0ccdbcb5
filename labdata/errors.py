"""What can be refused, by name. Each error says what was found and what would do."""

from collections.abc import Mapping
from typing import Any


class KerogateError(Exception):
    """A refusal that a person or program can act on.

    ``message`` says what was found, ``remedy`` what would do, ``where`` names file, sheet, cell, field or
    row. ``code`` is stable for programs; ``status`` is the HTTP status of the API.
    """

    code = "refused"
    status = 400

    def __init__(self, message: str, *, remedy: str = "", **where: Any) -> None:
        super().__init__(message)
        self.message = message
        self.remedy = remedy
        self.where: Mapping[str, Any] = where

    def __str__(self) -> str:
        return f"{self.message} {self.remedy}".strip()

    def as_dict(self) -> dict[str, Any]:
        """The refusal as plain data, for JSON answers."""
        return {"code": self.code, "message": self.message, "remedy": self.remedy, **self.where}


class InvalidInput(KerogateError):
    """A field or row of a request does not hold what it should."""

    code = "invalid"


class NotFound(KerogateError):
    """The thing does not exist, or may not be seen."""

    code = "not_found"
    status = 404


class NotAllowed(KerogateError):
    """The user's roles in the project do not include this action."""

    code = "not_allowed"
    status = 403


class Conflict(KerogateError):
    """The thing has changed since it was looked at, or its state does not allow the action."""

    code = "conflict"
    status = 409


class SelfSignOff(NotAllowed):
    """The signer decided results in this set."""

    code = "self_sign_off"


class WrongPassword(NotAllowed):
    """The password given with a signature is not the signer's."""

    code = "wrong_password"


class SigningLocked(WrongPassword):
    """Too many wrong passwords were given; signing waits."""

    code = "signing_locked"


class OpenResults(Conflict):
    """Results are still undecided or held."""

    code = "open_results"


class NothingSigned(Conflict):
    """A release was asked for, and no review set of the project is signed."""

    code = "nothing_signed"


class AuditBroken(KerogateError):
    """The audit trail does not verify."""

    code = "audit_broken"
