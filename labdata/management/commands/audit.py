"""``manage.py audit``: does the audit trail hold?"""

from typing import Any

from django.db import connection

from labdata import audit, fixity, triggers
from labdata.errors import AuditBroken
from labdata.management.commands._base import ServiceCommand


class Command(ServiceCommand):
    help = "Verify the audit trail: exit 1 and the first broken entry if it was tampered with."

    def answer(self, **options: Any) -> dict[str, Any]:
        answer = audit.verify()
        if gone := triggers.missing(connection):
            raise AuditBroken(
                f"The database no longer refuses changes: the triggers {', '.join(gone)} are missing.",
                remedy="Find out who removed them; `manage.py migrate` makes them again.",
                triggers=gone,
            )
        return {**answer, "facts": fixity.verify()}

    def show(self, answer: dict[str, Any]) -> None:
        self.stdout.write(f"The audit trail holds: {answer['entries']} entries, head {answer['head']}.")
