"""A project with nothing in it says what to do next; a cut-out shows the right cells whichever way a table lies."""

import io

import pytest
from django.core.files.base import ContentFile
from django.core.files.storage import default_storage
from django.urls import reverse
from openpyxl import Workbook

from labdata.models import Analysis, Result, Role, SourceColumn
from labdata.pages.sheet_extract import address, extract
from labdata.templatetags.show import age, bearing, canonical_decimals, evidence, figure, interval, value
from tests.release.scene import bare_scene, small_scene

pytestmark = pytest.mark.django_db

EMPTY = {
    "wells": "No well yet",
    "uploads": "No file yet",
    "jobs": "No job yet",
    "qc_runs": "QC has not run yet",
    "releases": "none is signed so far",
    "audit": "No entry fits",
    "project": "No review set yet",
    "release_new": "No review set is signed",
}


def test_every_empty_page_says_what_to_do_next(client):
    scene = bare_scene()
    for role in Role:
        client.force_login(scene.person(role))
        for name, said in EMPTY.items():
            answer = client.get(reverse(name, args=[scene.project.slug]))
            assert answer.status_code == 403 or said in answer.content.decode(), (name, role)


def stored(result: Result, cells: dict[tuple[int, int], object]) -> None:
    """Put a workbook with these cells behind the result."""
    book = Workbook()
    book.active.title = "Sheet1"
    for (row, column), held in cells.items():
        book.active.cell(row, column, held)
    out = io.BytesIO()
    book.save(out)
    file = result.column.table.report.source_file
    file.stored_as = default_storage.save("files/cut", ContentFile(out.getvalue()))
    file.save()


def some_result() -> Result:
    small_scene()
    return Result.objects.select_related("column__table__report__source_file", "analysis", "analyte").filter(
        analyte__code="S2"
    )[0]


def test_rows_far_from_the_head_are_cut_out_with_it():
    result = some_result()
    Analysis.objects.filter(pk=result.analysis_id).update(line=40)
    result.refresh_from_db()
    column = result.column.line
    stored(result, {(1, column): "S2", (2, column): "mg/g", **{(row, column): row for row in range(3, 60)}})
    found = extract(result)
    assert [line.number for line in found.lines] == [1, 2, 0, 36, 37, 38, 39, 40, 41, 42, 43, 44]
    assert [cell.text for line in found.lines for cell in line.cells if cell.mark == "this-cell"] == ["40"]
    assert address(result) == "F40"


def test_a_table_with_a_sample_a_column_is_cut_out_across():
    result = some_result()
    table = result.column.table
    table.orientation = "columns"
    table.save()
    SourceColumn.objects.filter(pk=result.column_id).update(line=9)
    Analysis.objects.filter(pk=result.analysis_id).update(line=12)
    result = Result.objects.select_related("column__table__report__source_file", "analysis").get(pk=result.pk)
    stored(result, {(9, column): column * 10 for column in range(1, 30)})
    found = extract(result)
    assert address(result) == "L9"
    assert found.letters == ["A", "B", "H", "I", "J", "K", "L", "M", "N", "O", "P"]
    assert [cell.text for line in found.lines for cell in line.cells if cell.mark == "this-cell"] == ["120"]


def test_a_sheet_that_is_gone_gives_no_cut_out():
    result = some_result()
    stored(result, {(1, 1): "x"})
    result.column.table.sheet = "Elsewhere"
    assert extract(result) is None


@pytest.mark.parametrize(
    ("decimals", "factor", "kept"),
    [(4, 100.0, 2), (0, 100.0, 0), (1, 10000.0, 0), (2, 1.0, 2), (1, 0.3048, 2), (1, 0.1, 2)],
)
def test_a_converted_value_keeps_its_precision(decimals, factor, kept):
    assert canonical_decimals(decimals, factor) == kept


def test_values_are_written_with_their_qualifier():
    result = some_result()
    result.decimals = 2
    assert value(result) == "5.00"
    result.qualifier = "<"
    assert value(result) == "< 5.00"
    result.value = None
    assert value(result) == "< limit not stated"


def test_small_words_for_numbers():
    assert (figure(0.1234567), figure(None), figure("x"), figure(True)) == ("0.123457", "–", "x", "True")
    assert (bearing(-38.2, "EW"), bearing(10.0, "NS"), bearing(None, "NS")) == ("38.200000° W", "10.000000° N", "–")
    assert (interval(None), interval(""), age(None)) == ("–", "–", "")
    assert evidence({"limit": 0.2, "rows": [1, {"a_b": 2}], "rule": "x", "empty": None}) == [
        ("limit", "0.2"), ("rows", "1, a b 2"),
    ]  # fmt: skip
    assert evidence("no mapping") == []
