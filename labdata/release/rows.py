"""Long rows, one a result, read straight into Arrow: never through model objects."""

from collections.abc import Iterable, Iterator, Sequence
from itertools import islice
from typing import Any

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
from django.db.models import Q, QuerySet

from labdata.models import Analysis, AnalysisRole, Analyte, Project, Result, SourceColumn
from labdata.release.availability import Row, lost_inputs
from labdata.release.columns import STORED, column_letters
from labdata.release.selection import Selection, working_data
from labdata.release.trajectory import tvd_of
from qc.models import Decision, Flag, Verdict

CHUNK = 20_000
FEW = 2_000  # so many rows are asked for by id, more are read as a range and cut
RESULT_FIELDS = ("pk", "analysis_id", "analyte_id", "column_id", "value", "qualifier", "value_reported")
RESULT_TYPES = (pa.int64(),) * 4 + (pa.float64(), pa.string(), pa.string())
ANALYSIS_FIELDS = (
    "pk", "line", "replicate", "role", "lab_number", "method__code", "table__sheet", "table__orientation",
    "report__number", "report__version", "report__source_file__sha256", "report__laboratory__name",
    "laboratory__name", "reference_material__name", "sample_id", "sample__well_id", "sample__kind",
    "sample__label", "sample__top_md_m", "sample__base_md_m", "sample__top_reported", "sample__base_reported",
    "sample__depth_unit_reported", "sample__formation", "review_item__review_set_id",
)  # fmt: skip


def long_table(project: Project, results: QuerySet[Result] | None = None) -> pa.Table:
    """Today's working data of a project (or of the results given), every result with its verdict."""
    return read(working_data(project, results))


def read(selection: Selection) -> pa.Table:
    """The selection as a table of schema STORED, in order of well, depth, sample, method, replicate, analyte.

    Its metadata names the analytes in their order. The same selection gives the same table on any database.
    """
    results = _results(selection)
    ours = Analyte.objects.filter(Q(project=None) | Q(project=selection.project)).order_by("order", "code", "pk")
    analytes: list[dict[str, Any]] = [dict(row) for row in ours.values("pk", "code", "unit", "inputs")]
    analyses = _analyses(selection, results["analysis_id"].to_numpy())
    results = _in_order(results, analyses, analytes)
    table = _assemble(selection, results, analyses, analytes)
    present = set(pc.unique(table["analyte"]).to_pylist())
    order = list(dict.fromkeys(a["code"] for a in analytes if a["code"] in present))
    return table.replace_schema_metadata({"analytes": ",".join(order)})


def _columns(rows: Iterable[tuple[Any, ...]], names: Sequence[str], types: Sequence[pa.DataType]) -> pa.Table:
    """Tuples as an Arrow table, a chunk at a time."""
    schema = pa.schema(list(zip(names, types, strict=True)))
    batches = []
    stream = iter(rows)
    while chunk := list(islice(stream, CHUNK)):
        arrays = [pa.array(column, kind) for column, kind in zip(zip(*chunk, strict=True), types, strict=True)]
        batches.append(pa.record_batch(arrays, schema=schema))
    return pa.Table.from_batches(batches, schema).combine_chunks()


def _results(selection: Selection) -> pa.Table:
    rows = selection.results.order_by("pk")
    within = selection.within
    if within:
        rows = rows.filter(pk__range=(within[0][0], within[-1][1]))
    elif within is not None:
        rows = rows.none()
    table = _columns(rows.values_list(*RESULT_FIELDS).iterator(chunk_size=CHUNK), RESULT_FIELDS, RESULT_TYPES)
    return table.filter(_inside(table["pk"].to_numpy(), within)) if within else table


def _inside(ids: np.ndarray, ranges: Sequence[Sequence[int]]) -> pa.Array:
    """Which sorted ids lie in one of the sorted closed ranges."""
    starts, ends = np.array(ranges, dtype=np.int64).T
    place = np.searchsorted(starts, ids, side="right") - 1
    return pa.array((place >= 0) & (ids <= ends[place]))


