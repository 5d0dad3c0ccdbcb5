"""The benchmarks in a process of their own, on a home of their own: ``python -m labdata.bench.child '{...}'``."""

import json
import sys
from pathlib import Path
from typing import Any

import django


def run(request: dict[str, Any]) -> dict[str, Any]:
    """Measure what ``request`` names. The settings must point to an empty home."""
    django.setup()
    from django.conf import settings  # noqa: PLC0415 - only after the home is chosen

    from labdata.bench.suites import SUITES, Sizes  # noqa: PLC0415 - needs models
    from labdata.supervisor.setup import migrate  # noqa: PLC0415

    def say(text: str) -> None:
        print(text, file=sys.stderr, flush=True)

    migrate(Path(settings.HOME), say)
    measured = []
    for name in request["names"]:
        say(f"Measuring {name} ...")
        measured.append(SUITES[name](Sizes(**request["sizes"])).as_dict())
    return {"benchmarks": measured}


if __name__ == "__main__":
    print(json.dumps(run(json.loads(sys.argv[1]))))
