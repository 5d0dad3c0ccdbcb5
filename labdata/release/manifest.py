"""The manifest of a release: what went in, by whom it was decided and signed, and what came out.

It also pins whatever may change later (wells' names and surveys, the runs whose flags count, the last decision of
each set), so that the same bytes can be built again.
"""

import hashlib
from collections import Counter
from datetime import datetime
from typing import Any

import pyarrow as pa
import pyarrow.compute as pc

from labdata.audit import canonical
from labdata.models import Project, Result, SourceFile
from labdata.release.parquet import WRITER_NAME
from labdata.release.selection import Selection, Signature, WellFacts, as_ranges
from qc.models import QcRun, SignOff

FORMAT = 1
LOST_COLUMNS = ["well", "sample", "top_m", "method", "replicate", "analyte", "value_reported", "lost_inputs"]
DECISION_COLUMNS = ["result", "verdict", "reason", "decided_by", "decided_at"]


def describe(selection: Selection, table: pa.Table, data_sha256: str, size: int) -> dict[str, Any]:
    """Everything but number, title, maker and time, which the commit adds. ``table``: every signed row."""
    lost = table.filter(pc.not_equal(table["lost_inputs"], "")).select(LOST_COLUMNS)
    return {
        "format": FORMAT,
        "project": selection.project.slug,
        "data": {"sha256": data_sha256, "bytes": size, "rows": table.num_rows, "writer": WRITER_NAME},
        "counts": _counts(table, lost.num_rows),
        "inputs": _inputs(selection.project, table),
        "rule_sets": _rule_sets(selection),
        "decisions": {"results": table.num_rows, "sha256": _digest(table.select(DECISION_COLUMNS))},
        "signatures": _signatures(selection),
        "unavailable": lost.to_pylist(),
        "pinned": _pins(selection, table),
    }


def sha256_of(manifest: dict[str, Any]) -> str:
    return hashlib.sha256(canonical(manifest).encode()).hexdigest()


def _counts(table: pa.Table, lost: int) -> dict[str, Any]:
    verdicts = Counter(table["verdict"].to_pylist())
    wells = table.select(["well", "uwi"]).group_by(["well", "uwi"]).aggregate([]).num_rows
    return {
        "wells": wells,
        "analyses": pc.count_distinct(table["analysis"]).as_py(),
        "results": table.num_rows,
        "accepted": verdicts["accepted"],
        "rejected": verdicts["rejected"],
        "unavailable": lost,
        "usable": verdicts["accepted"] - lost,
        "qualified": pc.sum(pc.not_equal(table["qualifier"], "")).as_py() or 0,
    }


def _inputs(project: Project, table: pa.Table) -> list[dict[str, Any]]:
    """The laboratory files behind the rows, with the report version that each holds."""
    names = dict(SourceFile.objects.filter(project=project).values_list("sha256", "name"))
    held = table.group_by(["file_sha256", "report", "report_version", "lab"]).aggregate([("result", "count")])
    rows = [
        {
            "file": names.get(row["file_sha256"], ""), "sha256": row["file_sha256"], "report": row["report"],
            "version": row["report_version"], "lab": row["lab"], "results": row["result_count"],
        }
        for row in held.to_pylist()
    ]  # fmt: skip
    return sorted(rows, key=lambda row: (row["report"], row["version"], row["sha256"], row["lab"]))


def _rule_sets(selection: Selection) -> list[dict[str, Any]]:
    """The rule sets, with the values used, of the runs whose flags stand in the data."""
    runs = QcRun.objects.filter(pk__in=set(selection.qc_runs.values())).select_related("rule_set").order_by("pk")
    sets = {run.rule_set_id: run.rule_set for run in runs}
    return [
        {
            "name": rules.name, "version": rules.version, "thresholds": rules.thresholds, "disabled": rules.disabled,
            "qc_runs": [run.pk for run in runs if run.rule_set_id == rules.pk],
        }
        for rules in sets.values()
    ]  # fmt: skip


def _digest(table: pa.Table) -> str:
    """SHA-256 over the decisions, a canonical line each."""
    digest = hashlib.sha256()
    for batch in table.to_batches():
        for row in batch.to_pylist():
            digest.update(canonical(list(row.values())).encode() + b"\n")
    return digest.hexdigest()


def _signatures(selection: Selection) -> list[dict[str, Any]]:
    made = SignOff.objects.filter(pk__in=[s.sign_off for s in selection.signatures.values()])
    return [
        {
            "sign_off": record.pk, "review_set": record.review_set_id, "set": str(record.review_set),
            "signed_by": selection.signatures[record.review_set_id].signed_by, "name": record.signer_name,
            "signed_at": record.signed_at.isoformat(), "meaning": record.meaning,
            "content_sha256": record.content_sha256, "counts": record.counts,
            "last_decision": selection.signatures[record.review_set_id].last_decision,
        }
        for record in made.select_related("review_set__well").order_by("pk")
    ]  # fmt: skip


def _pins(selection: Selection, table: pa.Table) -> dict[str, Any]:
    return {
        "results": as_ranges(sorted(table["result"].to_pylist())),
        "wells": {str(pk): [facts.name, facts.uwi, facts.survey] for pk, facts in sorted(selection.wells.items())},
        "qc_runs": {str(well): run for well, run in sorted(selection.qc_runs.items())},
        "people": {str(pk): name for pk, name in sorted(selection.people.items())},
    }


def selection_of(project: Project, manifest: dict[str, Any]) -> Selection:
    """What the release of this manifest was made from."""
    pinned = manifest["pinned"]
    signatures = {
        row["review_set"]: Signature(
            row["sign_off"], row["signed_by"], datetime.fromisoformat(row["signed_at"]), row["last_decision"]
        )
        for row in manifest["signatures"]
    }
    return Selection(
        project=project,
        results=Result.objects.filter(analysis__project=project),
        wells={int(pk): WellFacts(*facts) for pk, facts in pinned["wells"].items()},
        signatures=signatures,
        qc_runs={int(well): run for well, run in pinned["qc_runs"].items()},
        people={int(pk): name for pk, name in pinned["people"].items()},
        within=pinned["results"],
        signed_only=True,
    )
