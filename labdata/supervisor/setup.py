"""Making a home folder ready: schema, seeds, triggers, static files."""

import hashlib
from collections.abc import Callable
from pathlib import Path

from django.conf import settings
from django.contrib.staticfiles.finders import get_finders
from django.core.management import call_command
from django.db import connection, connections
from django.db.migrations.executor import MigrationExecutor
from django.utils import timezone

from labdata import backups, triggers
from labdata.errors import Conflict
from labdata.locks import locked

STAMP = ".made-from"
UNUSED = ("rest_framework", "drf_spectacular")  # the pages of the API's libraries, which are not served
Say = Callable[[str], None]


def prepare_home(home: Path, say: Say) -> None:
    """Bring database and static files of ``home`` up to this version; safe to repeat.

    A SQLite database with data in it is copied to ``backups/`` before its schema changes. Raises Conflict when the
    database was made by a newer version.
    """
    with locked(home / "set-up.lock", wait=True):
        migrate(home, say)
        collect_static(home)
    connections.close_all()


def collect_static(home: Path) -> None:
    """Gather, name by content and compress what browsers load, unless that was done for these very files."""
    stamp = home / "static" / STAMP
    sources = _static_sources()
    if stamp.exists() and stamp.read_text(encoding="ascii") == sources:
        return
    call_command("collectstatic", interactive=False, verbosity=0, ignore_patterns=[*UNUSED])
    stamp.write_text(sources, encoding="ascii")


def _static_sources() -> str:
    """Digest over name, size and time of every static file of the program."""
    digest = hashlib.sha256()
    for finder in get_finders():
        for name, storage in finder.list([*UNUSED]):
            digest.update(f"{name} {storage.size(name)} {storage.get_modified_time(name).isoformat()}\n".encode())
    return digest.hexdigest()


def prepare_schema(say: Say) -> None:
    """Bring the database up to this version if it is not; quick when it is. Raises Conflict like ``migrate``."""
    with locked(settings.HOME / "set-up.lock", wait=True):
        executor = MigrationExecutor(connection)
        wanted = set(executor.loader.graph.leaf_nodes())
        if not wanted <= set(executor.loader.applied_migrations):
            migrate(settings.HOME, say)


def migrate(home: Path, say: Say) -> None:
    """Apply what is pending; every run re-creates the append-only triggers and the seeds."""
    executor = MigrationExecutor(connection)
    applied = set(executor.loader.applied_migrations)
    _refuse_newer(applied - set(executor.loader.graph.nodes))
    plan = executor.migration_plan(executor.loader.graph.leaf_nodes())
    if plan and applied and connection.vendor == "sqlite":
        copy = home / "backups" / f"before-migration-{timezone.now():%Y%m%dT%H%M%S}.sqlite3"
        say(f"Copying the database to {copy} before its schema changes.")
        backups.copy_sqlite(Path(connection.settings_dict["NAME"]), copy)
    elif applied and not plan and (gone := triggers.missing(connection)):
        say(f"The triggers {', '.join(gone)} were missing and are made again; run `manage.py audit`.")
    if plan:
        say(f"Preparing the database: {len(plan)} migrations.")
    call_command("migrate", interactive=False, verbosity=0)


def _refuse_newer(unknown: set[tuple[str, str]]) -> None:
    ours = sorted(f"{app}.{name}" for app, name in unknown if app in {"labdata", "qc"})
    if ours:
        raise Conflict(
            f"The database was made by another version of this program: it has {', '.join(ours)}.",
            remedy="Use the version that made it, or another --home.",
        )
