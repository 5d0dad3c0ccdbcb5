"""Locks on files, between processes; the operating system lets go when a process ends, however it ends.

Nothing but the standard library: the set-up on a bare machine uses it too.
"""

import os
import sys
import time
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

LOOK_SECONDS = 0.2


@contextmanager
def locked(path: Path, *, wait: bool) -> Iterator[None]:
    """Hold the lock file ``path`` during the block. Raises BlockingIOError when it is held and ``wait`` is False."""
    path.parent.mkdir(parents=True, exist_ok=True)
    handle = os.open(path, os.O_RDWR | os.O_CREAT, 0o600)
    try:
        while not _taken(handle):
            if not wait:
                raise BlockingIOError(f"{path} is held by another process")
            time.sleep(LOOK_SECONDS)
        yield
    finally:
        os.close(handle)


def _taken(handle: int) -> bool:
    """Try once."""
    try:
        if sys.platform == "win32":
            import msvcrt  # noqa: PLC0415 - Windows only

            msvcrt.locking(handle, msvcrt.LK_NBLCK, 1)
        else:
            import fcntl  # noqa: PLC0415 - not on Windows

            fcntl.flock(handle, fcntl.LOCK_EX | fcntl.LOCK_NB)
    except OSError:
        return False
    return True
