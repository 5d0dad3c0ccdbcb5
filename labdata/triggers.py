"""Triggers that make tables append-only in the database itself, on SQLite and PostgreSQL alike.

``APPEND_ONLY`` tables refuse UPDATE and DELETE; ``FROZEN`` tables refuse DELETE and every UPDATE that touches more
than the named columns. The audit chain also refuses an insert that does not continue it (SQLite replaces a row on
``INSERT OR REPLACE`` without a delete trigger unless recursive triggers are on). The triggers are installed after
every migration (qc/apps.py), since a migration that rebuilds a table on SQLite drops them.
"""

from django.db.backends.base.base import BaseDatabaseWrapper

APPEND_ONLY = ("labdata_auditentry", "qc_decision", "qc_signoff", "qc_reopening", "qc_flaganswer", "qc_note")
FROZEN = {
    "labdata_result": ("current",),
    "labdata_release": ("withdrawn_at", "withdrawn_by_id", "withdrawn_reason"),
}


def names() -> list[str]:
    """Every trigger that must exist."""
    made = [f"{table}_{act}" for table in (*APPEND_ONLY, *FROZEN) for act in ("no_update", "no_delete")]
    return [*made, "labdata_auditentry_chain"]


def install(connection: BaseDatabaseWrapper) -> None:
    """Create all triggers of the tables that exist; existing ones are replaced."""
    remove(connection)
    existing = set(connection.introspection.table_names())
    make = _postgresql if connection.vendor == "postgresql" else _sqlite
    with connection.cursor() as cursor:
        for table in (*APPEND_ONLY, *FROZEN):
            if table in existing:
                columns = [column.name for column in connection.introspection.get_table_description(cursor, table)]
                for statement in make(table, columns):
                    cursor.execute(statement)


def remove(connection: BaseDatabaseWrapper) -> None:
    """Drop all triggers (tests empty tables between cases; nothing else has a reason to)."""
    existing = set(connection.introspection.table_names())
    with connection.cursor() as cursor:
        for name in names():
            table = name.rsplit("_no_", 1)[0].removesuffix("_chain")
            if table in existing:
                on = f" ON {table}" if connection.vendor == "postgresql" else ""
                cursor.execute(f"DROP TRIGGER IF EXISTS {name}{on}")


def missing(connection: BaseDatabaseWrapper) -> list[str]:
    """Names of triggers that should exist and do not."""
    query = (
        "SELECT tgname FROM pg_trigger WHERE NOT tgisinternal"
        if connection.vendor == "postgresql"
        else "SELECT name FROM sqlite_master WHERE type = 'trigger'"
    )
    with connection.cursor() as cursor:
        cursor.execute(query)
        present = {row[0] for row in cursor.fetchall()}
    return [name for name in names() if name not in present]


def _differs(columns: list[str], free: tuple[str, ...], operator: str) -> str:
    return " OR ".join(f'NEW."{name}" {operator} OLD."{name}"' for name in columns if name not in free)


def _sqlite(table: str, columns: list[str]) -> list[str]:
    refuse = f"BEGIN SELECT RAISE(ABORT, '{table} is append-only'); END"
    when = f" WHEN {_differs(columns, FROZEN[table], 'IS NOT')}" if table in FROZEN else ""
    made = [
        f"CREATE TRIGGER {table}_no_update BEFORE UPDATE ON {table}{when} {refuse}",
        f"CREATE TRIGGER {table}_no_delete BEFORE DELETE ON {table} {refuse}",
    ]
    if table == "labdata_auditentry":
        made.append(
            f"CREATE TRIGGER {table}_chain BEFORE INSERT ON {table} WHEN NEW.seq <> "
            f"(SELECT COALESCE(MAX(seq), 0) + 1 FROM {table}) OR NEW.prev_hash <> COALESCE("
            f"(SELECT hash FROM {table} ORDER BY seq DESC LIMIT 1), '{'0' * 64}') "
            f"BEGIN SELECT RAISE(ABORT, 'the entry does not continue the audit chain'); END"
        )
    return made


def _postgresql(table: str, columns: list[str]) -> list[str]:
    refuse = f"{table}_refuse"
    when = f"WHEN ({_differs(columns, FROZEN[table], 'IS DISTINCT FROM')}) " if table in FROZEN else ""
    made = [
        f"CREATE OR REPLACE FUNCTION {refuse}() RETURNS trigger LANGUAGE plpgsql AS "
        f"$$ BEGIN RAISE EXCEPTION '{table} is append-only' USING ERRCODE = 'integrity_constraint_violation'; END $$",
        f"CREATE TRIGGER {table}_no_update BEFORE UPDATE ON {table} FOR EACH ROW {when}EXECUTE FUNCTION {refuse}()",
        f"CREATE TRIGGER {table}_no_delete BEFORE DELETE ON {table} FOR EACH ROW EXECUTE FUNCTION {refuse}()",
    ]
    if table == "labdata_auditentry":
        made += [
            f"CREATE OR REPLACE FUNCTION {table}_continues() RETURNS trigger LANGUAGE plpgsql AS $$ "
            f"DECLARE last_seq bigint; last_hash text; BEGIN "
            f"SELECT seq, hash INTO last_seq, last_hash FROM {table} ORDER BY seq DESC LIMIT 1; "
            f"IF NEW.seq <> COALESCE(last_seq, 0) + 1 OR NEW.prev_hash <> COALESCE(last_hash, '{'0' * 64}') THEN "
            f"RAISE EXCEPTION 'the entry does not continue the audit chain' "
            f"USING ERRCODE = 'integrity_constraint_violation'; END IF; RETURN NEW; END $$",
            f"CREATE TRIGGER {table}_chain BEFORE INSERT ON {table} FOR EACH ROW EXECUTE FUNCTION {table}_continues()",
        ]
    return made
