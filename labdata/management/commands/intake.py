"""``manage.py intake``: bring laboratory files in and wait for the result."""

import json
from pathlib import Path
from typing import Any

from django.core.management.base import CommandError, CommandParser

from labdata.access import find_project, find_user
from labdata.errors import InvalidInput
from labdata.intake import services
from labdata.jobs import run_here
from labdata.management.commands._base import ServiceCommand
from labdata.models import Project, Upload
from labdata.projects import checked, open_from_command_line

DONE = {Upload.Outcome.IMPORTED, Upload.Outcome.IMPORTED_WITH_FINDINGS, Upload.Outcome.ALREADY_HELD}


class Command(ServiceCommand):
    help = "Bring laboratory files into a project and wait for the result."

    def arguments(self, parser: CommandParser) -> None:
        parser.add_argument("files", nargs="+", metavar="FILE", help="tables: .xlsx .xlsm .xls .ods .csv .tsv .txt")
        parser.add_argument("--project", required=True, metavar="SLUG")
        parser.add_argument("--create-project", action="store_true", help="make the project if there is none")
        parser.add_argument("--lab", default="", metavar="NAME", help="the laboratory that reported")
        parser.add_argument("--well", default="", metavar="NAME", help="the well of a file that names none")
        parser.add_argument("--create-wells", action="store_true", help="make wells that are not known yet")
        parser.add_argument("--answers", metavar="FILE", help="JSON object of question ids and answers")
        parser.add_argument("--user", metavar="NAME", help="on whose behalf (default: the service itself)")
        parser.add_argument("--dry-run", action="store_true", help="answer the same and write nothing")

    def answer(self, **options: Any) -> dict[str, Any]:
        """One entry a file. Raises NotFound, NotAllowed or InvalidInput before any file is read."""
        project = _project(options["project"], create=options["create_project"], dry=options["dry_run"])
        user = find_user(options["user"]) if options["user"] else None
        common = {
            "project": project, "lab": options["lab"], "well": options["well"], "create_wells": options["create_wells"],
            "answers": _answers(options["answers"]),
        }  # fmt: skip
        paths = [_readable(Path(name)) for name in options["files"]]
        return {"files": [self._one(path, common, user, options["dry_run"]) for path in paths]}

    def _one(self, path: Path, common: dict[str, Any], user: Any, dry_run: bool) -> dict[str, Any]:
        content = path.read_bytes()
        self.progress(f"{path.name} …")
        if dry_run:
            return services.preview(name=path.name, content=content, **common)
        upload = services.receive(name=path.name, content=content, user=user, **common)
        if upload.job is not None:
            job = run_here(upload.job)
            upload.refresh_from_db()
            if upload.outcome == Upload.Outcome.RECEIVED:
                return _failed(upload, job.error_message)
        return dict(upload.answer)

    def exit_status(self, answer: dict[str, Any]) -> int:
        """0 when every file is in or was held already."""
        if "error" in answer:
            return 1
        return 0 if all(entry["outcome"] in DONE for entry in answer["files"]) else 1

    def show(self, answer: dict[str, Any]) -> None:
        for entry in answer["files"]:
            counts = entry["counts"]
            self.stdout.write(
                f"{entry['file']}: {entry['outcome']}, {counts['results']} results, {counts['analyses']} analyses"
            )
            for finding in entry["findings"]:
                place = f"{finding['sheet']}!{finding['cell']}".strip("!")
                self.stdout.write(f"  {finding['level']} {place} {finding['message']} {finding['remedy']}")


def _readable(path: Path) -> Path:
    """``path``, opened once: a wrong name is said before any file of the command is taken in."""
    try:
        path.open("rb").close()
    except OSError as trouble:
        raise CommandError(f"«{path}» cannot be opened: {trouble.strerror}.", returncode=2) from trouble
    return path


def _project(slug: str, *, create: bool, dry: bool) -> Project:
    """The project, made when asked for; a dry run of a project that does not exist looks at an unsaved one."""
    if create and not Project.objects.filter(slug=slug).exists():
        return checked(slug) if dry else open_from_command_line(slug)
    return find_project(slug)


def _answers(path: str | None) -> dict[str, str]:
    if not path:
        return {}
    try:
        answers = json.loads(Path(path).read_text(encoding="utf-8"))
    except OSError as trouble:
        raise CommandError(f"«{path}» cannot be opened: {trouble.strerror}.", returncode=2) from trouble
    except ValueError as trouble:
        raise InvalidInput(
            f"«{path}» is not JSON: {trouble}.", remedy='Write an object such as {"unit:B": "ft"}.', file=path
        ) from trouble
    if not isinstance(answers, dict):
        raise InvalidInput(
            f"«{path}» does not hold a JSON object.", remedy='Write an object such as {"unit:B": "ft"}.', file=path
        )
    return answers


def _failed(upload: Upload, message: str) -> dict[str, Any]:
    """The entry of a file whose job ended without an answer."""
    finding = {
        "level": "error", "id": "job", "code": "job_failed", "sheet": "", "cell": "", "value": upload.file_name,
        "message": message or "The job ended without an answer.", "remedy": "Try again; the file is kept.",
    }  # fmt: skip
    return {
        **services.held_entry(upload.file_name, upload.source_file.sha256, None, upload.pk),
        "outcome": "refused",
        "findings": [finding],
    }
