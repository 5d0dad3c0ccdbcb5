"""Put small reports into the registry without going through a file."""

from collections.abc import Iterable, Mapping, Sequence
from typing import Any

from labdata.intake.fields import catalogue
from labdata.models import (
    Analysis,
    Analyte,
    Method,
    Project,
    Report,
    Result,
    Sample,
    SourceColumn,
    SourceFile,
    SourceTable,
    Well,
)  # fmt: skip
from qc.models import Decision, Flag, FlagAnswer, ReviewSet, Verdict
from qc.rules.records import read
from qc.rules.table import ANALYTES
from tests.factories import ProjectFactory, UserFactory


def store(
    records: Iterable[Mapping[str, Any]],
    *,
    project: Project | None = None,
    number: str = "R-1",
    method: str = "pyrolysis",
    wells: Mapping[str, Mapping[str, Any]] | None = None,
    lines: Sequence[int] = (),
    extend: bool = False,
) -> Project:
    """One report with one table; a record holds well, label, kind, top_m, base_m, formation, replicate and cells.

    ``lines`` says in which line of the sheet each record stands; ``extend`` adds to the report of this number.
    """
    listed = [dict(record) for record in records]
    project = project or ProjectFactory()
    table = (
        SourceTable.objects.get(report__project=project, report__number=number)
        if extend
        else _table(project, number, method)
    )
    kind, _ = Method.objects.get_or_create(code=method, defaults={"name": method})
    columns = _columns(table, listed)
    for line, record in zip(lines or range(2, len(listed) + 2), listed, strict=True):
        analysis = _analysis(record, table, kind, line, wells or {})
        for code, column in columns.items():
            _result(analysis, code, column, record.get(code), kind)
    return project


def decide(result: Result, verdict: Verdict) -> None:
    """A person's verdict on one result, as the review desk keeps it."""
    well = result.analysis.sample.well
    review_set, _ = ReviewSet.objects.get_or_create(project=well.project, well=well, number=1)
    reason = "measurement" if verdict == Verdict.REJECTED else ""
    Decision.objects.create(
        review_set=review_set, result=result, verdict=verdict, reason=reason, decided_by=UserFactory()
    )


def dismiss(flag: Flag) -> None:
    """A person's answer that the flag is wrong."""
    review_set, _ = ReviewSet.objects.get_or_create(project=flag.well.project, well=flag.well, number=1)
    FlagAnswer.objects.create(
        review_set=review_set, fingerprint=flag.fingerprint, rule=flag.rule, answer="dismissed", reason="known oil show",
        answered_by=UserFactory(),
    )  # fmt: skip


def _table(project: Project, number: str, method: str) -> SourceTable:
    source = SourceFile.objects.create(
        project=project, sha256=f"{number:0>64}", name=f"{number}.csv", size=1, stored_as=number
    )
    report = Report.objects.create(project=project, source_file=source, number=number)
    return SourceTable.objects.create(report=report, sheet="Results", cell_range="A1:Z99", kind=method)


def _columns(table: SourceTable, records: list[dict[str, Any]]) -> dict[str, SourceColumn]:
    """One column a code; decimals are the most that a cell shows."""
    made = {}
    others = sorted({code for record in records for code in record if code in catalogue()["analytes"]} - set(ANALYTES))
    for place, code in enumerate((*ANALYTES, *others), start=1):
        seen = [cell[2] for record in records if (cell := read(record.get(code)))]
        if seen:
            made[code], _ = SourceColumn.objects.get_or_create(
                table=table, line=place, defaults={"header": code, "field": code, "decimals": max(seen)}
            )
    return made


def _analysis(record, table, method, line, wells) -> Analysis:
    project, report = table.report.project, table.report
    name = record.get("well", "Quill 1")
    well, _ = Well.objects.get_or_create(
        project=project, name=name, name_key=name.casefold(), defaults=wells.get(name, {})
    )
    label, top, base = record.get("label", ""), record.get("top_m"), record.get("base_m")
    sample, _ = Sample.objects.get_or_create(
        well=well, match_key=f"{record.get('kind', 'cuttings')}|{label}|{top}|{base}",
        defaults={
            "kind": record.get("kind", "cuttings"), "label": label, "top_md_m": top, "base_md_m": base,
            "formation": record.get("formation", ""), "top_reported": "" if top is None else f"{top:g}",
        },
    )  # fmt: skip
    return Analysis.objects.create(
        project=project, sample=sample, method=method, report=report, table=table, line=line,
        replicate=record.get("replicate", 1), role=record.get("role", "sample"), lab_number=record.get("lab_number", ""),
        remark=record.get("remark", ""),
    )  # fmt: skip


def _result(analysis, code, column, cell, method) -> None:
    value = read(cell)
    if value is None:
        return
    analyte = Analyte.objects.filter(code=code, project=None).first() or Analyte.objects.create(
        code=code, name=code, method=method
    )
    Result.objects.create(
        analysis=analysis, analyte=analyte, column=column, value=None if value[0] != value[0] else value[0],
        qualifier=value[1], decimals=value[2], value_reported=value[3],
    )  # fmt: skip
