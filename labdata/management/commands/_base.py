"""What every command of ours shares: one JSON object on stdout with --json, all else on stderr, exit 0, 1 or 2."""

import json
import sys
from typing import Any

from django.core.management.base import BaseCommand, CommandParser
from django.core.serializers.json import DjangoJSONEncoder

from labdata.errors import KerogateError


class ServiceCommand(BaseCommand):
    """A command that turns its arguments into one service call and prints the answer.

    Subclasses write ``arguments`` and ``answer``; ``answer`` returns plain data, and ``exit_status`` says whether
    that data is a refusal. ``show`` prints the answer for people. ``--home`` was taken by manage.py already.
    """

    requires_migrations_checks = False

    def add_arguments(self, parser: CommandParser) -> None:
        parser.add_argument(
            "--home", metavar="DIR", help="database, files and releases (default: var/, or KEROGATE_HOME)"
        )
        parser.add_argument("--json", action="store_true", help="print exactly one JSON object on stdout")
        self.arguments(parser)

    def arguments(self, parser: CommandParser) -> None:
        """Add the command's own arguments."""

    def answer(self, **options: Any) -> dict[str, Any]:
        """Do the work. Raises KerogateError for a refusal."""
        raise RuntimeError(f"{type(self).__name__} has no answer()")

    def exit_status(self, answer: dict[str, Any]) -> int:
        """0 when done, 1 when the answer tells of a refusal."""
        return 1 if "error" in answer else 0

    def show(self, answer: dict[str, Any]) -> None:
        """Print the answer for a person."""
        self.stdout.write(json.dumps(answer, cls=DjangoJSONEncoder, indent=2, ensure_ascii=False))

    def progress(self, text: str) -> None:
        """Say what is going on, on stderr."""
        self.stderr.write(text)

    def handle(self, *args: Any, **options: Any) -> None:
        try:
            answer = self.answer(**options)
        except KerogateError as refusal:
            answer = {"error": refusal.as_dict()}
            self.stderr.write(str(refusal))
        if options["json"]:
            self.stdout.write(json.dumps(answer, cls=DjangoJSONEncoder, ensure_ascii=False))
        elif "error" not in answer:
            self.show(answer)
        status = self.exit_status(answer)
        if status:
            sys.exit(status)
