"""A file read and matched, ready to be stored or refused; nothing of it is in the database yet."""

from dataclasses import dataclass, field
from datetime import date
from typing import Any

from labdata.intake.columns import Column
from labdata.intake.corrections import Said
from labdata.intake.findings import Findings
from labdata.intake.importers.records import WellRecords
from labdata.intake.matching import WellPlan
from labdata.intake.reading import Settled
from labdata.intake.rows import Row
from labdata.intake.tables import Table
from labdata.models import Project, Upload

KIND_ORDER = (
    "pyrolysis",
    "carbon",
    "reflectance",
    "macerals",
    "elements",
    "minerals",
    "core",
    "isotopes",
    "gc",
    "gamma",
)


@dataclass
class PreparedTable:
    """One table's columns and rows; ``settled`` holds the values of each result column by its place.

    ``found`` is where it stood; ``said`` what people say of its columns, now or for its layout before; ``corrected``
    is True when something was said for this file itself, ``header_said`` when a person named the header rows.
    """

    sheet: str
    cell_range: str
    columns: list[Column]
    unmapped: list[str]
    rows: list[Row]
    settled: dict[int, Settled]
    found: Table | None = None
    said: dict[int, Said] = field(default_factory=dict)
    corrected: bool = False
    header_said: bool = False

    @property
    def orientation(self) -> str:
        """ "columns" where each sample has a column in the file, else "rows"."""
        return "columns" if self.found is not None and self.found.sheet.turned else "rows"

    @property
    def results(self) -> list[Column]:
        return [column for column in self.columns if column.is_result]

    @property
    def methods(self) -> list[str]:
        """Methods present, in a fixed order; the first gives the table its kind."""
        present = {column.method for column in self.results}
        return [method for method in KIND_ORDER if method in present]

    def as_dict(self) -> dict[str, Any]:
        """The table as the outside contract gives it."""
        return {
            "sheet": self.sheet, "range": self.cell_range, "kind": self.methods[0] if self.methods else "",
            "columns": [column.as_dict() for column in self.columns], "unmapped": self.unmapped,
            "header_rows": [self.found.top + 1, self.found.top + self.found.height] if self.found else [],
            "orientation": self.orientation,
        }  # fmt: skip

    def tally(self) -> dict[str, int]:
        """Counts over kept rows: rows, cells, results, qualified, blank, named in findings, analyses."""
        kept = [at for at, row in enumerate(self.rows) if row.kept]
        counts = dict.fromkeys(("rows", "cells", "results", "qualified", "blank", "named", "analyses"), 0)
        counts["rows"], counts["cells"] = len(kept), len(kept) * len(self.results)
        filled: set[tuple[int, str]] = set()
        for column in self.results:
            settled = self.settled[column.index]
            for at in kept:
                state = settled.states[at]
                if state == "value":
                    counts["results"] += 1
                    counts["qualified"] += settled.qualifiers[at] != ""
                    filled.add((at, column.method))
                else:
                    counts["blank" if state == "blank" else "named"] += 1
        counts["analyses"] = len(filled)
        return counts


@dataclass
class Prepared:
    """What ``registry.services.store`` needs. ``supersedes`` is the pk of the report version that this one follows."""

    project: Project
    file_name: str
    sha256: str
    findings: Findings
    tables: list[PreparedTable] = field(default_factory=list)
    records: WellRecords = field(default_factory=WellRecords)
    wells: dict[tuple[str, str], WellPlan] = field(default_factory=dict)
    number: str = ""
    revision: int | None = None
    supersedes: int | None = None
    keep_missing: bool = False
    laboratory: str = ""
    reported_on: date | None = None
    upload: Upload | None = None
    seconds: float = 0.0

    @property
    def outcome(self) -> str:
        """What becomes of the file, as far as reading tells."""
        if self.findings.has("error"):
            return Upload.Outcome.REFUSED
        if self.findings.has("question"):
            return Upload.Outcome.WAITING
        return Upload.Outcome.IMPORTED_WITH_FINDINGS if self.findings.found else Upload.Outcome.IMPORTED

    @property
    def lands(self) -> bool:
        return self.outcome in {Upload.Outcome.IMPORTED, Upload.Outcome.IMPORTED_WITH_FINDINGS}

    def counts(self) -> dict[str, int]:
        """The contract's counts; results and analyses are 0 when nothing lands."""
        total = dict.fromkeys(
            (
                "wells_new",
                "samples_new",
                "samples_matched",
                "analyses",
                "results",
                "qualified",
                "blank",
                "rows",
                "cells",
                "named",
                "well_records",
                "curves",
            ),
            0,
        )
        if self.lands:
            for table in self.tables:
                for name, number in table.tally().items():
                    total[name] += number
            total["well_records"] = sum(len(table.rows) for table in self.records.tables)
            total["curves"] = len(self.records.curves)
            total["wells_new"] = len({id(plan) for plan in self.wells.values() if plan.pk is None})
        return total

    def entry(self, counts: dict[str, int], report: str = "", upload: int | None = None) -> dict[str, Any]:
        """The file's entry of the outside contract."""
        return {
            "file": self.file_name, "sha256": self.sha256, "outcome": str(self.outcome), "upload": upload, "report": report,
            "seconds": round(self.seconds, 3), "tables": [*(table.as_dict() for table in self.tables), *(table.as_dict() for table in self.records.tables)], "counts": counts,
            "findings": [finding.as_dict() for finding in self.findings.ordered()],
        }  # fmt: skip