def among(queryset: QuerySet[Any], ids: np.ndarray, path: str = "pk") -> QuerySet[Any]:
    """``queryset`` cut to the ids (or, where they are many, to their range: look rows up by id after)."""
    if len(ids) <= FEW:
        return queryset.filter(**{f"{path}__in": ids.tolist()})
    return queryset.filter(**{f"{path}__range": (int(ids[0]), int(ids[-1]))})


def _analyses(selection: Selection, ids: np.ndarray) -> list[dict[str, Any]]:
    """What a row says of its analysis, in the order of the dataset."""
    wanted = np.unique(ids)
    rows = among(Analysis.objects.filter(project=selection.project).order_by(), wanted)
    known = set(wanted.tolist())
    stream = rows.values_list(*ANALYSIS_FIELDS).iterator(chunk_size=CHUNK)
    facts = [_facts(selection, dict(zip(ANALYSIS_FIELDS, row, strict=True))) for row in stream if row[0] in known]
    _add_tvd(selection, facts)
    return sorted(facts, key=_place)


def _facts(selection: Selection, row: dict[str, Any]) -> dict[str, Any]:
    well = selection.wells.get(row["sample__well_id"])
    rock = row["sample_id"] is not None
    named = {
        "project": selection.project.slug, "well": well.name if well else "", "uwi": well.uwi if well else "",
        "sample": row["sample__label"] if rock else row["reference_material__name"] or row["lab_number"],
        "kind": row["sample__kind"] if rock else row["role"] or AnalysisRole.REFERENCE,
        "formation": row["sample__formation"], "top_m": row["sample__top_md_m"], "base_m": row["sample__base_md_m"],
        "tvd_top_m": None, "tvd_base_m": None,
        "depth_reported": _span(row["sample__top_reported"], row["sample__base_reported"]),
        "depth_unit_reported": row["sample__depth_unit_reported"],
        "lab": row["laboratory__name"] or row["report__laboratory__name"], "report": row["report__number"],
        "report_version": row["report__version"], "method": row["method__code"], "replicate": row["replicate"],
        "file_sha256": row["report__source_file__sha256"], "sheet": row["table__sheet"],
    }  # fmt: skip
    internal = {
        "analysis": row["pk"], "line": row["line"], "orientation": row["table__orientation"],
        "sample_id": row["sample_id"], "well_id": row["sample__well_id"],
        "review_set": row["review_item__review_set_id"],
    }  # fmt: skip
    return {**{name: "" if text is None and name not in _DEPTHS else text for name, text in named.items()}, **internal}


_DEPTHS = {"top_m", "base_m", "tvd_top_m", "tvd_base_m"}


def _span(top: str | None, base: str | None) -> str:
    """Reported depths as one text: "6510", or "6510 - 6520"."""
    return f"{top} - {base}" if top and base and base != top else top or base or ""


def _add_tvd(selection: Selection, facts: list[dict[str, Any]]) -> None:
    """True vertical depth of both ends, where the well has a survey."""
    by_well: dict[int, list[dict[str, Any]]] = {}
    for fact in facts:
        by_well.setdefault(fact["well_id"], []).append(fact)
    for well, members in by_well.items():
        survey = selection.wells[well].survey if well in selection.wells else ()
        if survey:
            for end in ("top_m", "base_m"):
                for fact, tvd in zip(members, tvd_of([fact[end] for fact in members], survey), strict=True):
                    fact[f"tvd_{end}"] = tvd


def _place(fact: dict[str, Any]) -> tuple[Any, ...]:
    """Where an analysis stands in the dataset. Samples without depth come last."""
    depths = [np.inf if fact[end] is None else fact[end] for end in ("top_m", "base_m")]
    names = (fact["sample"], fact["kind"], fact["method"], fact["replicate"], fact["report"], fact["report_version"])
    return (fact["well"], fact["uwi"], *depths, *names, fact["analysis"])


