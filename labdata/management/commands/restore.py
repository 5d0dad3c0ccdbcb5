"""``manage.py restore DIR``: put a copy into an empty home."""

from pathlib import Path
from typing import Any

from django.conf import settings
from django.core.management.base import CommandParser

from labdata import backups
from labdata.management.commands._base import ServiceCommand
from labdata.supervisor.lock import home_lock


class Command(ServiceCommand):
    help = "Put a copy that `backup` made into an empty home folder; a damaged copy is refused."

    def arguments(self, parser: CommandParser) -> None:
        parser.add_argument("directory", type=Path, help="the folder that `backup` made")

    def answer(self, **options: Any) -> dict[str, Any]:
        with home_lock(settings.HOME):
            source = options["directory"].expanduser().absolute()
            return {"home": str(settings.HOME), **backups.restore(source)}

    def show(self, answer: dict[str, Any]) -> None:
        self.stdout.write(f"{len(answer['files'])} files of {answer['made_at']} restored to {answer['home']}.")
