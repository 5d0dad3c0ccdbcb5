"""``manage.py bench``: how the service compares with plain scripts doing the same work, in the same run."""

import json
import os
import subprocess
import sys
import tempfile
from typing import Any

from django.core.management.base import CommandError, CommandParser

from labdata.env import CHECKOUT
from labdata.errors import KerogateError
from labdata.management.commands._base import ServiceCommand

NAMES = ("intake", "pile", "qc", "pull")
FORGOTTEN = ("DATABASE_URL", "CELERY_BROKER_URL", "SECRET_KEY")


class BenchFailed(KerogateError):
    """A benchmark could not be measured."""

    code = "bench_failed"


class Command(ServiceCommand):
    help = "Ratio benchmarks against plain baselines, on a temporary home: " + ", ".join(NAMES)
    requires_system_checks = []

    def arguments(self, parser: CommandParser) -> None:
        parser.add_argument("name", nargs="?", choices=NAMES, help="one benchmark (default: all)")
        parser.add_argument("--rows", type=int, default=10_000, help="rows of the long workbook (default: 10000)")
        parser.add_argument("--files", type=int, default=20, help="workbooks in the pile (default: 20)")
        parser.add_argument("--file-rows", type=int, default=250, help="rows of each of them (default: 250)")
        parser.add_argument("--runs", type=int, default=3, help="runs that a median is made of (default: 3)")

    def answer(self, **options: Any) -> dict[str, Any]:
        sizes = {name: options[name] for name in ("rows", "files", "file_rows", "runs")}
        if small := [name for name, size in sizes.items() if size < 1]:
            raise CommandError(f"--{small[0].replace('_', '-')} must be at least 1.", returncode=2)
        names = [options["name"]] if options["name"] else list(NAMES)
        with tempfile.TemporaryDirectory(prefix="kerogate-bench-") as home:
            return _measured(home, {"names": names, "sizes": sizes})

    def show(self, answer: dict[str, Any]) -> None:
        """One line a baseline: how many times its CPU time the service takes."""
        self.stdout.write(f"{'benchmark':10} {'size':26} {'CPU s':>8}  {'ratio':>7} {'aim':>5}  against")
        for one in answer["benchmarks"]:
            for name, baseline in one["baselines"].items():
                aim = "" if baseline["aim"] is None else f"{baseline['aim']:g}"
                line = f"{one['name']:10} {one['size']:26} {one['seconds']:8.2f}  {baseline['ratio']:7.2f} {aim:>5}  {name}"
                self.stdout.write(f"{line} ({baseline['seconds']:.2f} s)")


def _measured(home: str, request: dict[str, Any]) -> dict[str, Any]:
    """Ask a child process on its own home. Raises BenchFailed with its last words."""
    environment = {name: value for name, value in os.environ.items() if name not in FORGOTTEN}
    environment |= {"KEROGATE_HOME": home, "DJANGO_SETTINGS_MODULE": "labdata.settings"}
    done = subprocess.run(
        [sys.executable, "-m", "labdata.bench.child", json.dumps(request)],
        cwd=CHECKOUT, env=environment, stdout=subprocess.PIPE, text=True, check=False,
    )  # fmt: skip
    if done.returncode:
        raise BenchFailed("The benchmarks ended before their time.", remedy="The messages above say why.")
    answer: dict[str, Any] = json.loads(done.stdout.splitlines()[-1])
    return answer
