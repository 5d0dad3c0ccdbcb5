"""``manage.py template``: an empty workbook for a laboratory, by method."""

from pathlib import Path
from typing import Any

from django.core.management.base import CommandError, CommandParser

from labdata.intake import templates_out
from labdata.management.commands._base import ServiceCommand


class Command(ServiceCommand):
    help = "Write an empty workbook of a method: what we would like a laboratory to fill in and send."

    def arguments(self, parser: CommandParser) -> None:
        names = ", ".join(code for code, _ in templates_out.methods())
        parser.add_argument("method", metavar="METHOD", help=f"one of {names}")
        parser.add_argument("--out", required=True, metavar="FILE", help="where the .xlsx goes")

    def answer(self, **options: Any) -> dict[str, Any]:
        """Raises NotFound for a method that is none; wrong usage when the file cannot be written."""
        content = templates_out.build(options["method"])
        path = Path(options["out"])
        try:
            path.write_bytes(content)
        except OSError as trouble:
            raise CommandError(f"«{path}» cannot be written: {trouble.strerror}.", returncode=2) from trouble
        return {"method": options["method"], "file": str(path), "bytes": len(content)}

    def show(self, answer: dict[str, Any]) -> None:
        self.stdout.write(f"{answer['file']}: empty workbook for {answer['method']}")
