"""A consistent copy of everything while the service runs, and putting it back.

The database is copied first and the files after it: files are named by their content, so that a file too many does
no harm and a file that the database knows of is never missing. The manifest names every file with its SHA-256.
"""

import hashlib
import json
import os
import shutil
import sqlite3
import subprocess
from collections.abc import Iterator
from contextlib import closing
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

from django.conf import settings
from django.db import connection

from labdata.errors import Conflict, InvalidInput, KerogateError

MANIFEST = "manifest.json"
FORMAT = 1
SQLITE_COPY = "kerogate.sqlite3"
POSTGRESQL_COPY = "kerogate.pgdump"
KEPT = ("files", "releases")
OWN = {"secret_key", "service.lock", "set-up.lock"}  # what a command makes of an empty home, and a key brought along
CHUNK = 1 << 20
LOCK_SECONDS = 60


class BackupDamaged(KerogateError):
    """The copy is not what its manifest says."""

    code = "backup_damaged"


def back_up(target: Path) -> dict[str, Any]:
    """Copy database and files to the new folder ``target``. Returns the manifest.

    Raises InvalidInput when ``target`` exists and is not empty. What is half done is removed again.
    """
    _refuse_full(target)
    work = target.with_name(f".{target.name}.unfinished")
    shutil.rmtree(work, ignore_errors=True)
    work.mkdir(parents=True)
    try:
        database = _copy_database(work)
        for folder in KEPT:
            _copy_tree(settings.HOME / folder, work / folder)
        manifest = _manifest(work, database)
        _write(work / MANIFEST, json.dumps(manifest, indent=1).encode())
        if target.exists():
            target.rmdir()
        work.rename(target)
    except BaseException:
        shutil.rmtree(work, ignore_errors=True)
        raise
    return manifest


def restore(source: Path) -> dict[str, Any]:
    """Put the copy ``source`` into the home folder. Returns its manifest.

    Raises BackupDamaged when a file is missing or altered, Conflict when the home already holds data.
    """
    manifest = verify(source)
    _refuse_home_with_data()
    for folder in KEPT:
        _copy_tree(source / folder, settings.HOME / folder)
    if manifest["database"] == SQLITE_COPY:
        _restore_sqlite(source / SQLITE_COPY)
    else:
        _restore_postgresql(source / POSTGRESQL_COPY)
    return manifest


def verify(source: Path) -> dict[str, Any]:
    """Read the manifest and compare every file with it. Raises BackupDamaged naming what is wrong."""
    try:
        manifest: dict[str, Any] = json.loads((source / MANIFEST).read_text())
        named = {str(name): str(digest) for name, digest in manifest["files"].items()}
        database = manifest["database"]
    except (OSError, ValueError, KeyError, AttributeError, TypeError) as error:
        raise BackupDamaged(
            f"{source} has no readable {MANIFEST}: {error}.", remedy="Name the folder that `backup` made."
        ) from None
    present = {str(path.relative_to(source).as_posix()): path for path in _files(source)}
    wrong = [name for name, digest in named.items() if name not in present or sha256(present[name]) != digest]
    wrong += [name for name in present if name not in named and name != MANIFEST]
    if wrong or database not in named:
        raise BackupDamaged(
            f"{len(wrong) or 1} files of the copy are missing, altered or foreign: {', '.join(wrong[:5]) or database}.",
            remedy="Use another copy; nothing was restored.",
        )
    return manifest


def copy_sqlite(source: Path, target: Path) -> None:
    """Copy one SQLite file, also while others write to it, and check the copy. Raises BackupDamaged."""
    target.parent.mkdir(parents=True, exist_ok=True)
    unfinished = target.with_name(f"{target.name}.unfinished")
    unfinished.unlink(missing_ok=True)
    with _open(source) as live:
        live.execute("VACUUM INTO ?", [str(unfinished)])
    with _open(unfinished) as copy:
        answer = copy.execute("PRAGMA integrity_check").fetchone()[0]
    if answer != "ok":
        raise BackupDamaged(f"The copy of {source} does not hold: {answer}.", remedy="Check the disk.")
    _sync(unfinished)
    unfinished.replace(target)


def sha256(path: Path) -> str:
    """SHA-256 of a file's bytes, in hexadecimal."""
    digest = hashlib.sha256()
    with path.open("rb") as stream:
        while chunk := stream.read(CHUNK):
            digest.update(chunk)
    return digest.hexdigest()


