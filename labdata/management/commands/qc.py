"""Run the rules now and print what they found."""

from typing import Any

from django.core.management.base import CommandParser

from labdata.access import find_project
from labdata.errors import KerogateError, NotFound
from labdata.jobs import run_here
from labdata.management.commands._base import ServiceCommand
from labdata.models import JobState, Project, Well
from labdata.registry.names import name_key
from qc.models import QcRun
from qc.services import run_answer, start_run


class Command(ServiceCommand):
    help = "Run the QC rules over a project, or over some of its wells, and print the flags."

    def arguments(self, parser: CommandParser) -> None:
        parser.add_argument("--project", required=True, metavar="SLUG")
        parser.add_argument("--well", action="append", default=[], metavar="NAME", help="may be repeated; default: all")

    def answer(self, **options: Any) -> dict[str, Any]:
        project = find_project(options["project"])
        wells = [find_well(project, name) for name in options["well"]] or None
        job = run_here(start_run(project, wells, user=None))
        if job.state != JobState.SUCCEEDED:
            raise KerogateError(f"The run {job.state}: {job.error_message}", remedy="Run it again.", job=str(job.pk))
        return run_answer(QcRun.objects.select_related("rule_set").get(pk=job.result["run"]))

    def show(self, answer: dict[str, Any]) -> None:
        for flag in answer["flags"]:
            where = " ".join(part for part in (flag["well"], flag["sample"]) if part)
            self.stdout.write(f"{flag['severity']:16} {flag['rule']:26} {where}: {flag['message']}")
        checked = answer["checked"]
        self.stdout.write(
            f"{len(answer['flags'])} flags on {checked['results']} results of {checked['analyses']} analyses."
        )


def find_well(project: Project, name: str) -> Well:
    """The project's well by name, alias or identifier. Raises NotFound."""
    wells = Well.objects.filter(project=project)
    key = name_key(name)
    found = wells.filter(name_key=key) | wells.filter(aliases__name_key=key) | wells.filter(uwi=name)
    well = found.distinct().order_by("uwi").first()
    if well is None:
        known = ", ".join(wells.order_by("name_key").values_list("name", flat=True)[:20]) or "none yet"
        raise NotFound(f"Project «{project.slug}» has no well «{name}».", remedy=f"Wells: {known}.", well=name)
    return well
