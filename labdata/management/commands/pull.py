"""``pull``: a release, or today's working data, as a file: the same bytes that the API gives."""

import hashlib
import shutil
from pathlib import Path
from typing import Any

from django.core.management.base import CommandError, CommandParser

from labdata.access import find_project
from labdata.errors import InvalidInput, NotFound
from labdata.management.commands._base import ServiceCommand
from labdata.models import Release
from labdata.release.export import FORMATS
from labdata.release.pull import Download, pull_current, pull_release
from labdata.release.shapes import SHAPES

LARGEST_ID = 2**63 - 1


class Command(ServiceCommand):
    help = "Write a release, or today's working data of a project, to a file."

    def arguments(self, parser: CommandParser) -> None:
        parser.add_argument(
            "--release", type=int, metavar="ID", help="id of the release, as release and the API give it"
        )
        parser.add_argument("--project", metavar="SLUG", help="with --current: the project")
        parser.add_argument("--current", action="store_true", help="today's data, every result with its verdict")
        parser.add_argument("--format", choices=list(FORMATS), default="parquet")
        parser.add_argument("--shape", choices=list(SHAPES), default="long", help="a row a result, or an analysis")
        parser.add_argument("--include", choices=["rejected"], default="", help="rejected values of the release too")
        parser.add_argument("--out", required=True, metavar="FILE")

    def answer(self, **options: Any) -> dict[str, Any]:
        if options["current"] == (options["release"] is not None) or options["current"] != bool(options["project"]):
            raise CommandError("Give either --release ID, or --project SLUG --current.", returncode=2)
        if options["current"] and options["include"]:
            raise CommandError("--include goes with --release; --current has every verdict anyway.", returncode=2)
        download = self._download(options)
        sha256 = _save(download, Path(options["out"]))
        kind = download.content_type.split(";")[0]
        return {
            "out": options["out"], "format": options["format"], "shape": options["shape"], "content_type": kind,
            "bytes": download.size, "sha256": sha256,
        }  # fmt: skip

    def _download(self, options: dict[str, Any]) -> Download:
        asked = {"format_name": options["format"], "shape": options["shape"]}
        if options["current"]:
            return pull_current(find_project(options["project"]), **asked)
        wanted = options["release"]
        release = Release.objects.select_related("project").filter(pk=wanted).first() if wanted <= LARGEST_ID else None
        if release is None:
            raise NotFound(
                f"There is no release {wanted}.", remedy="The command release prints the id.", release=wanted
            )
        if release.withdrawn_at:
            self.progress(f"{release} was withdrawn: {release.withdrawn_reason}")
        return pull_release(release, include=options["include"], **asked)

    def show(self, answer: dict[str, Any]) -> None:
        self.stdout.write(f"{answer['out']}: {answer['bytes']} bytes, SHA-256 {answer['sha256']}")


def _save(download: Download, path: Path) -> str:
    """Write the file and return its SHA-256. Raises InvalidInput when it cannot be written there."""
    try:
        with download.file, path.open("wb") as out:
            shutil.copyfileobj(download.file, out)
        with path.open("rb") as written:
            return hashlib.file_digest(written, "sha256").hexdigest()
    except OSError as error:
        raise InvalidInput(f"{path} cannot be written: {error.strerror}.", remedy="Name another --out.") from None
