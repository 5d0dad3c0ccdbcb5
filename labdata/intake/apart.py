"""Large workbooks are read in a child process with limits on memory and time, so that a hostile one cannot take the worker along."""

import os
import pickle
import subprocess
import sys
from pathlib import Path
from typing import TYPE_CHECKING

from labdata.intake.errors import UnreadableFile

if TYPE_CHECKING:
    from labdata.intake.workbook import Workbook

MEMORY_BYTES = 4 * 1024**3
SECONDS = 300
SMALL = (1024**3, 20)  # memory and time for a file that is not large itself


def read_apart(name: str, content: bytes, memory: int | None = None, seconds: int | None = None) -> "Workbook":
    """The workbook as read by a child process. Raises UnreadableFile when it cannot be read within the limits."""
    memory, seconds = memory or MEMORY_BYTES, seconds or SECONDS
    checkout = str(Path(__file__).resolve().parent.parent.parent)
    try:
        child = subprocess.run(
            [sys.executable, "-m", "labdata.intake.apart", name, str(memory), str(seconds)],
            input=content,
            capture_output=True,
            timeout=seconds,
            cwd=checkout,
            env={**os.environ, "PYTHONPATH": checkout},
            check=False,
        )
    except subprocess.TimeoutExpired:
        raise _too_much(name, f"it took more than {seconds} s") from None
    if child.returncode != 0:
        raise _too_much(name, f"the reader ended with status {child.returncode}")
    answer = pickle.loads(child.stdout)  # written by the child below, never by the file
    if isinstance(answer, dict):
        raise UnreadableFile(answer["message"], remedy=answer["remedy"], file=name)
    return answer  # type: ignore[no-any-return]


def _too_much(name: str, why: str) -> UnreadableFile:
    return UnreadableFile(
        f"«{name}» could not be read within the limits of memory and time ({why}).",
        remedy="Save the workbook again with only its used cells, split it, or send it as .csv.",
        file=name,
    )


def main(name: str, memory: int, seconds: int) -> int:
    """Read standard input, write the pickled workbook (or the refusal as a dict) to standard output."""
    import resource  # noqa: PLC0415

    from labdata.intake import workbook  # noqa: PLC0415

    resource.setrlimit(resource.RLIMIT_AS, (memory, memory))
    resource.setrlimit(resource.RLIMIT_CPU, (seconds, seconds))
    try:
        answer: object = workbook.read_here(name, sys.stdin.buffer.read())
    except UnreadableFile as refusal:
        answer = {"message": refusal.message, "remedy": refusal.remedy}
    pickle.dump(answer, sys.stdout.buffer, protocol=pickle.HIGHEST_PROTOCOL)
    return 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1], int(float(sys.argv[2])), int(float(sys.argv[3])) or 1))
