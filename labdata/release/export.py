"""Datasets as files: Parquet, CSV, JSON, XLSX and LAS, long or wide. The same table gives the same bytes."""

import json
import re
from collections.abc import Callable
from dataclasses import dataclass
from datetime import datetime
from typing import IO

import pyarrow as pa
import pyarrow.compute as pc
import pyarrow.csv as pacsv
import xlsxwriter

from labdata.errors import InvalidInput
from labdata.release import las, parquet
from labdata.release.shapes import SHAPES

BATCH = 10_000
SHEET_ROWS = 1_048_576
# a spreadsheet runs a cell that begins so, unless it is a plain number such as -27.5
EXECUTABLE = r"^[=+\-@\t\r\n]"
NUMBER = r"^[+\-]?(\d+([.,]\d*)?|[.,]\d+)([eE][+\-]?\d+)?$"


@dataclass(frozen=True)
class Format:
    """One way to write. ``write`` gets the table in the wanted shape."""

    write: Callable[[pa.Table, IO[bytes]], None]
    content_type: str
    extension: str


def write(table: pa.Table, format_name: str, shape: str, out: IO[bytes]) -> None:
    """Write ``table`` (schema STORED) to ``out``. Raises InvalidInput for an unknown format or shape."""
    check(format_name, shape)
    if format_name == "las":
        las.write(table, out)  # a log has its own shape
    else:
        FORMATS[format_name].write(SHAPES[shape](table), out)


def check(format_name: str, shape: str) -> None:
    """Raises InvalidInput naming what is known."""
    for what, given, known in (("format", format_name, list(FORMATS)), ("shape", shape, list(SHAPES))):
        if given not in known:
            raise InvalidInput(f"«{given}» is no {what}.", remedy=f"Known: {', '.join(known)}.", field=what)


def _times_as_text(table: pa.Table) -> pa.Table:
    """Instants as ISO 8601 text in UTC, to the microsecond."""
    for place, column in enumerate(table.schema):
        if pa.types.is_timestamp(column.type):
            text = pc.strftime(table.column(place), format="%Y-%m-%dT%H:%M:%SZ", locale="C")
            table = table.set_column(place, column.name, text)
    return table


def disarmed(text: pa.ChunkedArray) -> pa.ChunkedArray:
    """Text that a spreadsheet would run gets an apostrophe before it; numbers written as text are left alone."""
    runs = pc.and_(pc.match_substring_regex(text, EXECUTABLE), pc.invert(pc.match_substring_regex(text, NUMBER)))
    return pc.if_else(pc.fill_null(runs, False), pc.binary_join_element_wise("'", text, ""), text)


def write_csv(table: pa.Table, out: IO[bytes]) -> None:
    """UTF-8, comma, decimal point; text in quotes; an absent number is empty."""
    table = _times_as_text(table)
    for place, column in enumerate(table.schema):
        if pa.types.is_string(column.type):
            table = table.set_column(place, column.name, disarmed(table.column(place)))
    table = table.rename_columns(disarmed(pa.chunked_array([table.column_names], pa.string())).to_pylist())
    pacsv.write_csv(table, out, pacsv.WriteOptions(batch_size=BATCH))


def write_json(table: pa.Table, out: IO[bytes]) -> None:
    """An array of objects, one a row, streamed."""
    table, lead = _times_as_text(table), b"[\n"
    for batch in table.to_batches(max_chunksize=BATCH):
        for row in batch.to_pylist():
            out.write(lead + json.dumps(row, ensure_ascii=False, allow_nan=False).encode())
            lead = b",\n"
    out.write(b"\n]\n" if lead == b",\n" else b"[]\n")


def write_xlsx(table: pa.Table, out: IO[bytes]) -> None:
    """One sheet with a frozen header. Text stays text: no cell becomes a formula, a link or a number."""
    if table.num_rows >= SHEET_ROWS:
        raise InvalidInput(
            f"{table.num_rows} rows do not fit into a sheet.", remedy="Ask for csv or parquet, or the wide shape."
        )
    book = xlsxwriter.Workbook(out, {"constant_memory": True, "default_date_format": "yyyy-mm-dd"})
    book.set_properties({"created": datetime(2000, 1, 1)})  # the data alone makes the bytes
    sheet = book.add_worksheet("data")
    bold = book.add_format({"bold": True})
    table = _times_as_text(table)
    for column, name in enumerate(table.column_names):
        sheet.write_string(0, column, name, bold)
    sheet.freeze_panes(1, 0)
    line = 0
    for batch in table.to_batches(max_chunksize=BATCH):
        for row in zip(*(column.to_pylist() for column in batch.columns), strict=True):
            line += 1
            for column, value in enumerate(row):
                if isinstance(value, str):
                    if value:
                        sheet.write_string(line, column, value)
                elif value is not None:
                    sheet.write_number(line, column, value)
    book.close()


FORMATS = {
    "parquet": Format(parquet.write, "application/vnd.apache.parquet", "parquet"),
    "csv": Format(write_csv, "text/csv; charset=utf-8", "csv"),
    "json": Format(write_json, "application/json", "json"),
    "xlsx": Format(write_xlsx, "application/vnd.openxmlformats-officedocument.spreadsheetml.sheet", "xlsx"),
    "las": Format(las.write, "text/plain; charset=utf-8", "las"),
}


def safe_name(text: str) -> str:
    """``text`` as part of a file name."""
    return re.sub(r"[^A-Za-z0-9._-]+", "-", text).strip("-.") or "data"
