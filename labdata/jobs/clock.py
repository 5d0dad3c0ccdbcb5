"""One clock for leases and dispatch times: the database's, since machines disagree about the time."""

from datetime import timedelta

from django.db.models import DateTimeField, ExpressionWrapper
from django.db.models.expressions import Combinable
from django.db.models.functions import Now


def after(seconds: float) -> Combinable:
    """The database's time ``seconds`` from now, as an expression for updates and filters."""
    return ExpressionWrapper(Now() + timedelta(seconds=seconds), output_field=DateTimeField())
