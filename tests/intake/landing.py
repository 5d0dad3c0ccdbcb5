"""Bringing files in, in a test's own transaction: read, match and store as the pipeline does."""

import io
from types import SimpleNamespace

import openpyxl
from django.db import transaction

from labdata.intake import services
from labdata.intake.workbook import letters
from labdata.models import Result
from labdata.registry.services import store

QUIET = SimpleNamespace(tick=lambda note="": None)


def land(project, content, name="report.csv", **options):
    """Receive a file and carry it through; returns what landed."""
    content = content.encode() if isinstance(content, str) else content
    options.setdefault("create_wells", True)
    upload = services.receive(project=project, name=name, content=content, user=options.pop("user", None), **options)
    return carry(upload)


def carry(upload):
    """The intake and registry steps of an upload."""
    prepared = services.prepare(upload, QUIET)
    with transaction.atomic():
        return store(prepared)


def entry(project, content, name="report.csv", **options):
    """The contract's entry of a file, without writing."""
    content = content.encode() if isinstance(content, str) else content
    options = {"create_wells": True, "well": "Quill 1"} | options
    return services.preview(project=project, name=name, content=content, **options)


def workbook(fill):
    """The bytes of an .xlsx that ``fill`` wrote into."""
    book = openpyxl.Workbook()
    fill(book)
    stream = io.BytesIO()
    book.save(stream)
    return stream.getvalue()


def cells_of(report):
    """{(sheet, address): result row} of every result of a report, the address derived from analysis and column."""
    fields = (
        "pk", "value", "qualifier", "value_reported", "decimals", "analyte__code", "column__line", "column__factor",
        "column__table__sheet", "analysis__line", "analysis__method__code", "analysis__sample_id", "analysis__replicate",
    )  # fmt: skip
    rows = Result.objects.filter(analysis__report=report).values(*fields)
    return {
        (row["column__table__sheet"], f"{letters(row['column__line'] - 1)}{row['analysis__line']}"): row for row in rows
    }


def findings_of(answer, level):
    return [finding for finding in answer["findings"] if finding["level"] == level]
