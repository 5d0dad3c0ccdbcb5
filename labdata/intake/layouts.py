"""Corrected mappings, remembered by the laboratory and the fingerprint of the header, and used for the next such file."""

import hashlib
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any

from django.contrib.auth.models import User
from django.db import transaction
from django.utils import timezone

from labdata import audit
from labdata.access import Action, require
from labdata.intake.corrections import Said, header_cell
from labdata.intake.findings import Findings
from labdata.intake.tables import Head, Table, header_at, may_be_header
from labdata.intake.workbook import Sheet
from labdata.models import Project, RememberedLayout

if TYPE_CHECKING:
    from labdata.intake.prepared import Prepared, PreparedTable

SEARCHED_ROWS = 100  # a header that a person once named is looked for in this many rows of a sheet


def fingerprint(table: Table) -> str:
    """SHA-256 over the header's texts and units, column by column; where in the sheet it stands does not matter."""
    heads = _named(table)
    left = heads[0].index if heads else 0
    lines = [f"{head.index - left}|{_plain(head.text)}|{_plain(head.unit_cell)}" for head in heads]
    return hashlib.sha256("\n".join(lines).encode()).hexdigest()


def _named(table: Table) -> list[Head]:
    return [head for head in table.heads if head.text]


def _plain(text: str) -> str:
    return " ".join(text.casefold().split())


@dataclass
class Memory:
    """The remembered layouts of one laboratory, by fingerprint."""

    known: dict[str, RememberedLayout] = field(default_factory=dict)

    @classmethod
    def of(cls, project: Project, laboratory: str) -> "Memory":
        """Those of the project for this laboratory; files that name no laboratory share theirs."""
        if project.pk is None:
            return cls()
        rows = RememberedLayout.objects.filter(project=project, laboratory_name__iexact=laboratory[:160])
        return cls({row.fingerprint: row for row in rows.select_related("made_by")})

    def headers(self, sheet: Sheet) -> list[tuple[int, int]]:
        """Rows, from 0, of the headers in this sheet whose place a person had to name before."""
        heights = {row.mapping.get("header_height", 0) for row in self.known.values()} - {0}
        found: list[tuple[int, int]] = []
        for first in range(min(SEARCHED_ROWS, len(sheet.rows))) if heights else ():
            if (found and first <= found[-1][1]) or not may_be_header(sheet.rows[first]):
                continue
            for height in sorted(heights, reverse=True):
                last = first + height - 1
                if last < len(sheet.rows) and self.names_header(header_at(sheet, first, last)):
                    found.append((first, last))
                    break
        return found

    def names_header(self, table: Table) -> bool:
        """True when the layout of this table was given its header rows by a person."""
        known = self.known.get(fingerprint(table))
        return known is not None and known.mapping.get("header_height", 0) == table.height

    def merge(self, table: Table, own: dict[int, Said], findings: Findings) -> dict[int, Said]:
        """What is said of the table's columns: for this file, and below that for its layout; the latter is noted."""
        known = self.known.get(fingerprint(table))
        if known is None:
            return own
        reason = _reason(known)
        left = _named(table)[0].index
        before = {
            left + one["offset"]: Said(one["field"], one["unit"], reason) for one in known.mapping.get("columns", [])
        }
        if before.keys() - own.keys() or not before:
            what = f"{len(before)} columns are" if len(before) > 1 else "A column is" if before else "The header is"
            findings.note(
                "remembered_layout",
                f"{what} read {reason}.",
                sheet=table.sheet.name,
                cell=header_cell(table, left),
                remedy="If that is not right here, correct it on the mapping desk.",
            )
        return before | {index: said.over(before.get(index, Said())) for index, said in own.items()}


def _reason(known: RememberedLayout) -> str:
    who = known.made_by.username if known.made_by else "an answer"
    return f"as corrected by {who} on {known.at:%Y-%m-%d} for this layout"


def remember(prepared: "Prepared") -> None:
    """Keep what was corrected in a file that lands. Inside the caller's transaction; one audit record a layout."""
    upload = prepared.upload
    if upload is None or not upload.options.get("remember", True):
        return
    user = User.objects.filter(pk=upload.options.get("corrected_by")).first() or upload.created_by
    for table in prepared.tables:
        if table.corrected and table.found is not None and _named(table.found):
            _keep(prepared, table, table.found, user)


def _keep(prepared: "Prepared", table: "PreparedTable", found: Table, user: User | None) -> None:
    heads = _named(found)
    lookup: dict[str, Any] = {
        "project": prepared.project,
        "laboratory_name": prepared.laboratory[:160],
        "fingerprint": fingerprint(found),
    }
    before = RememberedLayout.objects.filter(**lookup).values_list("mapping", flat=True).first()
    mapping = _mapping(table, found, heads[0].index)
    if mapping == before:
        return
    headers = " | ".join(head.text for head in heads)[:300]
    values = {"mapping": mapping, "headers": headers, "made_by": user, "at": timezone.now()}
    kept, _ = RememberedLayout.objects.update_or_create(**lookup, defaults=values)
    audit.record(
        "layout.remembered",
        kept,
        actor=user,
        project=prepared.project,
        before={"mapping": before} if before else None,
        after={"laboratory": kept.laboratory_name, "headers": headers, "mapping": mapping},
    )


def _mapping(table: "PreparedTable", found: Table, left: int) -> dict[str, Any]:
    texts = {head.index: head.text for head in found.heads}
    columns = [
        {"offset": index - left, "header": texts.get(index, ""), "field": said.field, "unit": said.unit}
        for index, said in sorted(table.said.items())
    ]
    return {"header_height": found.height if table.header_said else 0, "columns": columns}


def forget(*, layout: RememberedLayout, user: User) -> None:
    """Let the next file of this layout be read as recognised. Raises NotAllowed or NotFound."""
    require(user, layout.project, Action.UPLOAD)
    with transaction.atomic():
        before = {"laboratory": layout.laboratory_name, "headers": layout.headers, "mapping": layout.mapping}
        pk = layout.pk
        layout.delete()
        layout.pk = pk
        audit.record("layout.forgotten", layout, actor=user, project=layout.project, before=before)
