"""Decisions from a table (CSV): every row is understood, or the whole table is refused with each bad row named."""

import csv
import io
from collections import defaultdict
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import Any

from django.contrib.auth.models import User
from django.db import transaction

from labdata.access import Action, require
from labdata.errors import InvalidInput
from labdata.models import Project
from qc.models import ReviewSet, Verdict
from qc.review.choices import Choice, fault_of, reason_of
from qc.review.deciding import decide
from qc.review.finding import Finder, Unclear

NEEDED = ("sample", "method", "analyte", "verdict")
OPTIONAL = ("replicate", "reason", "text", "well")
VERDICT_WORDS = {
    "accept": Verdict.ACCEPTED, "reject": Verdict.REJECTED, "hold": Verdict.HELD, **{v.value: v for v in Verdict},
}  # fmt: skip
SHOWN = 10


@dataclass(frozen=True)
class Row:
    """One row of the table: its number in the file (the header is row 1) and its cells."""

    number: int
    cells: Mapping[str, str]

    def fault(self, column: str, message: str, remedy: str) -> dict[str, Any]:
        """What is wrong with the row, as plain data."""
        return {"row": self.number, "column": column, "value": self.cells.get(column, ""), "message": message, "remedy": remedy}  # fmt: skip


def decide_from_sheet(*, user: User, project: Project, content: bytes) -> dict[str, Any]:
    """Apply a table of decisions, all or none. Returns what was decided per review set.

    Raises InvalidInput naming every bad row (``rows``), and what ``decide`` raises.
    """
    require(user, project, Action.DECIDE)
    rows = read_rows(content)
    chosen = _understand(rows, Finder(project))
    with transaction.atomic():
        done = [
            _apply(user, review_set, choices) for review_set, choices in sorted(chosen.items(), key=lambda c: c[0].pk)
        ]
    return {
        "project": project.slug,
        "rows": len(rows),
        "decisions": sum(d["decided"] for d in done),
        "review_sets": done,
    }


def _apply(user: User, review_set: ReviewSet, choices: list[Choice]) -> dict[str, Any]:
    batch = decide(user=user, review_set=review_set, choices=choices)
    return {
        "review_set": review_set.pk, "well": review_set.well.name, "number": review_set.number,
        "decided": len(choices), "batch": str(batch),
    }  # fmt: skip


def read_rows(content: bytes) -> list[Row]:
    """The rows of a CSV in UTF-8, separated by comma, semicolon or tab. Raises InvalidInput for the table as such."""
    try:
        text = content.decode("utf-8-sig")
    except UnicodeDecodeError as fault:
        raise InvalidInput(
            f"The file is not UTF-8 text: byte {fault.start} cannot be read.", remedy="Save it as CSV in UTF-8."
        ) from None
    lines = text.splitlines()
    if not lines:
        raise InvalidInput("The file is empty.", remedy=f"Its first row names the columns: {', '.join(NEEDED)}, …")
    separator = max(",;\t", key=lines[0].count)
    table = list(csv.reader(io.StringIO(text, newline=""), delimiter=separator))
    header = _header(table[0])
    rows = [
        _row(number, header, cells) for number, cells in enumerate(table[1:], start=2) if any(map(str.strip, cells))
    ]
    if not rows:
        raise InvalidInput("The file has a header and no decisions.", remedy="Write one row a decision.")
    return rows


def _header(cells: list[str]) -> list[str]:
    """The column names, folded. Raises InvalidInput for missing, unknown and repeated ones."""
    names = [cell.strip().casefold() for cell in cells]
    faults = [f"column «{name}» is missing" for name in NEEDED if name not in names]
    faults += [f"column «{name}» is not known" for name in names if name and name not in (*NEEDED, *OPTIONAL)]
    faults += [f"column «{name}» stands twice" for name in dict.fromkeys(names) if name and names.count(name) > 1]
    if faults:
        raise InvalidInput(
            f"Row 1 does not name the columns: {'; '.join(faults)}.",
            remedy=f"Columns: {', '.join(NEEDED)}; and where wanted {', '.join(OPTIONAL)}.",
            row=1,
        )
    return names


def _row(number: int, header: list[str], cells: list[str]) -> Row:
    return Row(number, {name: cell.strip() for name, cell in zip(header, cells, strict=False) if name})


def _understand(rows: Iterable[Row], finder: Finder) -> dict[ReviewSet, list[Choice]]:
    """The choices per review set. Raises InvalidInput with all that was not understood."""
    chosen: dict[ReviewSet, list[Choice]] = defaultdict(list)
    first_row: dict[int, int] = {}
    faults: list[dict[str, Any]] = []
    for row in rows:
        try:
            verdict, reason, text = _verdict(row)
            review_set, results = finder.results(row.cells)
            for result in results:
                _refuse_twice(row, first_row.setdefault(result, row.number))
                chosen[review_set].append(Choice(result, verdict, reason, text))
        except Unclear as unclear:
            faults.append(row.fault(unclear.column, unclear.message, unclear.remedy))
    if faults:
        raise InvalidInput(
            _summary(faults), remedy="Nothing was decided; correct these rows and give the file again.", rows=faults
        )
    return chosen


def _refuse_twice(row: Row, first: int) -> None:
    if first != row.number:
        raise Unclear("sample", f"decides again what row {first} decides", "Keep one of the two rows.")


def _verdict(row: Row) -> tuple[str, str, str]:
    """Verdict, reason code and text of a row. A reason that is no code is free text: code "other" with the words."""
    word = row.cells.get("verdict", "").casefold()
    if word not in VERDICT_WORDS:
        known = ", ".join(Verdict.values)
        raise Unclear("verdict", f"«{row.cells.get('verdict', '')}» is no verdict", f"Verdicts: {known}.")
    reason, text = reason_of(row.cells.get("reason", ""), row.cells.get("text", ""))
    fault = fault_of(VERDICT_WORDS[word], reason, text)
    if fault:
        raise Unclear("reason", fault[0].rstrip(".").lower(), fault[1])
    return str(VERDICT_WORDS[word].value), reason, text


def _summary(faults: list[dict[str, Any]]) -> str:
    """Every bad row in one message; beyond ten the rest is counted (``rows`` has them all)."""
    said = [f"row {fault['row']}, {fault['column']}: {fault['message']}" for fault in faults[:SHOWN]]
    more = f"; and {len(faults) - SHOWN} more" if len(faults) > SHOWN else ""
    return f"{len(faults)} row{'s' * (len(faults) > 1)} cannot be applied: {'; '.join(said)}{more}."
