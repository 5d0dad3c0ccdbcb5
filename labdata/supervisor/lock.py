"""One service per home folder: a lock that the operating system lets go of when the process ends, however it ends."""

import os
import sys
from pathlib import Path
from types import TracebackType
from typing import Self

from labdata.errors import Conflict

_HELD: set[Path] = set()


class HomeLock:
    """Use as a context manager, also nested. Raises Conflict when another process holds the home."""

    def __init__(self, home: Path) -> None:
        self._path = home.resolve() / "service.lock"
        self._handle = -1

    def __enter__(self) -> Self:
        if self._path in _HELD:
            return self
        self._path.parent.mkdir(parents=True, exist_ok=True)
        handle = os.open(self._path, os.O_RDWR | os.O_CREAT, 0o600)
        try:
            _lock(handle)
        except OSError:
            os.close(handle)
            raise Conflict(
                f"A service already runs on {self._path.parent}.", remedy="Stop it, or use another --home."
            ) from None
        self._handle = handle
        _HELD.add(self._path)
        return self

    def __exit__(self, kind: type[BaseException] | None, error: BaseException | None, at: TracebackType | None) -> None:
        if self._handle >= 0:
            _HELD.discard(self._path)
            os.close(self._handle)


def _lock(handle: int) -> None:
    if sys.platform == "win32":
        import msvcrt  # noqa: PLC0415 - Windows only

        msvcrt.locking(handle, msvcrt.LK_NBLCK, 1)
    else:
        import fcntl  # noqa: PLC0415 - not on Windows

        fcntl.flock(handle, fcntl.LOCK_EX | fcntl.LOCK_NB)
