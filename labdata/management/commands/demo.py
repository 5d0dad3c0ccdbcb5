"""``manage.py demo``: the main job on an invented basin, served or run once to the end."""

import json
import sys
from typing import Any

from django.conf import settings
from django.core.management.base import CommandParser

from labdata.errors import KerogateError
from labdata.management.commands._base import ServiceCommand
from labdata.supervisor import announce, serve
from labdata.supervisor.lock import home_lock
from labdata.supervisor.setup import prepare_home, prepare_schema


class Command(ServiceCommand):
    help = "Show the whole job on an invented basin: intake, QC, review, sign-off, release; then serve it."
    requires_system_checks = []
    _announced = False

    def arguments(self, parser: CommandParser) -> None:
        parser.add_argument("--port", type=int, default=8000, help="0 takes a free one (default: 8000)")
        parser.add_argument("--once", action="store_true", help="run the whole job without a web server and exit")

    def handle(self, *args: Any, **options: Any) -> None:
        try:
            with home_lock(settings.HOME):
                if options["once"]:
                    self._once(as_json=options["json"])
                else:
                    self._serve(options["port"], as_json=options["json"])
        except KerogateError as refusal:
            self.stderr.write(str(refusal))
            if options["json"] and not self._announced:
                self._print({"error": refusal.as_dict()})
            sys.exit(1)
        except KeyboardInterrupt:
            self.stderr.write("Stopped before the end; the same command continues.")
            sys.exit(130)

    def _once(self, *, as_json: bool) -> None:
        from labdata.demo import scenario  # noqa: PLC0415 - models are not needed to read the arguments
        from labdata.demo.summary import summary  # noqa: PLC0415

        prepare_schema(self.progress)
        stage = scenario.set_stage(self.progress, must_sign=True)
        release = scenario.finish(stage)
        answer = summary(stage.project, release)
        self._tell(stage)
        if as_json:
            self._print(answer)
        else:
            self._show(answer)

    def _serve(self, port: int, *, as_json: bool) -> None:
        from labdata.demo import scenario  # noqa: PLC0415

        prepare_home(settings.HOME, self.progress)
        stage = scenario.set_stage(self.progress, must_sign=scenario.to_do())
        scenario.show(stage)
        account = self._tell(stage)

        def ready(url: str) -> None:
            self._announced = True
            if as_json:
                self._print({"url": url, "project": stage.project.slug, **account})
            else:
                announce(url)

        serve(port, settings.HOME, on_ready=ready)

    def _print(self, answer: dict[str, Any]) -> None:
        print(json.dumps(answer, ensure_ascii=False), flush=True)

    def _tell(self, stage: Any) -> dict[str, Any]:
        """Name the accounts, and their password if it was made up just now."""
        self.progress(f"Accounts: {', '.join(stage.users)}.")
        if not stage.made:
            return {}
        self.progress(f"Their password, shown this once: {stage.password}")
        return {"password": stage.password}

    def _show(self, answer: dict[str, Any]) -> None:
        """The summary for a person."""
        for file in answer["files"]:
            self.stdout.write(f"{file['file']:45} {file['outcome']}")
        counts = ", ".join(f"{answer[name]} {name}" for name in ("wells", "samples", "analyses", "results"))
        self.stdout.write(counts)
        self.stdout.write("decisions: " + ", ".join(f"{count} {name}" for name, count in answer["decisions"].items()))
        for fault in answer["faults"]:
            by = ", ".join(fault["caught_by"]) or "no rule"
            self.stdout.write(f"{'caught' if fault['caught'] else 'MISSED':7} {fault['fault']:20} {by}")
        release = answer["release"]
        self.stdout.write(
            f"release {release['number']} (id {release['id']}): {release['results']} results, {release['sha256']}"
        )
