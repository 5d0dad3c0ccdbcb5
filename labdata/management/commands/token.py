"""``token``: a new key for the API, printed once."""

from typing import Any

from django.core.management.base import CommandParser

from labdata.access import find_project, find_user
from labdata.management.commands._base import ServiceCommand
from labdata.models import TokenScope
from labdata.tokens import issue_token


class Command(ServiceCommand):
    help = "Print a new API token of a user for one project; it is shown this once."

    def arguments(self, parser: CommandParser) -> None:
        parser.add_argument("user", metavar="USER")
        parser.add_argument("--project", required=True, metavar="SLUG")
        parser.add_argument("--scope", required=True, choices=TokenScope.values)
        parser.add_argument("--days", type=int, metavar="N", help="how long it holds (unless told: until revoked)")

    def answer(self, **options: Any) -> dict[str, Any]:
        user, project = find_user(options["user"]), find_project(options["project"])
        key = issue_token(user, project, options["scope"], options["days"])
        return {"token": key, "user": user.username, "project": project.slug, "scope": options["scope"]}

    def show(self, answer: dict[str, Any]) -> None:
        self.stdout.write(answer["token"])
