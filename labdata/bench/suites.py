"""The benchmarks by name. Each makes its own project in the temporary home and measures with ``together``."""

import io
import itertools
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

import pandas as pd
from django.conf import settings
from django.contrib.auth.models import User
from django.db import connection

from labdata.bench import plain, workload
from labdata.bench.timing import Measured, together
from labdata.errors import Conflict
from labdata.intake.services import receive
from labdata.jobs import run_all_here, run_here
from labdata.models import Job, JobState, Membership, Project, Release, Role, Upload

PASSWORD = "benchmark accounts only"
_numbers = itertools.count(1)


@dataclass(frozen=True)
class Sizes:
    """How much work: rows of the one big workbook, workbooks and rows of the pile, runs a median is made of."""

    rows: int = 10_000
    files: int = 20
    file_rows: int = 250
    runs: int = 3


def intake(sizes: Sizes) -> Measured:
    """One long workbook: received, read, matched and stored, against reading alone and a plain script."""
    content = workload.workbook(sizes.rows)
    schema, folder = results_schema(), Path(settings.HOME)
    baselines = {
        "pandas + openpyxl script": lambda: plain.script(content),
        "calamine read alone": lambda: plain.calamine(content),
        "calamine read + bare insert": lambda: plain.read_and_insert(content, schema, folder),
    }
    ours, others = together(lambda: bring_in(new_project(), [content]), baselines, sizes.runs)
    return Measured(
        "intake", "one workbook to stored results", f"{sizes.rows} rows x 20 columns", ours, others, sizes.runs,
        {"calamine read + bare insert": 3.0},
    )  # fmt: skip


def pile(sizes: Sizes) -> Measured:
    """Many small workbooks, against the script over the same pile."""
    contents = [workload.workbook(sizes.file_rows, seed, seed) for seed in range(1, sizes.files + 1)]
    baselines = {
        "pandas + openpyxl script": lambda: [plain.script(content) for content in contents],
        "calamine read alone": lambda: [plain.calamine(content) for content in contents],
    }
    ours, others = together(lambda: bring_in(new_project(), contents), baselines, sizes.runs)
    return Measured(
        "pile", "a pile of workbooks to stored results", f"{sizes.files} files x {sizes.file_rows} rows", ours, others,
        sizes.runs, {"pandas + openpyxl script": 1.0},
    )  # fmt: skip


def qc(sizes: Sizes) -> Measured:
    """All rules over a project, against reading its table alone and against a loop over its rows."""
    from qc import services, tables  # noqa: PLC0415 - a later room; only this benchmark looks into it

    project = new_project()
    bring_in(project, [workload.workbook(sizes.rows)])
    run_all_here(project)
    wells = list(project.wells.order_by("pk"))
    rows = _records(sizes.rows)

    def read() -> object:
        return tables.read(wells)

    baselines: dict[str, Callable[[], object]] = {
        "reading the table alone": read,
        "reading + row-by-row Python loop": lambda: (read(), plain.row_by_row(rows)),
    }
    ours, others = together(lambda: _done(services.start_run(project, None, None)), baselines, sizes.runs)
    return Measured(
        "qc", "every rule over every well, flags stored", f"{sizes.rows} rows, {len(wells)} wells", ours, others,
        sizes.runs, {"reading the table alone": 10.0},
    )  # fmt: skip


def pull(sizes: Sizes) -> Measured:
    """A release pulled as Parquet, against reading the same rows into pandas and writing them."""
    release = signed_release(sizes)
    held = written(release)
    frame = pd.read_parquet(io.BytesIO(held))
    baselines: dict[str, Callable[[], object]] = {
        "pandas read + write": lambda: plain.parquet_copy(held),
        "pandas write alone": lambda: frame.to_parquet(io.BytesIO(), index=False),
    }
    ours, others = together(lambda: written(release), baselines, sizes.runs)
    return Measured("pull", "a release as Parquet, first pull", f"{len(frame)} results", ours, others, sizes.runs)


SUITES: dict[str, Callable[[Sizes], Measured]] = {"intake": intake, "pile": pile, "qc": qc, "pull": pull}


def results_schema() -> list[str]:
    """The statements that made the table of results and its indexes."""
    query = "SELECT sql FROM sqlite_master WHERE tbl_name = 'labdata_result' AND type IN ('table', 'index') AND sql NOT NULL"
    with connection.cursor() as cursor:
        cursor.execute(query + " ORDER BY type DESC")
        return [row[0] for row in cursor.fetchall()]


def new_project() -> Project:
    """A project of its own for every run: the same bytes are new there."""
    number = next(_numbers)
    return Project.objects.create(slug=f"bench-{number}", name=f"Benchmark {number}")


def bring_in(project: Project, contents: list[bytes]) -> None:
    """Files through intake, without the QC that follows. Raises Conflict when one does not come in."""
    for number, content in enumerate(contents, start=1):
        upload = receive(project=project, name=f"bench-{number}.xlsx", content=content, user=None, create_wells=True)
        if upload.job:
            run_here(upload.job)
        upload.refresh_from_db()
        if upload.outcome not in {Upload.Outcome.IMPORTED, Upload.Outcome.IMPORTED_WITH_FINDINGS}:
            raise Conflict(
                f"The benchmark's workbook was not imported: {upload.outcome}, {upload.answer.get('findings')}."
            )


def signed_release(sizes: Sizes) -> Release:
    """A release of one long workbook, every result accepted and signed."""
    from labdata.release.services import build_release  # noqa: PLC0415 - a later room
    from qc.models import ReviewSet, Verdict  # noqa: PLC0415
    from qc.review.services import Choice, decide, sign_off  # noqa: PLC0415
    from qc.review.standing import results_of  # noqa: PLC0415

    project = new_project()
    geochemist, approver = (_person(project, role) for role in (Role.GEOCHEMIST, Role.APPROVER))
    bring_in(project, [workload.workbook(sizes.rows)])
    for review_set in ReviewSet.objects.filter(project=project).order_by("pk"):
        ids = results_of(review_set).order_by("pk").values_list("pk", flat=True)
        decide(user=geochemist, review_set=review_set, choices=[Choice(pk, Verdict.ACCEPTED) for pk in ids])
        sign_off(user=approver, review_set=review_set, password=PASSWORD, meaning="reviewed")
    return build_release(project=project, user=approver, title="Benchmark")


def written(release: Release) -> bytes:
    """The release's Parquet as the first pull writes it; later pulls send the kept file."""
    from labdata.release import export, parquet  # noqa: PLC0415 - a later room
    from labdata.release.shapes import usable  # noqa: PLC0415

    out = io.BytesIO()
    export.write(usable(parquet.load(release.stored_as, release.data_sha256)), "parquet", "long", out)
    return out.getvalue()


def _person(project: Project, role: Role) -> User:
    user = User.objects.create_user(f"{role.value}-{project.slug}", password=PASSWORD)
    Membership.objects.create(project=project, user=user, role=role)
    return user


def _done(job: Job) -> None:
    """Run the job to its good end. Raises Conflict otherwise."""
    ended = run_here(job)
    if ended.state != JobState.SUCCEEDED:
        raise Conflict(f"The benchmark's {ended.kind} job ended {ended.state}: {ended.error_message}")


def _records(rows: int) -> list[dict[str, float]]:
    """The workbook's rows as dictionaries for the loop."""
    table = workload.table(rows)
    names = [str(name) for name in table.columns]
    return [dict(zip(names, cells, strict=True)) for cells in table.itertuples(index=False, name=None)]
