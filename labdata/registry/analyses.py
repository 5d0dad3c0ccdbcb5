"""Analyses and results of one stored file: which analysis each row and method makes, and in which replicate slot."""

from collections import defaultdict
from collections.abc import Iterator
from dataclasses import dataclass

from labdata.intake.prepared import PreparedTable
from labdata.intake.reading import Settled
from labdata.intake.rows import Row
from labdata.models import Analysis, Result
from labdata.registry import bulk
from labdata.registry.superseding import STEPS, OldAnalysis, Predecessor

ANALYSIS_COLUMNS = (
    "id", "project_id", "sample_id", "reference_material_id", "method_id", "report_id", "table_id", "line", "laboratory_id",
    "replicate", "role", "lab_number", "remark", "current",
)  # fmt: skip
RESULT_COLUMNS = (
    "id", "analysis_id", "analyte_id", "column_id", "value", "qualifier", "value_reported", "decimals", "current", "supersedes_id",
)  # fmt: skip


@dataclass
class Draft:
    """One analysis to be stored: a row of a table and a method of it. ``at`` is the row's place in the table."""

    table: PreparedTable
    table_id: int
    at: int
    row: Row
    method: str
    sample: int | None
    well: int | None
    reference: int | None
    laboratory: int | None
    replicate: int = 0
    pk: int = 0
    old: OldAnalysis | None = None

    def as_old(self) -> OldAnalysis:
        """The draft in the shape that pairing compares."""
        row = self.row
        return OldAnalysis(
            0, self.method, self.sample, self.well, row.label, 0, row.role, row.lab_number, self.reference
        )


def filled(table: PreparedTable) -> Iterator[tuple[int, str]]:
    """(row place, method) for every kept row and method with at least one value, in the order of the rows."""
    by_method: dict[str, list[list[str]]] = defaultdict(list)
    for column in table.results:
        by_method[column.method].append(table.settled[column.index].states)
    for at, row in enumerate(table.rows):
        if row.kept:
            for method in table.methods:
                if any(states[at] == "value" for states in by_method[method]):
                    yield at, method


def pair_with(predecessor: Predecessor, drafts: list[Draft]) -> None:
    """Give each draft the earlier analysis that it repeats: surest likeness first, over all drafts, then the next."""
    for step in range(STEPS):
        for draft in drafts:
            if draft.old is None:
                draft.old = predecessor.take(draft.as_old(), step)


def give_replicates(drafts: list[Draft]) -> None:
    """The slot of the analysis replaced, else the one stated where it is free, else the next of its sample and method."""
    taken = _taken_slots(drafts)
    for draft in drafts:
        if draft.old is not None and draft.old.sample == draft.sample and draft.sample is not None:
            draft.replicate = draft.old.replicate
            taken[draft.sample, draft.method].add(draft.replicate)
    ordered = sorted((d for d in drafts if not d.replicate), key=lambda d: d.row.replicate or 0)
    runs: dict[tuple[object, ...], int] = defaultdict(int)
    for draft in ordered:
        if draft.sample is None:
            key = (draft.row.role, draft.reference, draft.method)
            runs[key] += 1
            draft.replicate = min(runs[key], 32_000)
            continue
        slots = taken[draft.sample, draft.method]
        stated = draft.row.replicate
        draft.replicate = stated if stated and stated not in slots else max(slots, default=0) + 1
        slots.add(draft.replicate)


def _taken_slots(drafts: list[Draft]) -> dict[tuple[int, str], set[int]]:
    """Replicates of the drafts' samples that stay current, by (sample, method)."""
    replaced = {draft.old.pk for draft in drafts if draft.old}
    samples = sorted({draft.sample for draft in drafts if draft.sample is not None})
    taken: dict[tuple[int, str], set[int]] = defaultdict(set)
    for start in range(0, len(samples), 500):
        held = Analysis.objects.current().filter(sample__in=samples[start : start + 500])
        for pk, sample, method, replicate in held.values_list("pk", "sample_id", "method__code", "replicate"):
            if pk not in replaced and sample is not None:
                taken[sample, method].add(replicate)
    return taken


def insert_analyses(drafts: list[Draft], project: int, report: int, methods: dict[str, int]) -> None:
    """Store the drafts' analyses and set their ids."""
    for draft, pk in zip(drafts, bulk.take_ids(Analysis, len(drafts)), strict=True):
        draft.pk = pk
    bulk.insert(Analysis, ANALYSIS_COLUMNS, (
        (
            d.pk, project, d.sample, d.reference, methods[d.method], report, d.table_id, d.row.line, d.laboratory, d.replicate,
            d.row.role, d.row.lab_number, d.row.remark, True,
        )
        for d in drafts
    ))  # fmt: skip


@dataclass(frozen=True)
class ColumnIds:
    """Database ids of a result column and its analyte."""

    column: int
    analyte: int


def result_rows(
    drafts: list[Draft], ids: dict[tuple[int, int], ColumnIds], supersedes: dict[tuple[int, str], int]
) -> Iterator[tuple[object, ...]]:
    """Every value of the drafts without its own id; ``supersedes``: (analysis id, analyte code) -> earlier result."""
    columns_of: dict[tuple[int, str], list[tuple[str, ColumnIds, Settled]]] = {}
    for draft in drafts:
        key = (draft.table_id, draft.method)
        if key not in columns_of:
            columns_of[key] = [
                (c.field, ids[draft.table_id, c.index], draft.table.settled[c.index])
                for c in draft.table.results
                if c.method == draft.method
            ]
        at = draft.at
        for code, known, settled in columns_of[key]:
            if settled.states[at] == "value":
                yield (
                    draft.pk, known.analyte, known.column, settled.values[at], settled.qualifiers[at], settled.texts[at][:120],
                    settled.decimals[at], True, supersedes.get((draft.pk, code)) if supersedes else None,
                )  # fmt: skip


def insert_results(rows: list[tuple[object, ...]]) -> list[int]:
    """Store result rows and return their ids, in order."""
    ids = bulk.take_ids(Result, len(rows))
    bulk.insert(Result, RESULT_COLUMNS, ((pk, *row) for pk, row in zip(ids, rows, strict=True)))
    return ids
