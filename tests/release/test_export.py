"""Parquet, CSV, JSON, XLSX and LAS of one release hold the same."""

import csv
import io
import json
import zipfile

import lasio
import openpyxl
import pandas as pd
import pyarrow as pa
import pyarrow.parquet as pq
import pytest

from labdata.errors import InvalidInput
from labdata.release import export, las
from labdata.release.columns import LONG, STORED
from labdata.release.export import disarmed
from labdata.release.pull import pull_current, pull_release
from labdata.release.rows import long_table
from labdata.release.shapes import usable
from tests.release.scene import bare_scene, release_of, signed_scene

pytestmark = pytest.mark.django_db


@pytest.fixture
def scene():
    return signed_scene()


@pytest.fixture
def release(scene):
    return release_of(scene)


def pulled(release, format_name, shape="long", include=""):
    return pull_release(release, format_name=format_name, shape=shape, include=include).file.read()


def written(table, format_name, shape="long"):
    out = io.BytesIO()
    export.write(table, format_name, shape, out)
    return out.getvalue()


def plain(rows):
    """Rows with times as text, for comparing what has types with what has none."""
    return [
        {
            name: value.strftime("%Y-%m-%dT%H:%M:%S.%fZ") if hasattr(value, "strftime") else value
            for name, value in row.items()
        }
        for row in rows
    ]


@pytest.mark.parametrize("shape", ["long", "wide"])
@pytest.mark.parametrize("include", ["", "rejected"])
def test_parquet_csv_json_and_xlsx_hold_the_same(release, shape, include):
    table = pq.read_table(io.BytesIO(pulled(release, "parquet", shape, include)))
    rows = plain(table.to_pylist())
    assert json.loads(pulled(release, "json", shape, include)) == rows
    [head, *lines] = list(csv.reader(io.StringIO(pulled(release, "csv", shape, include).decode())))
    assert head == table.column_names
    assert lines == [[_as_csv(value) for value in row.values()] for row in rows]
    sheet = openpyxl.load_workbook(io.BytesIO(pulled(release, "xlsx", shape, include))).active
    [head, *lines] = [list(line) for line in sheet.iter_rows(values_only=True)]
    assert head == table.column_names
    assert lines == [[None if value == "" else value for value in row.values()] for row in rows]


def _as_csv(value):
    if value is None:
        return ""
    return value if isinstance(value, str) else str(int(value)) if value == int(value) else repr(value)


def test_the_long_release_has_the_columns_of_the_contract(release):
    assert pq.read_table(io.BytesIO(pulled(release, "parquet"))).schema.names == LONG.names


@pytest.mark.parametrize("format_name", ["parquet", "csv", "json", "xlsx", "las"])
def test_the_same_release_gives_the_same_bytes(release, format_name):
    table = usable(pq.read_table(io.BytesIO(release_bytes(release))))
    assert pulled(release, format_name) == written(table, format_name) == written(table, format_name)


def release_bytes(release):
    from django.core.files.storage import default_storage  # noqa: PLC0415

    with default_storage.open(release.stored_as) as stream:
        return stream.read()


def test_current_data_hold_every_result_with_its_verdict(scene):
    download = pull_current(scene.project, format_name="csv", shape="long")
    frame = pd.read_csv(download.file, keep_default_na=False)
    assert frame["verdict"].value_counts().to_dict() == {"accepted": 29, "rejected": 1}
    assert download.name == f"{scene.project.slug}-current-long.csv"


HOSTILE = ["=1+1", "+cmd|' /C calc'!A0", "-2+3", "@SUM(A1)", "\t=1", "\r=1", '=HYPERLINK("http://x")']
HARMLESS = ["-27.5", "+3", "-1e-5", "-0,5", "<0.05", "a=b", "", "O'Hara 1", "1-2"]


@pytest.mark.parametrize("text", HOSTILE)
def test_text_that_a_spreadsheet_would_run_is_disarmed(text):
    assert disarmed(pa.chunked_array([[text]])).to_pylist() == [f"'{text}"]


@pytest.mark.parametrize("text", HARMLESS)
def test_other_text_is_left_alone(text):
    assert disarmed(pa.chunked_array([[text]])).to_pylist() == [text]


def hostile_table():
    """One row whose every text is a formula."""
    row = {field.name: '=HYPERLINK("http://x","y")' if pa.types.is_string(field.type) else None for field in STORED}
    row |= {
        "verdict": "accepted",
        "lost_inputs": "",
        "value": -5.5,
        "value_reported": "-5.5",
        "well": "=1+1",
        "top_m": 2000.0,
    }
    return pa.Table.from_pylist([row], schema=STORED)


@pytest.mark.parametrize("shape", ["long", "wide"])
def test_no_cell_of_a_workbook_is_a_formula(shape):
    book = openpyxl.load_workbook(io.BytesIO(written(hostile_table(), "xlsx", shape)))
    cells = [cell for line in book.active.iter_rows(min_row=2) for cell in line if cell.value is not None]
    assert {cell.data_type for cell in cells} == {"s", "n"}
    assert not [cell for cell in cells if cell.hyperlink]
    assert book.active["B2"].value == "=1+1"


