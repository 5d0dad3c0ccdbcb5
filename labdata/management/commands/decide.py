"""Bulk decisions from a table: all rows or none."""

from pathlib import Path
from typing import Any

from django.core.management.base import CommandParser

from labdata.access import find_project, find_user
from labdata.errors import NotFound
from labdata.management.commands._base import ServiceCommand
from qc.review.sheets import decide_from_sheet


class Command(ServiceCommand):
    help = "accept, reject or hold results named in a CSV (columns sample, method, replicate, analyte, verdict, reason)"

    def arguments(self, parser: CommandParser) -> None:
        parser.add_argument("--project", required=True, metavar="SLUG")
        parser.add_argument("--file", required=True, metavar="CSV", help="a blank analyte means the whole analysis")
        parser.add_argument("--user", required=True, metavar="NAME", help="who decides")

    def answer(self, **options: Any) -> dict[str, Any]:
        project, user, path = find_project(options["project"]), find_user(options["user"]), Path(options["file"])
        if not path.is_file():
            raise NotFound(f"There is no file «{path}».", remedy="Give the path of a CSV file.", file=str(path))
        return decide_from_sheet(user=user, project=project, content=path.read_bytes())

    def show(self, answer: dict[str, Any]) -> None:
        self.stdout.write(f"{answer['decisions']} results decided from {answer['rows']} rows.")
        for part in answer["review_sets"]:
            self.stdout.write(f"  {part['well']} set {part['number']}: {part['decided']} (batch {part['batch']})")
