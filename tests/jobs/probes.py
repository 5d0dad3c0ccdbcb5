"""Handlers for tests only: each leaves one row per applied job in a table that forbids nothing."""

import os
import time
from dataclasses import replace

from django.db import connection

from labdata.jobs import JobError, kinds
from labdata.jobs.kinds import Kind

TABLE = "CREATE TABLE IF NOT EXISTS probe_effect (job TEXT NOT NULL, attempt INTEGER NOT NULL)"


def make_table():
    with connection.cursor() as cursor:
        cursor.execute(TABLE)


def effects():
    """How often each job was applied, by job id."""
    with connection.cursor() as cursor:
        cursor.execute("SELECT job, COUNT(*) FROM probe_effect GROUP BY job")
        return dict(cursor.fetchall())


def _effect(ctx):
    def commit():
        with connection.cursor() as cursor:
            cursor.execute("INSERT INTO probe_effect VALUES (%s, %s)", [str(ctx.job.pk), ctx.job.attempt])
        time.sleep(ctx.job.params.get("commit_seconds", 0))
        return {"attempt": ctx.job.attempt}

    return commit


def work(ctx):
    """Tick through ``seconds`` of work, then leave the effect."""
    steps = 4
    for number in range(steps):
        ctx.tick(number, steps, f"part {number + 1}")
        time.sleep(ctx.job.params.get("seconds", 0.0) / steps)
    return _effect(ctx)


def refuse(ctx):
    ctx.tick(note="reading")
    raise JobError("no_well_column", "Sheet «Raw» has no column «Well» (row 1).")


def break_down(ctx):
    return {}["missing"]


def hang(ctx):
    """Silent for ``seconds`` on the first attempt only."""
    ctx.tick(note="before the hang")
    if ctx.job.attempt <= ctx.job.params.get("hangs", 1):
        time.sleep(ctx.job.params["seconds"])
    return _effect(ctx)


def die(ctx):
    """End the whole process, as a crash in a library would."""
    ctx.tick(note="reading sheet 3")
    os._exit(9)


def call(ctx):
    """Run what the test put into CALLS under the job's ``name``."""
    return CALLS[ctx.job.params["name"]](ctx) or _effect(ctx)


CALLS = {}

# killed far more often than in life, the real jobs get as many attempts more
PATIENT = {name: replace(kind, max_attempts=12) for name, kind in kinds.KINDS.items()}

KINDS = {
    **PATIENT,
    "probe": Kind("tests.jobs.probes.work", max_attempts=12),
    "refuse": Kind("tests.jobs.probes.refuse"),
    "break": Kind("tests.jobs.probes.break_down"),
    "hang": Kind("tests.jobs.probes.hang", stall_seconds=1, max_attempts=2),
    "die": Kind("tests.jobs.probes.die", max_attempts=2),
    "call": Kind("tests.jobs.probes.call"),
}
