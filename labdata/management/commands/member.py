"""``member``: give an account a role in a project; with --create make the account first."""

import os
import secrets
from typing import Any

from django.core.management.base import CommandParser
from django.db import transaction

from labdata.access import find_project, find_user
from labdata.accounts import create_account
from labdata.management.commands._base import ServiceCommand
from labdata.members import grant
from labdata.models import Role


class Command(ServiceCommand):
    help = "Give an account a role in a project."

    def arguments(self, parser: CommandParser) -> None:
        parser.add_argument("user", metavar="USER")
        parser.add_argument("--project", required=True, metavar="SLUG")
        parser.add_argument("--role", required=True, choices=Role.values)
        parser.add_argument(
            "--create", action="store_true", help="make the account; its password is KEROGATE_PASSWORD, else random"
        )

    def answer(self, **options: Any) -> dict[str, Any]:
        project = find_project(options["project"])
        answer = {"user": options["user"], "project": project.slug, "role": options["role"]}
        with transaction.atomic():
            if options["create"]:
                password = os.environ.get("KEROGATE_PASSWORD") or secrets.token_urlsafe(12)
                create_account(options["user"], password)
                if "KEROGATE_PASSWORD" not in os.environ:
                    answer["password"] = password
            grant(actor=None, project=project, user=find_user(options["user"]), role=options["role"])
        return answer

    def show(self, answer: dict[str, Any]) -> None:
        self.stdout.write(f"{answer['user']} is {Role(answer['role']).label} of {answer['project']}.")
        if "password" in answer:
            self.stdout.write(f"Password, shown this once: {answer['password']}")
