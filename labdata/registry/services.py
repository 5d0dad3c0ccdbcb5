"""Typed rows become wells, samples, reports, analyses and results, in one transaction or not at all."""

from collections.abc import Iterable
from typing import Any

from django.db.models import Q

from labdata import audit, fixity
from labdata.intake import layouts
from labdata.intake import services as intake
from labdata.intake.prepared import Prepared, PreparedTable
from labdata.intake.rows import Row
from labdata.models import (
    Analyte,
    Laboratory,
    Method,
    Project,
    ReferenceMaterial,
    Report,
    SourceColumn,
    SourceTable,
    Upload,
)
from labdata.registry.analyses import (
    ColumnIds,
    Draft,
    filled,
    give_replicates,
    insert_analyses,
    insert_results,
    pair_with,
    result_rows,
)
from labdata.registry.landed import Landed
from labdata.registry.samples import place_samples
from labdata.registry.superseding import Difference, OldResult, Predecessor, withdraw
from labdata.registry.wellrecords import Stored, store_records
from labdata.registry.wells import make_wells

__all__ = ["Landed", "store"]

ROCK = ("sample", "duplicate")


def store(prepared: Prepared) -> Landed:
    """Write a prepared file, or only its findings when it does not land. Inside the caller's transaction."""
    upload = prepared.upload
    if upload is None:
        raise ValueError("store needs the upload that the file came with")
    Project.objects.select_for_update().get(pk=prepared.project.pk)  # one file at a time into a project
    held = Report.objects.filter(source_file=upload.source_file_id).first()
    if held is not None:
        intake.already_held(upload, held)
        return Landed(upload)
    if not prepared.lands:
        return _refuse(prepared, upload)
    return _Storing(prepared, upload).run()


def _refuse(prepared: Prepared, upload: Upload) -> Landed:
    """Keep the findings; nothing else of the file comes in."""
    upload.outcome = prepared.outcome
    upload.answer = prepared.entry(prepared.counts(), upload=upload.pk)
    upload.save(update_fields=["outcome", "answer"])
    found = [finding.as_dict() for finding in prepared.findings.ordered() if finding.level in {"error", "question"}]
    audit.record(
        f"upload.{upload.outcome}",
        upload,
        actor=upload.created_by,
        project=upload.project,
        after={"findings": found[:50]},
    )
    return Landed(upload)


