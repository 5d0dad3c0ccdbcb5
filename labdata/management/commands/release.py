"""``release``: build the next immutable release from signed review sets."""

from typing import Any

from django.core.management.base import CommandParser

from labdata.access import find_project, find_user
from labdata.management.commands._base import ServiceCommand
from labdata.release.services import build_release


class Command(ServiceCommand):
    help = "Build the next immutable release of a project from its signed review sets."

    def arguments(self, parser: CommandParser) -> None:
        parser.add_argument("--project", required=True, metavar="SLUG")
        parser.add_argument("--title", required=True, metavar="TEXT")
        parser.add_argument("--user", required=True, metavar="NAME", help="an approver of the project")

    def answer(self, **options: Any) -> dict[str, Any]:
        project, user = find_project(options["project"]), find_user(options["user"])
        made = build_release(project=project, user=user, title=options["title"])
        return {
            "release": made.pk, "project": project.slug, "number": made.number, "title": made.title,
            "created_at": made.created_at, "data_sha256": made.data_sha256, "manifest_sha256": made.manifest_sha256,
            "counts": made.manifest["counts"], "unavailable": made.manifest["unavailable"],
        }  # fmt: skip

    def show(self, answer: dict[str, Any]) -> None:
        counts = answer["counts"]
        self.stdout.write(
            f"Release {answer['number']} of {answer['project']} (id {answer['release']}): {counts['usable']} values of "
            f"{counts['analyses']} analyses; {counts['rejected']} rejected, {counts['unavailable']} indices went with "
            f"them. SHA-256 {answer['data_sha256']}"
        )
