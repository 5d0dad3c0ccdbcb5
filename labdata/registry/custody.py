"""The chain of custody of a sample: who had it, where, in which state. Entries are added, never changed."""

from datetime import datetime, timedelta

from django.contrib.auth.models import User
from django.db import transaction
from django.utils import timezone

from labdata import audit
from labdata.access import Action, require
from labdata.errors import InvalidInput
from labdata.models import CustodyEvent, Sample


def add_custody(*, user: User, sample: Sample, kind: str, place: str, at: datetime, remark: str = "") -> CustodyEvent:
    """Record that the sample changed hands or state. Raises NotAllowed, InvalidInput (kind, place, a time to come)."""
    project = sample.well.project
    require(user, project, Action.REGISTER)
    if kind not in CustodyEvent.Kind.values:
        raise InvalidInput(
            f"«{kind}» is no custody event.", remedy=f"Kinds: {', '.join(CustodyEvent.Kind.values)}.", field="kind"
        )
    if not place.strip():
        raise InvalidInput("Custody names a place.", remedy="Say where the sample was or went.", field="place")
    if at > timezone.now() + timedelta(minutes=5):
        raise InvalidInput(f"{at:%Y-%m-%d %H:%M} is still to come.", remedy="Record what has happened.", field="at")
    with transaction.atomic():
        event = CustodyEvent.objects.create(
            sample=sample, kind=kind, place=place.strip(), at=at, recorded_by=user, remark=remark.strip()
        )
        audit.record(
            "sample.custody",
            sample,
            actor=user,
            project=project,
            after={"event": event.pk, "kind": kind, "place": event.place, "at": at, "remark": event.remark},
        )
    return event
