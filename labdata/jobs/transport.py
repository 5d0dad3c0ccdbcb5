"""Messages of the embedded service: one SQLite file, polled. It holds nothing that matters and is wiped at start.

Kombu's own SQL transport keeps every message row for ever, looks once a second, and takes the file from a URL,
which not every folder name survives. This one deletes what it delivers, looks five times a second, and takes
``path`` from the transport options as it is.
"""

import json
import logging
import sqlite3
from contextlib import suppress
from pathlib import Path
from queue import Empty
from typing import Any

from kombu.transport import virtual

logger = logging.getLogger(__name__)
BUSY_SECONDS = 20
TABLE = (
    "CREATE TABLE IF NOT EXISTS message (id INTEGER PRIMARY KEY AUTOINCREMENT, queue TEXT NOT NULL, "
    "payload TEXT NOT NULL)"
)
INDEX = "CREATE INDEX IF NOT EXISTS message_queue ON message (queue, id)"


class Channel(virtual.Channel):
    """A channel over one SQLite connection; kombu never uses one from two threads at a time."""

    _file: sqlite3.Connection | None = None

    def _open_file(self) -> sqlite3.Connection:
        if self._file is None:
            options: dict[str, Any] = self.connection.client.transport_options  # type: ignore[union-attr,assignment]
            file = sqlite3.connect(options["path"], timeout=BUSY_SECONDS, isolation_level=None, check_same_thread=False)
            for statement in ("PRAGMA journal_mode=WAL", "PRAGMA synchronous=OFF", TABLE, INDEX):
                file.execute(statement)
            self._file = file
        return self._file

    def _new_queue(self, queue: str, **_: Any) -> None:
        self._open_file()

    def _put(self, queue: str, message: dict[str, Any], **_: Any) -> None:
        self._open_file().execute("INSERT INTO message (queue, payload) VALUES (?, ?)", (queue, json.dumps(message)))

    def _get(self, queue: str, timeout: float | None = None) -> dict[str, Any]:
        """The oldest message, deleted as it is read. Raises Empty."""
        file = self._open_file()
        first = "SELECT id, payload FROM message WHERE queue = ? ORDER BY id LIMIT 1"
        while row := file.execute(first, (queue,)).fetchone():
            if not file.execute("DELETE FROM message WHERE id = ?", (row[0],)).rowcount:
                continue  # another worker was faster
            try:
                message: dict[str, Any] = json.loads(row[1])
                return message
            except ValueError:
                logger.warning("message %s is not readable and was dropped", row[0])
        raise Empty

    def _purge(self, queue: str) -> int:
        return self._open_file().execute("DELETE FROM message WHERE queue = ?", (queue,)).rowcount

    def _size(self, queue: str) -> int:
        row = self._open_file().execute("SELECT COUNT(*) FROM message WHERE queue = ?", (queue,)).fetchone()
        return int(row[0])

    def close(self) -> None:
        super().close()
        if self._file is not None:
            with suppress(sqlite3.Error):
                self._file.close()
            self._file = None


class Transport(virtual.Transport):
    """Kombu finds this class under the URL scheme that labdata/celery.py names."""

    Channel = Channel
    polling_interval = 0.2
    default_port = 0
    driver_type = "sqlite"
    driver_name = "sqlite3"
    connection_errors = (*virtual.Transport.connection_errors, sqlite3.Error, OSError)

    def driver_version(self) -> str:
        return sqlite3.sqlite_version


def wipe(path: Path) -> None:
    """Forget all messages: delete the file and its companions. Only before any worker runs."""
    for companion in ("", "-wal", "-shm", "-journal"):
        Path(f"{path}{companion}").unlink(missing_ok=True)
