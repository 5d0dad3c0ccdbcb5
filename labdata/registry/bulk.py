"""The one door for many rows: executemany on SQLite, COPY on PostgreSQL, both with ids taken beforehand."""

from collections.abc import Iterable, Sequence
from itertools import islice
from typing import Any

from django.db import connection, models

CHUNK = 20_000


def take_ids(model: type[models.Model], count: int) -> list[int]:
    """``count`` primary keys that nothing else will use. Inside the writing transaction only."""
    if not count:
        return []
    table = model._meta.db_table
    with connection.cursor() as cursor:
        if connection.vendor == "postgresql":
            cursor.execute(
                "SELECT nextval(pg_get_serial_sequence(%s, 'id')) FROM generate_series(1, %s)", [table, count]
            )
            return [row[0] for row in cursor.fetchall()]
        cursor.execute("SELECT seq FROM sqlite_sequence WHERE name = %s", [table])
        last = cursor.fetchone()
    first = (last[0] if last else 0) + 1
    return list(range(first, first + count))


def insert(model: type[models.Model], columns: Sequence[str], rows: Iterable[tuple[Any, ...]]) -> None:
    """Insert rows of database values; ``columns`` are column names; without ``id`` the database numbers the rows.

    Raises IntegrityError when a row breaks a constraint. The transaction is the caller's.
    """
    table = connection.ops.quote_name(model._meta.db_table)
    names = ", ".join(connection.ops.quote_name(name) for name in columns)
    with connection.cursor() as cursor:
        if connection.vendor == "postgresql":
            _copy(cursor, f"COPY {table} ({names}) FROM STDIN", rows)
            return
        marks = ", ".join("?" for _ in columns)
        statement = f"INSERT INTO {table} ({names}) VALUES ({marks})"
        source = iter(rows)
        while chunk := list(islice(source, CHUNK)):
            _raw_executemany(cursor, statement, chunk)


def _copy(cursor: Any, statement: str, rows: Iterable[tuple[Any, ...]]) -> None:
    with connection.wrap_database_errors, cursor.cursor.copy(statement) as copy:
        for row in rows:
            copy.write_row(row)


def _raw_executemany(cursor: Any, statement: str, chunk: list[tuple[Any, ...]]) -> None:
    """Past Django's cursor wrappers, which rewrite and log every statement; its error translation is kept."""
    from sqlite3 import Cursor  # noqa: PLC0415

    with connection.wrap_database_errors:
        Cursor.executemany(cursor.cursor, statement, chunk)
