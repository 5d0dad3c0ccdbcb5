"""Put small reports into the registry without going through a file."""

from collections.abc import Iterable, Mapping
from typing import Any

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
from qc.rules.records import read
from qc.rules.table import ANALYTES
from tests.factories import ProjectFactory

METHODS = {"RO": "reflectance", "RO_N": "reflectance", "RO_SD": "reflectance"}


def store(
    records: Iterable[Mapping[str, Any]],
    *,
    project: Project | None = None,
    number: str = "R-1",
    method: str = "pyrolysis",
    wells: Mapping[str, Mapping[str, Any]] | None = None,
    stated_replicates: bool = False,
) -> Project:
    """One report with one table; a record holds well, label, kind, top_m, base_m, formation, replicate and cells."""
    listed = [dict(record) for record in records]
    project = project or ProjectFactory()
    source = SourceFile.objects.create(
        project=project, sha256=f"{number:0>64}", name=f"{number}.csv", size=1, stored_as=number
    )
    report = Report.objects.create(project=project, source_file=source, number=number)
    table = SourceTable.objects.create(report=report, sheet="Results", cell_range="A1:Z99", kind=method)
    codes = [code for code in ANALYTES if any(code in record for record in listed)]
    columns = {
        code: SourceColumn.objects.create(
            table=table, line=place, header=code, field=code,
            decimals=max([cell[2] for record in listed if (cell := read(record.get(code)))], default=0),
        )
        for place, code in enumerate(sorted(codes), start=1)
    }  # fmt: skip
    if stated_replicates:
        SourceColumn.objects.create(table=table, line=99, header="rep", field="REPLICATE")
    kind, _ = Method.objects.get_or_create(code=method, defaults={"name": method})
    for line, record in enumerate(listed, start=2):
        analysis = _analysis(record, project, report, table, kind, line, wells or {})
        for code, column in columns.items():
            _result(analysis, code, column, record.get(code), kind)
    return project


def _analysis(record, project, report, table, method, line, wells) -> Analysis:  # noqa: PLR0917
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
