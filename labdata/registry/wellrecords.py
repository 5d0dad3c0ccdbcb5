"""Storing what a file says of wells: surveys, tops, core runs, mud, casing, log curves, with the tables they came from."""

from dataclasses import dataclass, field
from typing import Any

import numpy as np

from labdata import audit
from labdata.intake.importers.records import Curve, WellTable
from labdata.intake.importers.taking import MODELS
from labdata.intake.prepared import Prepared
from labdata.models import FormationTop, LogCurve, Report, SourceColumn, SourceTable, Upload, Well

WellIds = dict[tuple[str, str], int]


@dataclass
class Stored:
    """Ids of the wells that records came in for, and what the audit trail is to say of them."""

    wells: set[int] = field(default_factory=set)
    entries: list[tuple[str, Well, Any, Any]] = field(default_factory=list)

    def record(self, upload: Upload) -> None:
        """Write the entries to the audit trail; last in the transaction."""
        for action, well, before, after in self.entries:
            audit.record(action, well, actor=upload.created_by, project=upload.project, before=before, after=after)


def store_records(prepared: Prepared, report: Report, wells: WellIds) -> Stored:
    """Write the file's well records inside the caller's transaction."""
    stored, records = Stored(), prepared.records
    for table in records.tables:
        _source(report, table)
        for key in dict.fromkeys(row.well for row in table.rows):
            rows = [row.values for row in table.rows if row.well == key]
            if table.kind in MODELS:
                _rows(table.kind, wells[key], rows, stored if (table.kind, key) in records.replaced else None)
            stored.wells.add(wells[key])
    for curve in records.curves:
        _curve(curve, report, wells[curve.well])
        stored.wells.add(wells[curve.well])
    _complete(prepared, stored)
    return stored


def _source(report: Report, table: WellTable) -> None:
    """The table and its columns as they stood in the file."""
    source = SourceTable.objects.create(
        report=report, sheet=table.sheet[:120], cell_range=table.cell_range, kind=table.kind
    )
    SourceColumn.objects.bulk_create([
        SourceColumn(
            table=source, line=column.index + 1, header=column.header[:300], field=column.field[:24],
            unit_reported=column.unit_text[:40], factor=column.factor, confidence=column.confidence, reason=column.reason[:300],
        )
        for column in table.columns
    ])  # fmt: skip


def _rows(kind: str, well: int, rows: list[dict[str, Any]], replaced: Stored | None) -> None:
    """The records of one well; with ``replaced`` they take the place of those held. Tops held stay: these are a further version."""
    model, fields = MODELS[kind]
    if replaced is not None:
        before = [list(row) for row in model.objects.filter(well=well).values_list(*fields)]
        model.objects.filter(well=well).delete()
        entry = (f"well.{kind}_replaced", Well.objects.get(pk=well), {"rows": before}, {"rows": len(rows)})
        replaced.entries.append(entry)
    if kind == "tops":
        version = _version(well)
        model.objects.bulk_create([FormationTop(well_id=well, version=version, **row) for row in rows])
    else:
        model.objects.bulk_create([model(well_id=well, **row) for row in rows])


def _version(well: int) -> str:
    """The next free version of a well's tops."""
    taken = set(FormationTop.objects.filter(well=well).values_list("version", flat=True))
    return next(str(number) for number in range(1, len(taken) + 2) if str(number) not in taken)


def _curve(curve: Curve, report: Report, well: int) -> None:
    LogCurve.objects.create(
        well_id=well, report=report, mnemonic=curve.mnemonic, description=curve.description, quantity=curve.quantity,
        unit=curve.unit, depth_unit_reported=curve.depth_unit, top_md_m=float(curve.depths[0]),
        base_md_m=float(curve.depths[-1]), count=len(curve.depths),
        depths=np.asarray(curve.depths, dtype="<f8").tobytes(), values=np.asarray(curve.values, dtype="<f8").tobytes(),
    )  # fmt: skip


def _complete(prepared: Prepared, stored: Stored) -> None:
    """Fill in what held wells lack; what they have is never overwritten."""
    plans = {plan.pk: plan for plan in prepared.wells.values() if plan.completions and plan.pk is not None}
    for pk, plan in plans.items():
        well = Well.objects.select_for_update().get(pk=pk)
        lacking = {name: value for name, value in plan.completions.items() if getattr(well, name) in {None, ""}}
        if lacking:
            for name, value in lacking.items():
                setattr(well, name, value)
            well.save(update_fields=list(lacking))
            stored.entries.append(("well.completed", well, None, {"file": prepared.file_name, **lacking}))
