"""``manage.py up``: the service on one's own data."""

import json
import os
import sys
from typing import Any

from django.conf import settings
from django.core.management.base import CommandParser

from labdata import accounts
from labdata.errors import KerogateError
from labdata.management.commands._base import ServiceCommand
from labdata.supervisor import announce, serve
from labdata.supervisor.lock import home_lock
from labdata.supervisor.setup import prepare_home


class Command(ServiceCommand):
    help = "Start web server and workers on the home folder and keep them running until Ctrl-C or SIGTERM."
    requires_system_checks = []
    _announced = False

    def arguments(self, parser: CommandParser) -> None:
        parser.add_argument("--port", type=int, default=8000, help="0 takes a free one (default: 8000)")

    def handle(self, *args: Any, **options: Any) -> None:
        try:
            with home_lock(settings.HOME):
                self._serve(options["port"], as_json=options["json"])
        except KerogateError as refusal:
            self.stderr.write(str(refusal))
            if options["json"] and not self._announced:
                self._print({"error": refusal.as_dict()})
            sys.exit(1)

    def _serve(self, port: int, *, as_json: bool) -> None:
        prepare_home(settings.HOME, self.progress)
        made = accounts.first_administrator()
        account = self._tell(made) if made else {}

        def ready(url: str) -> None:
            self._announced = True
            if as_json:
                self._print({"url": url, **account})
            else:
                announce(url)

        serve(port, settings.HOME, on_ready=ready)

    def _print(self, answer: dict[str, Any]) -> None:
        print(json.dumps(answer, ensure_ascii=False), flush=True)

    def _tell(self, made: tuple[str, str]) -> dict[str, Any]:
        """Say the new account's name, and its password unless it was given from outside."""
        name, password = made
        if os.environ.get("KEROGATE_ADMIN_PASSWORD"):
            self.progress(f"Account «{name}» made with the password from KEROGATE_ADMIN_PASSWORD.")
            return {"account": name}
        self.progress(f"Account «{name}» made. Its password, shown this once: {password}")
        return {"account": name, "password": password}
