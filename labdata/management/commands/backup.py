"""``manage.py backup DIR``: a consistent copy while the service runs."""

from pathlib import Path
from typing import Any

from django.core.management.base import CommandParser

from labdata import backups
from labdata.management.commands._base import ServiceCommand


class Command(ServiceCommand):
    help = "Copy database and files to a new folder, with a manifest of checksums."

    def arguments(self, parser: CommandParser) -> None:
        parser.add_argument("directory", type=Path, help="a new or empty folder")

    def answer(self, **options: Any) -> dict[str, Any]:
        target = options["directory"].expanduser().absolute()
        return {"directory": str(target), **backups.back_up(target)}

    def show(self, answer: dict[str, Any]) -> None:
        self.stdout.write(f"{len(answer['files'])} files copied to {answer['directory']}.")
