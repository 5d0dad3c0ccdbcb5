"""Results of reference materials and blanks as the typed frame that rules and charts read."""

from collections.abc import Sequence
from typing import Any

import pandas as pd

from labdata.models import Result, Well
from qc.rules.table import controls_of, no_controls

FIELDS = {
    "result": "id", "project": "analysis__project_id", "table_id": "analysis__table_id", "line": "analysis__line",
    "laboratory": "analysis__laboratory__name", "method": "analysis__method__code", "analyte": "analyte__code",
    "role": "analysis__role", "material": "analysis__reference_material__name", "lot": "analysis__reference_material__lot",
    "certificate": "analysis__reference_material__certificate", "number": "analysis__report__number",
    "version": "analysis__report__version", "reported_on": "analysis__report__reported_on",
    "file": "analysis__report__source_file__name", "sheet": "analysis__table__sheet", "column": "column__line",
    "orientation": "analysis__table__orientation", "value": "value", "q": "qualifier", "text": "value_reported",
}  # fmt: skip


def controls(wells: Sequence[Well], rows: pd.DataFrame) -> pd.DataFrame:
    """Controls of the wells' projects (``qc.rules.table.CONTROLS``); ``rows`` numbers the source tables at hand."""
    places = dict(zip(rows["table_id"], rows["table"], strict=True)) if len(rows) else {}
    return of_projects({well.project_id for well in wells}, places)


def of_projects(projects: set[int], places: dict[int, int]) -> pd.DataFrame:
    """Current control results of these projects; controls have no sample, so that few rows are looked at."""
    held = Result.objects.current().filter(
        analysis__sample__isnull=True, analysis__current=True, analysis__project__in=projects,
        analysis__role__in=["reference", "blank"],
    ).order_by()  # fmt: skip
    records = [_record(dict(zip(FIELDS, row, strict=True)), places) for row in held.values_list(*FIELDS.values())]
    return controls_of(records) if records else no_controls()


def _record(held: dict[str, Any], places: dict[int, int]) -> dict[str, Any]:
    certified = (held["certificate"] or {}).get(held["analyte"]) or [None, None]
    return {
        "project": held["project"], "table": places.get(held["table_id"], -1), "line": held["line"],
        "laboratory": held["laboratory"] or "", "method": held["method"], "analyte": held["analyte"], "role": held["role"],
        "material": held["material"] or "blank", "lot": held["lot"] or "", "report": f"{held['number']} v{held['version']}",
        "date": held["reported_on"].isoformat() if held["reported_on"] else "", "value": held["value"], "q": held["q"],
        "certified": certified[0], "uncertainty": certified[1] if len(certified) > 1 else None, "result": held["result"],
        "text": held["text"], "column": held["column"], "file": held["file"], "sheet": held["sheet"],
        "across": held["orientation"] == "columns",
    }  # fmt: skip
