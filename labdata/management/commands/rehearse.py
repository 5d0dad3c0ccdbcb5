"""Put known faults into a copy of the project's results and print which the rules catch."""

from typing import Any

from django.core.management.base import CommandError, CommandParser

from labdata.access import find_project
from labdata.errors import KerogateError
from labdata.jobs import run_here
from labdata.management.commands._base import ServiceCommand
from labdata.models import JobState
from qc.rehearsal.run import REPEATS
from qc.rehearsal.services import SEED, start_rehearsal


class Command(ServiceCommand):
    help = "Inject known faults into a copy of the project's results, run the rules, print what they catch. Changes no result."

    def arguments(self, parser: CommandParser) -> None:
        parser.add_argument("--project", required=True, metavar="SLUG")
        parser.add_argument(
            "--seed", type=int, default=SEED, metavar="N", help="the same seed gives the same faults (default: 1)"
        )
        parser.add_argument(
            "--repeats", type=int, default=REPEATS, metavar="N", help="copies a kind and strength (default: 1)"
        )

    def answer(self, **options: Any) -> dict[str, Any]:
        if options["repeats"] < 1 or options["seed"] < 0:
            raise CommandError("--repeats must be at least 1 and --seed not negative.", returncode=2)
        project = find_project(options["project"])
        self.progress(f"Rehearsing on a copy of the results of {project.name}; this takes a minute or two.")
        job = run_here(start_rehearsal(project, None, seed=options["seed"], repeats=options["repeats"]))
        if job.state != JobState.SUCCEEDED:
            raise KerogateError(
                f"The rehearsal {job.state}: {job.error_message}", remedy="Run it again.", job=str(job.pk)
            )
        return dict(job.result)

    def show(self, answer: dict[str, Any]) -> None:
        for one in answer["kinds"]:
            if not one["applicable"]:
                self.stdout.write(f"{one['kind']:24} {one['strength']:9} not applicable: {one['reason']}")
                continue
            rules = ", ".join(f"{rule} {number}" for rule, number in one["rules"].items()) or "no rule"
            share = f"{one['caught']}/{one['injected']}"
            self.stdout.write(f"{one['kind']:24} {one['strength']:9} {share:>7} {one['rate']:7.1%}  {rules}")
        alarms = answer["false_alarms"]
        self.stdout.write(
            f"False alarms: {alarms['flagged']} of {alarms['analyses']} analyses without an accepted fault; "
            f"{alarms['after_injection']['flagged']} of {alarms['after_injection']['samples']} untouched samples after injection."
        )
