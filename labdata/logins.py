"""The throttle on signing in: five failed tries in fifteen minutes lock an account for an address."""

import math
from datetime import timedelta

from django.db import transaction
from django.utils import timezone

from labdata.errors import NotAllowed
from labdata.models import LoginFailure

TRIES = 5
WINDOW = timedelta(minutes=15)


class TooManyTries(NotAllowed):
    """The account is locked for this address for a while."""

    code = "too_many_tries"


def check_not_locked(account: str, address: str) -> None:
    """Raises TooManyTries, saying for how long, while the last ``TRIES`` failures lie within the window."""
    since = timezone.now() - WINDOW
    failures = LoginFailure.objects.filter(account=_fold(account), address=address, at__gt=since)
    times = list(failures.order_by("-at").values_list("at", flat=True)[:TRIES])
    if len(times) < TRIES:
        return
    minutes = max(1, math.ceil((times[-1] + WINDOW - timezone.now()).total_seconds() / 60))
    raise TooManyTries(
        f"{TRIES} failed tries for this account from this address within {WINDOW.seconds // 60} minutes.",
        remedy=f"Try again in {minutes} minute{'' if minutes == 1 else 's'}; the account is not locked elsewhere.",
    )


def note_failure(account: str, address: str) -> None:
    """Remember a failed try; what no longer counts is forgotten on the way."""
    with transaction.atomic():
        LoginFailure.objects.filter(at__lte=timezone.now() - WINDOW).delete()
        LoginFailure.objects.create(account=_fold(account), address=address)


def forget_failures(account: str, address: str) -> None:
    """After a success the count starts anew."""
    LoginFailure.objects.filter(account=_fold(account), address=address).delete()


def _fold(account: str) -> str:
    return account.strip().casefold()[:150]