def test_no_field_of_a_csv_is_a_formula():
    [head, line] = list(csv.reader(io.StringIO(written(hostile_table(), "csv").decode())))
    row = dict(zip(head, line, strict=True))
    assert row["well"] == "'=1+1"
    assert (row["value"], row["value_reported"]) == ("-5.5", "-5.5")
    assert not [text for name, text in row.items() if text[:1] in "=+@" and text]


def test_a_hostile_analyte_code_is_disarmed_in_the_header_too():
    table = hostile_table()
    head = written(table, "csv", "wide").decode().splitlines()[0]
    assert "'=HYPERLINK" in head


def test_a_sheet_that_would_overflow_is_refused(monkeypatch, release):
    monkeypatch.setattr(export, "SHEET_ROWS", 5)
    with pytest.raises(InvalidInput, match="do not fit into a sheet"):
        pulled(release, "xlsx")


@pytest.mark.parametrize(("format_name", "shape", "include", "message"), [
    ("pdf", "long", "", "«pdf» is no format. Known: parquet, csv, json, xlsx, las."),
    ("csv", "tall", "", "«tall» is no shape. Known: long, wide."),
    ("csv", "long", "held", "«held» is nothing that can be included."),
])  # fmt: skip
def test_an_unknown_wish_is_named(release, format_name, shape, include, message):
    with pytest.raises(InvalidInput) as refused:
        pull_release(release, format_name=format_name, shape=shape, include=include)
    assert message in str(refused.value)


def read_log(content):
    return lasio.read(io.StringIO(content.decode()), engine="normal")


def test_two_wells_are_a_zip_of_two_logs(scene, release):
    folder = zipfile.ZipFile(io.BytesIO(pulled(release, "las")))
    assert folder.namelist() == ["Quill-1.las", "Quill-2.las"]
    log = read_log(folder.read("Quill-2.las"))
    assert (log.version["VERS"].value, log.well["WELL"].value) == (2.0, "Quill 2")
    assert log.well["NULL"].value == -999.25
    assert log.well["UWI"].value == scene.sets[1].well.uwi
    assert log.curves["HI"].unit == "mg/g_TOC"
    assert list(log["DEPT"]) == [2000.0, 2010.0, 2020.0]
    assert list(log["BASE"]) == [2005.0, 2015.0, 2025.0]


def test_a_log_gives_back_every_value_and_qualifier(release):
    rows = json.loads(pulled(release, "json"))
    folder = zipfile.ZipFile(io.BytesIO(pulled(release, "las")))
    found = 0
    for name in folder.namelist():
        log = read_log(folder.read(name))
        frame = log.df()
        for row in (row for row in rows if row["well"] == log.well["WELL"].value):
            assert frame.loc[row["top_m"], row["analyte"]] == row["value"]
            if row["qualifier"]:
                assert frame.loc[row["top_m"], f"{row['analyte']}_Q"] == -1
            found += 1
    assert found == len(rows)


def test_one_well_is_one_log_and_replicates_have_curves_of_their_own():
    scene = bare_scene()
    well, held = scene.well("Heath 4")
    table, sample = scene.table(), scene.sample(well, 1500.5)
    for number, (method, value) in enumerate([("pyrolysis", "1.5"), ("pyrolysis", "1.7"), ("carbon", "1.6")]):
        scene.analysis(held, (table, 5 + number), sample, method, {"TOC": value}, replicate=number + 1)
    other = scene.sample(well, 1510.0)
    scene.analysis(held, (table, 9), other, "carbon", {"TOC": "<"})
    content = written(long_table(scene.project), "las")
    log = read_log(content)
    assert log.curves.keys() == [
        "DEPT",
        "BASE",
        "TVD",
        "TOC_CARBON",
        "TOC_CARBON_Q",
        "TOC_PYROLYSIS",
        "TOC_PYROLYSIS_2",
    ]
    frame = log.df()
    assert frame.loc[1500.5, ["TOC_PYROLYSIS", "TOC_PYROLYSIS_2", "TOC_CARBON"]].tolist() == [1.5, 1.7, 1.6]
    assert frame.loc[1510.0].isna()["TOC_CARBON"]
    assert frame.loc[1510.0, "TOC_CARBON_Q"] == -1


def test_values_without_depth_are_counted_in_the_log():
    scene = bare_scene()
    well, held = scene.well("Heath 5")
    sample = scene.sample(well, 1500)
    type(sample).objects.filter(pk=sample.pk).update(top_md_m=None, base_md_m=None)
    scene.analysis(held, (scene.table(), 5), sample, "carbon", {"TOC": 2})
    content = written(long_table(scene.project), "las").decode()
    assert "1 results have no measured depth and are not in this log." in content


def test_a_log_without_a_well_is_refused():
    with pytest.raises(InvalidInput, match="The dataset has no well"):
        las.write(long_table(bare_scene().project), io.BytesIO())
