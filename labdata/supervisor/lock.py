"""One service per home folder."""

from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from labdata.errors import Conflict
from labdata.locks import locked

_held: set[Path] = set()


@contextmanager
def home_lock(home: Path) -> Iterator[None]:
    """Hold ``home`` during the block; may be nested. Raises Conflict when another process holds it."""
    path = home.resolve() / "service.lock"
    if path in _held:
        yield
        return
    try:
        with locked(path, wait=False):
            _held.add(path)
            try:
                yield
            finally:
                _held.discard(path)
    except BlockingIOError:
        raise Conflict(f"A service already runs on {home}.", remedy="Stop it, or use another --home.") from None