def _in_order(results: pa.Table, analyses: list[dict[str, Any]], analytes: list[dict[str, Any]]) -> pa.Table:
    """Results sorted, with ``at`` (place of the analysis) and ``of`` (place of the analyte)."""
    at = _positions([fact["analysis"] for fact in analyses], results["analysis_id"].to_numpy())
    of = _positions([analyte["pk"] for analyte in analytes], results["analyte_id"].to_numpy())
    order = np.lexsort((results["pk"].to_numpy(), of, at))
    results = results.append_column("at", pa.array(at)).append_column("of", pa.array(of))
    return results.take(pa.array(order))


def _positions(known: Sequence[int], wanted: np.ndarray) -> np.ndarray:
    """Position in ``known`` of each wanted id; every one must be there."""
    ids = np.asarray(known, dtype=np.int64)
    order = np.argsort(ids)
    return order[np.searchsorted(ids[order], wanted)] if len(ids) else np.zeros(len(wanted), dtype=np.int64)


def _assemble(
    selection: Selection, results: pa.Table, analyses: list[dict[str, Any]], analytes: list[dict[str, Any]]
) -> pa.Table:
    """All columns of STORED."""
    at, of = results["at"], results["of"]
    made: dict[str, Any] = {
        name: pa.array([fact[name] for fact in analyses], STORED.field(name).type).take(at.combine_chunks())
        for name in _of_analysis()
    }
    for name, key in (("analyte", "code"), ("unit", "unit")):
        made[name] = pa.array([analyte[key] for analyte in analytes], pa.string()).take(of.combine_chunks())
    made |= {name: results[name] for name in ("value", "qualifier", "value_reported")} | {"result": results["pk"]}
    made |= _places(results, analyses)
    made |= _verdicts(selection, results, analyses)
    made["flags"] = pa.array(_flags(selection, results, analyses, made["analyte"]), pa.string())
    made["lost_inputs"] = pa.array(_lost(made, at.to_pylist(), analyses, analytes), pa.string())
    return pa.table([made[name] for name in STORED.names], schema=STORED).combine_chunks()


def _lost(
    made: dict[str, Any], at: list[int], analyses: list[dict[str, Any]], analytes: list[dict[str, Any]]
) -> Iterator[str]:
    """The inputs each index has lost, as text."""
    columns = (made["analysis"], made["replicate"], made["analyte"])
    rows = [
        Row(analysis, analyses[place]["sample_id"], replicate, code, verdict)
        for place, verdict, analysis, replicate, code in zip(
            at, made["verdict"], *(column.to_pylist() for column in columns), strict=True
        )
    ]
    lost = lost_inputs(rows, {analyte["code"]: analyte["inputs"] for analyte in analytes if analyte["inputs"]})
    return (",".join(lost.get(number, ())) for number in range(len(rows)))


def _of_analysis() -> list[str]:
    own = {"analyte", "value", "qualifier", "unit", "value_reported", "unit_reported", "verdict", "reason"}
    own |= {"decided_by", "decided_at", "signed_by", "signed_at", "flags", "cell", "result", "lost_inputs"}
    return [name for name in STORED.names if name not in own]


def _places(results: pa.Table, analyses: list[dict[str, Any]]) -> dict[str, pa.Array]:
    """Reported unit and cell address: the column's line and the analysis's line, by the table's orientation."""
    ids = np.unique(results["column_id"].to_numpy())
    columns = list(among(SourceColumn.objects.order_by(), ids).values_list("pk", "line", "unit_reported"))
    place = _positions([column[0] for column in columns], results["column_id"].to_numpy())
    table_line = np.array([column[1] for column in columns], dtype=np.int64)[place] if columns else place
    at = results["at"].to_numpy()
    own_line = np.array([fact["line"] for fact in analyses], dtype=np.int64)[at] if analyses else at
    down_rows = np.array([fact["orientation"] == "rows" for fact in analyses], dtype=bool)[at] if analyses else at > 0
    across = np.where(down_rows, table_line, own_line)
    letters, which = np.unique(across, return_inverse=True)
    letter = pa.array([column_letters(int(number)) for number in letters], pa.string()).take(pa.array(which))
    row = pa.array(np.where(down_rows, own_line, table_line)).cast(pa.string())
    units = pa.array([column[2] for column in columns], pa.string()).take(pa.array(place))
    return {"unit_reported": units, "cell": pc.binary_join_element_wise(letter, row, "")}