class _Storing:
    """The steps of one landing, in order."""

    def __init__(self, prepared: Prepared, upload: Upload) -> None:
        self.prepared, self.upload, self.project = prepared, upload, prepared.project
        self.counts = prepared.counts()
        self.methods = dict(Method.objects.values_list("code", "pk"))
        self.analytes = _analytes(self.project)
        self.labs: dict[str, int] = {}
        self.references: dict[str, int] = {}
        self.columns: dict[tuple[int, int], ColumnIds] = {}
        self.difference = Difference()
        self.told = Stored()

    def run(self) -> Landed:
        wells, self.counts["wells_new"] = make_wells(self.prepared)
        report = self._report()
        rock = [(wells[row.well], row) for row in self._rows() if row.role in ROCK]
        samples, self.counts["samples_new"], self.counts["samples_matched"] = place_samples(rock)
        drafts = [draft for table in self.prepared.tables for draft in self._drafts(report, table, wells, samples)]
        self.told = store_records(self.prepared, report, wells)
        landed = Landed(self.upload, report, well_ids=sorted({well for well, _ in rock} | self.told.wells))
        predecessor = Predecessor.of(report.supersedes) if report.supersedes else None
        if predecessor:
            self._make_room(predecessor, drafts, landed)
        give_replicates(drafts)
        insert_analyses(drafts, self.project.pk, report.pk, self.methods)
        landed.analysis_ids = [draft.pk for draft in drafts]
        self._results(drafts, predecessor, landed)
        self._finish(report, landed)
        return landed

    def _rows(self) -> Iterable[Row]:
        return (row for table in self.prepared.tables for row in table.rows if row.kept)

    def _report(self) -> Report:
        prepared = self.prepared
        before = Report.objects.get(pk=prepared.supersedes) if prepared.supersedes else None
        return Report.objects.create(
            project=self.project, source_file=self.upload.source_file, laboratory_id=self._lab(prepared.laboratory),
            number=before.number if before else prepared.number, version=before.version + 1 if before else 1,
            supersedes=before, reported_on=prepared.reported_on,
        )  # fmt: skip

    def _lab(self, name: str) -> int | None:
        if not name:
            return None
        if name not in self.labs:
            self.labs[name] = Laboratory.objects.get_or_create(project=self.project, name=name[:160])[0].pk
        return self.labs[name]

    def _reference(self, name: str) -> int | None:
        if not name:
            return None
        if name not in self.references:
            found = ReferenceMaterial.objects.filter(project=self.project, name__iexact=name).order_by("pk").first()
            found = found or ReferenceMaterial.objects.create(project=self.project, name=name)
            self.references[name] = found.pk
        return self.references[name]

    def _drafts(
        self, report: Report, table: PreparedTable, wells: dict[tuple[str, str], int], samples: dict[int, int]
    ) -> list[Draft]:
        """Store the table and its columns; one draft per row and method with a value."""
        source = SourceTable.objects.create(
            report=report, sheet=table.sheet[:120], cell_range=table.cell_range, kind=table.as_dict()["kind"],
            orientation=table.orientation,
        )  # fmt: skip
        self._source_columns(source, table)
        drafts = []
        for at, method in filled(table):
            row = table.rows[at]
            rock = row.role in ROCK
            drafts.append(Draft(
                table, source.pk, at, row, method, samples[id(row)] if rock else None, wells.get(row.well) if rock else None,
                self._reference(row.reference) if row.role == "reference" else None, self._row_lab(row, method),
            ))  # fmt: skip
        return drafts

    def _row_lab(self, row: Row, method: str) -> int | None:
        """The laboratory of one analysis: as the row says for this method, else the report's."""
        about = "reflectance" if method in {"reflectance", "macerals"} else "pyrolysis"
        return self._lab(row.labs.get(about) or row.labs.get("*") or self.prepared.laboratory)

    def _source_columns(self, source: SourceTable, table: PreparedTable) -> None:
        made = SourceColumn.objects.bulk_create([
            SourceColumn(
                table=source, line=column.index + 1, header=column.header[:300], field=column.field[:24],
                unit_reported=(column.unit_text or column.unit)[:40], factor=column.factor, decimals=column.decimals,
                confidence=column.confidence, reason=column.reason[:300],
            )
            for column in table.columns
        ])  # fmt: skip
        for column, stored in zip(table.columns, made, strict=True):
            if column.is_result:
                self.columns[source.pk, column.index] = ColumnIds(stored.pk, self.analytes[column.field])

    def _make_room(self, predecessor: Predecessor, drafts: list[Draft], landed: Landed) -> None:
        """Take the earlier version out of force before the new one comes in."""
        pair_with(predecessor, drafts)
        gone = [] if self.prepared.keep_missing else predecessor.left
        self.difference.superseded = predecessor.report.version
        withdraw([draft.old.pk for draft in drafts if draft.old] + [analysis.pk for analysis in gone])
        for analysis in gone:
            for code, old in predecessor.results.get(analysis.pk, {}).items():
                landed.withdrawn.append(old.pk)
                self.difference.tell("withdrawn", analysis.label, code, f"{old.qualifier}{old.text}", "")

    def _results(self, drafts: list[Draft], predecessor: Predecessor | None, landed: Landed) -> None:
        earlier: dict[tuple[int, str], OldResult] = {}
        if predecessor:
            landed.replaced_analyses = {draft.pk: draft.old.pk for draft in drafts if draft.old}
            for draft in drafts:
                if draft.old:
                    earlier |= {
                        (draft.pk, code): old for code, old in predecessor.results.get(draft.old.pk, {}).items()
                    }
        rows = list(result_rows(drafts, self.columns, {key: old.pk for key, old in earlier.items()}))
        ids = insert_results(rows)
        if predecessor:
            self._compare(drafts, rows, ids, earlier, landed)

    def _compare(
        self, drafts: list[Draft], rows: list[tuple[Any, ...]], ids: list[int],
        earlier: dict[tuple[int, str], OldResult], landed: Landed,
    ) -> None:  # fmt: skip
        """Say of every value whether it is added, changed or unchanged, and which earlier ones are gone."""
        codes = {pk: code for code, pk in self.analytes.items()}
        labels = {draft.pk: draft.row.label or draft.row.top_text for draft in drafts}
        for pk, (analysis, analyte, _, value, qualifier, text, *_rest) in zip(ids, rows, strict=True):
            old = earlier.pop((analysis, codes[analyte]), None)
            if old is None:
                self.difference.tell("added", labels[analysis], codes[analyte], "", text)
            elif (old.value, old.qualifier) == (value, qualifier):
                landed.unchanged.append((old.pk, pk))
                self.difference.tell("unchanged", labels[analysis], codes[analyte], old.text, text)
            else:
                landed.changed.append((old.pk, pk))
                self.difference.tell("changed", labels[analysis], codes[analyte], old.text, text)
        for (analysis, code), old in earlier.items():
            landed.withdrawn.append(old.pk)
            self.difference.tell("withdrawn", labels[analysis], code, old.text, "")

    def _finish(self, report: Report, landed: Landed) -> None:
        """The report's difference, the upload's answer and the audit entry, in this order and last."""
        revision = self.prepared.revision
        if report.supersedes_id or revision is not None:
            report.difference = self.difference.as_dict(revision)
            report.save(update_fields=["difference"])
        upload, prepared = self.upload, self.prepared
        if self.difference.withdrawn:
            prepared.findings.warning(
                "values_withdrawn",
                f"{self.difference.withdrawn} values of version {self.difference.superseded} are not in this version and are withdrawn.",
                value=report.number,
                remedy="Open the report to see which.",
            )
        upload.outcome, upload.report = prepared.outcome, report
        upload.answer = prepared.entry(self.counts, report.number, upload.pk)
        upload.save(update_fields=["outcome", "report", "answer"])
        intake.settle_waiting(upload, report)
        layouts.remember(prepared)
        self.told.record(upload)
        audit.record(
            "report.imported", report, actor=upload.created_by, project=self.project,
            after={
                "number": report.number, "version": report.version, "file": upload.file_name, "sha256": prepared.sha256,
                "supersedes": report.supersedes_id, "counts": self.counts, "answers": upload.answers,
                "difference": {key: value for key, value in report.difference.items() if key != "values"},
                "facts": fixity.facts("results of report", report.pk) if self.counts["results"] else {},
            },
        )  # fmt: skip


def _analytes(project: Project) -> dict[str, int]:
    """Analyte code -> id; the project's own win over those that every project has."""
    pairs = Analyte.objects.filter(Q(project=None) | Q(project=project)).values_list("project_id", "code", "pk")
    found = {code: pk for owner, code, pk in pairs if owner is None}
    return found | {code: pk for owner, code, pk in pairs if owner == project.pk}