def _open(path: Path) -> closing[sqlite3.Connection]:
    """A plain connection to a SQLite file, closed at the end of the block."""
    return closing(sqlite3.connect(path, timeout=LOCK_SECONDS, isolation_level=None))


def _manifest(work: Path, database: str) -> dict[str, Any]:
    files = {path.relative_to(work).as_posix(): sha256(path) for path in _files(work)}
    return {
        "format": FORMAT, "made_at": datetime.now(UTC).isoformat(timespec="seconds"), "database": database,
        "files": dict(sorted(files.items())),
    }  # fmt: skip


def _files(folder: Path) -> Iterator[Path]:
    return (path for path in sorted(folder.rglob("*")) if path.is_file())


def _copy_tree(source: Path, target: Path) -> None:
    """Copy finished files; names that begin with a dot are still being written."""
    for path in _files(source) if source.is_dir() else ():
        if path.name.startswith("."):
            continue
        copy = target / path.relative_to(source)
        copy.parent.mkdir(parents=True, exist_ok=True)
        shutil.copyfile(path, copy)
        _sync(copy)


def _copy_database(work: Path) -> str:
    if connection.vendor == "sqlite":
        copy_sqlite(Path(connection.settings_dict["NAME"]), work / SQLITE_COPY)
        return SQLITE_COPY
    _run_postgresql("pg_dump", "--format=custom", f"--file={work / POSTGRESQL_COPY}")
    return POSTGRESQL_COPY


def _restore_sqlite(copy: Path) -> None:
    if connection.vendor != "sqlite":
        raise Conflict("The copy is of SQLite, and DATABASE_URL names PostgreSQL.", remedy="Unset DATABASE_URL.")
    connection.close()
    target = Path(connection.settings_dict["NAME"])
    for companion in ("-wal", "-shm"):
        Path(f"{target}{companion}").unlink(missing_ok=True)
    unfinished = target.with_name(f"{target.name}.unfinished")
    shutil.copyfile(copy, unfinished)
    _sync(unfinished)
    unfinished.replace(target)


def _restore_postgresql(copy: Path) -> None:
    if connection.vendor != "postgresql":
        raise Conflict("The copy is of PostgreSQL, and this home uses SQLite.", remedy="Set DATABASE_URL.")
    _run_postgresql(
        "pg_restore", "--no-owner", "--exit-on-error", "--single-transaction", str(copy), database="--dbname"
    )


def _run_postgresql(program: str, *arguments: str, database: str = "--dbname") -> None:
    """Run one of PostgreSQL's own programs on the configured database. Raises KerogateError."""
    if shutil.which(program) is None:
        raise KerogateError(f"{program} is not installed.", remedy="Install PostgreSQL's client programs.")
    given = connection.settings_dict
    environment = {
        **os.environ, "PGHOST": given["HOST"] or "", "PGPORT": str(given["PORT"] or ""), "PGUSER": given["USER"] or "",
        "PGPASSWORD": given["PASSWORD"] or "",
    }  # fmt: skip
    environment = {name: value for name, value in environment.items() if value or not name.startswith("PG")}
    command = [program, f"{database}={given['NAME']}", *arguments]
    done = subprocess.run(command, env=environment, capture_output=True, text=True, check=False)
    if done.returncode:
        raise KerogateError(f"{program} failed: {done.stderr.strip()}", remedy="Nothing else was done.")


def _refuse_full(target: Path) -> None:
    if target.exists() and (not target.is_dir() or any(target.iterdir())):
        raise InvalidInput(f"{target} already exists and is not an empty folder.", remedy="Name a new folder.")


def _refuse_home_with_data() -> None:
    """A home that holds anything is never written into."""
    home = settings.HOME
    holding = [path.name for path in sorted(home.iterdir()) if path.name not in OWN and _holds(path)]
    if connection.vendor == "postgresql" and "django_migrations" in connection.introspection.table_names():
        holding.append("the PostgreSQL database")
    if holding:
        raise Conflict(
            f"The home {home} already holds data ({', '.join(holding[:5])}).", remedy="Restore into a new --home."
        )


def _holds(path: Path) -> bool:
    return any(path.iterdir()) if path.is_dir() else path.stat().st_size > 0


def _write(path: Path, content: bytes) -> None:
    path.write_bytes(content)
    _sync(path)


def _sync(path: Path) -> None:
    with path.open("rb+") as stream:
        os.fsync(stream.fileno())