def _verdicts(selection: Selection, results: pa.Table, analyses: list[dict[str, Any]]) -> dict[str, list[Any]]:
    """The standing decision of each result and the signature over its set."""
    standing = _standing(selection, results["pk"].to_numpy())
    names = ("verdict", "reason", "decided_by", "decided_at", "signed_by", "signed_at")
    made: dict[str, list[Any]] = {name: [] for name in names}
    nothing = (Verdict.UNDECIDED.value, "", "", None)
    for result, at in zip(results["pk"].to_pylist(), results["at"].to_pylist(), strict=True):
        signature = selection.signatures.get(analyses[at]["review_set"])
        signed = (signature.signed_by, signature.signed_at) if signature else ("", None)
        for name, fact in zip(names, (*standing.get(result, nothing), *signed), strict=True):
            made[name].append(fact)
    return made


def _standing(selection: Selection, ids: np.ndarray) -> dict[int, tuple[Any, ...]]:
    """Result -> (verdict, reason, decided by, decided at) of its latest decision that counts."""
    rows = among(Decision.objects.filter(review_set__project=selection.project), np.unique(ids), "result__pk")
    fields = ("result_id", "pk", "review_set_id", "verdict", "reason", "text", "decided_by_id", "decided_at")
    standing: dict[int, tuple[Any, ...]] = {}
    for result, pk, held, verdict, reason, text, who, when in (
        rows.order_by("pk").values_list(*fields).iterator(chunk_size=CHUNK)
    ):
        if selection.signed_only and (
            held not in selection.signatures or pk > selection.signatures[held].last_decision
        ):
            continue
        words = f"{reason}: {text}" if reason and text else reason or text
        standing[result] = (verdict, words, selection.people.get(who, ""), when)
    return standing


def _flags(selection: Selection, results: pa.Table, analyses: list[dict[str, Any]], codes: pa.Array) -> Iterator[str]:
    """Rule ids of the flags on each result: its own, and those on its analysis that name its analyte or none."""
    on_result, on_analysis = _fired(selection, [fact["analysis"] for fact in analyses])
    analysis_ids = results["analysis_id"].to_pylist()
    for result, analysis, code in zip(results["pk"].to_pylist(), analysis_ids, codes.to_pylist(), strict=True):
        rules = {
            *on_result.get(result, ()),
            *on_analysis.get((analysis, code), ()),
            *on_analysis.get((analysis, ""), ()),
        }
        yield ",".join(sorted(rules)) if rules else ""


def _fired(
    selection: Selection, analyses: Sequence[int]
) -> tuple[dict[int, list[str]], dict[tuple[int, str], list[str]]]:
    """Rules per flagged result, and per (analysis, analyte) for flags without a result."""
    on_result: dict[int, list[str]] = {}
    on_analysis: dict[tuple[int, str], list[str]] = {}
    flags: QuerySet[Flag] = Flag.objects.filter(run__in=set(selection.qc_runs.values())).order_by()
    if len(analyses) <= FEW:
        flags = flags.filter(Q(analysis__in=analyses) | Q(result__analysis__in=analyses))
    for well, run, analysis, result, code, rule in flags.values_list(
        "well_id", "run_id", "analysis_id", "result_id", "analyte", "rule"
    ).iterator(chunk_size=CHUNK):
        if selection.qc_runs.get(well) != run:
            continue
        if result is not None:
            on_result.setdefault(result, []).append(rule)
        elif analysis is not None:
            on_analysis.setdefault((analysis, code), []).append(rule)
    return on_result, on_analysis
