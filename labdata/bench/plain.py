"""What an analyst's script does with the same files and tables: the baselines."""

import io
import sqlite3
import tempfile
from collections.abc import Sequence
from contextlib import closing
from pathlib import Path

import numpy as np
import pandas as pd
from python_calamine import CalamineWorkbook

from labdata.bench.workload import HEADERS, LIMIT

HEADER_ROW = 2
INSERT = (
    "INSERT INTO labdata_result (analysis_id, analyte_id, column_id, value, qualifier, value_reported, decimals, current)"
    " VALUES (?, ?, ?, ?, ?, ?, 2, 1)"
)
NUMBERS = [name for name in HEADERS if name not in {"well", "sample", "kind", "formation"}]


def script(content: bytes) -> str:
    """Read with openpyxl, split ``<`` from numbers, compute the indices, flag, write CSV. Returns the CSV text."""
    frame = read_excel(content, "openpyxl")
    out = flagged(with_indices(numeric(frame)))
    return out.to_csv(index=False)


def read_excel(content: bytes, engine: str) -> pd.DataFrame:
    """The table of one workbook under short names."""
    frame = pd.read_excel(io.BytesIO(content), header=HEADER_ROW, engine=engine)  # type: ignore[call-overload]
    return frame.rename(columns={header: name for name, header in HEADERS.items()})


def numeric(frame: pd.DataFrame) -> pd.DataFrame:
    """Numbers and qualifiers of every measured column."""
    out = frame.copy()
    for name in NUMBERS:
        text = frame[name].astype(str)
        out[f"{name}_qualifier"] = np.where(text.str.startswith("<"), "<", "")
        out[name] = pd.to_numeric(text.str.lstrip("<"), errors="coerce")
    return out


def with_indices(frame: pd.DataFrame) -> pd.DataFrame:
    """HI, OI, PI and OSI computed beside the reported ones."""
    return frame.assign(
        hi_calc=100 * frame["s2"] / frame["toc"], oi_calc=100 * frame["s3"] / frame["toc"],
        pi_calc=frame["s1"] / (frame["s1"] + frame["s2"]), osi_calc=100 * frame["s1"] / frame["toc"],
    )  # fmt: skip


def flagged(frame: pd.DataFrame) -> pd.DataFrame:
    """A dozen checks as columns of True and False."""
    repeated = frame.duplicated(["well", "top", "base"], keep=False)
    return frame.assign(
        bad_hi=(frame["hi"] - frame["hi_calc"]).abs() > 0.02 * frame["hi_calc"] + 1,
        bad_pi=(frame["pi"] - frame["pi_calc"]).abs() > 0.01,
        carbon=0.083 * (frame["s1"] + frame["s2"]) > frame["toc"],
        negative=(frame[["s1", "s2", "s3", "toc"]] < 0).any(axis=1), lean=frame["toc"] < 0.5,
        small_s2=frame["s2"] < 0.2, tmax_odd=~frame["tmax"].between(400, 510), oily=frame["osi_calc"] > 100,
        pi_high=(frame["pi_calc"] > 0.2) & (frame["tmax"] < 435), upside_down=frame["base"] <= frame["top"],
        deep=frame["base"] > 6000, repeated=repeated,
    )  # fmt: skip


def row_by_row(rows: Sequence[dict[str, float]]) -> list[tuple[int, str]]:
    """The same dozen checks as a loop over dictionaries: (row, check) of every firing."""
    seen: dict[tuple[object, ...], int] = {}
    fired = []
    for number, row in enumerate(rows):
        for check, fires in _checks(row).items():
            if fires:
                fired.append((number, check))
        place = (row["well"], row["top"], row["base"])
        if place in seen:
            fired.append((number, "repeated"))
        seen[place] = number
    return fired


def _checks(row: dict[str, float]) -> dict[str, bool]:
    toc, s1, s2, s3, tmax = row["toc"], row["s1"], row["s2"], row["s3"], row["tmax"]
    hi, pi, osi = 100 * s2 / toc, s1 / (s1 + s2), 100 * s1 / toc
    return {
        "bad_hi": abs(row["hi"] - hi) > 0.02 * hi + 1, "bad_pi": abs(row["pi"] - pi) > 0.01,
        "carbon": 0.083 * (s1 + s2) > toc, "negative": min(s1, s2, s3, toc) < 0, "lean": toc < 0.5,
        "small_s2": s2 < 0.2, "tmax_odd": not 400 <= tmax <= 510, "oily": osi > 100,
        "pi_high": pi > 0.2 and tmax < 435, "upside_down": row["base"] <= row["top"], "deep": row["base"] > 6000,
    }  # fmt: skip


def calamine(content: bytes) -> int:
    """Nothing but reading every cell. Returns the number of rows."""
    book = CalamineWorkbook.from_filelike(io.BytesIO(content))
    return len(book.get_sheet_by_index(0).to_python())


def read_and_insert(content: bytes, schema: Sequence[str], folder: Path) -> int:
    """Read every cell and put each measured value into a bare table of results: the floor under any intake.

    ``schema`` are the statements that make the table of results with its constraints and indexes; it is made in a
    database file of its own in ``folder``. Returns how many values went in.
    """
    book = CalamineWorkbook.from_filelike(io.BytesIO(content))
    sheet = book.get_sheet_by_index(0).to_python()[HEADER_ROW + 1 :]
    first = list(HEADERS).index("toc")
    values = [
        (
            line,
            place,
            place,
            cell if isinstance(cell, float) else LIMIT,
            "" if isinstance(cell, float) else "<",
            str(cell),
        )
        for line, row in enumerate(sheet)
        for place, cell in enumerate(row[first:])
    ]
    with tempfile.NamedTemporaryFile(dir=folder) as file, closing(sqlite3.connect(file.name)) as database:
        for statement in schema:
            database.execute(statement)
        database.executemany(INSERT, values)
        database.commit()
    return len(values)


def parquet_copy(content: bytes) -> bytes:
    """Read a Parquet file into pandas and write it again."""
    stream = io.BytesIO()
    pd.read_parquet(io.BytesIO(content)).to_parquet(stream, index=False)
    return stream.getvalue()
