"""A table from plain records: for tests, rehearsals and anyone who has values but no database.

A record is a mapping with identity columns (well, label, kind, top_m, ...) and analyte codes; a value is a number or
the text of a cell (``"<0.05"``, ``"0.90"``), which carries its decimals.
"""

import re
from collections.abc import Iterable, Mapping, Sequence
from typing import Any

import numpy as np
import pandas as pd

from labdata.intake.fields import catalogue
from qc.rules.decimals import batch_of, half_units
from qc.rules.panels import METHODS
from qc.rules.table import (
    ANALYTES,
    CORES,
    CURVES,
    IDENTITY,
    MUDS,
    SHOES,
    SURVEY,
    TOPS,
    WELL_COLUMNS,
    WELL_TEXTS,
    Table,
    controls_of,
    frame,
    no_things,
)

PLACES = 1000  # columns a row has room for
PANEL_PLACE = 500  # columns of panels stand behind those of the rows
_CELL = re.compile(r"^\s*([<>~]?)\s*([-+]?(?:\d+\.?(\d*)|\.(\d+)))?\s*$")


def read(cell: Any) -> tuple[float, str, int, str] | None:
    """(value, qualifier, decimals, text) of a cell; None for a blank. Raises ValueError for other text."""
    if cell is None or (isinstance(cell, float) and np.isnan(cell)) or cell == "":
        return None
    text = cell.strip() if isinstance(cell, str) else repr(cell)
    found = _CELL.match(text)
    if not found or text in {"", "<", ">", "~"}:
        raise ValueError(f"{text!r} is not a number with an optional <, > or ~ before it")
    whole = float(found.group(2)) if found.group(2) else float("nan")
    decimals = (found.group(3) or found.group(4) or "") if isinstance(cell, str) else text.partition(".")[2].rstrip("0")
    return whole, found.group(1), len(decimals), text


def table_of(
    records: Iterable[Mapping[str, Any]],
    *,
    wells: Sequence[Mapping[str, Any]] = (),
    tops: Sequence[Sequence[Any]] = (),
    cores: Sequence[Sequence[Any]] = (),
    muds: Sequence[Sequence[Any]] = (),
    shoes: Sequence[Sequence[Any]] = (),
    survey: Sequence[Sequence[Any]] = (),
    curves: Sequence[Sequence[Any]] = (),
    controls: Sequence[Mapping[str, Any]] = (),
    headers: Mapping[tuple[int, str], str] | None = None,
) -> Table:
    """The table of the records; ``wells`` in the order of their numbers, the others as rows of ``TOPS``, ``CORES`` and so on.

    What a row leaves out at its end is unknown.
    """
    listed = [dict(record) for record in records]
    columns: dict[str, object] = {
        name: [record.get(name, default) for record in listed] for name, default in IDENTITY.items()
    }
    columns["sample"] = [record.get("sample", row) for row, record in enumerate(listed)]
    columns["line"] = [record.get("line", row + 2) for row, record in enumerate(listed)]
    columns["unit"] = [record.get("unit", record.get("formation", "")) for record in listed]
    for place, analyte in enumerate(ANALYTES):
        columns |= _analyte(listed, analyte, place)
    count = max([len(wells), *(int(record.get("well", 0)) + 1 for record in listed)])
    known = pd.DataFrame([dict(well) for well in wells], index=range(len(wells)), columns=list(WELL_COLUMNS)).reindex(
        range(count)
    )
    known["name"] = known["name"].fillna("Quill 1")
    known[list(WELL_TEXTS)] = known[list(WELL_TEXTS)].fillna("")
    known = known.astype(dict.fromkeys(WELL_COLUMNS[len(WELL_TEXTS) :], float))
    things = {"tops": (tops, TOPS), "cores": (cores, CORES), "muds": (muds, MUDS), "shoes": (shoes, SHOES),
              "survey": (survey, SURVEY), "curves": (curves, CURVES)}  # fmt: skip
    around: dict[str, Any] = {name: _things(*given) for name, given in things.items()}
    panels = _panels(listed)
    named = {(number, _place(panels, code)): text for (number, code), text in (headers or {}).items()}
    held: dict[str, Any] = {"panels": panels, "controls": controls_of(list(controls)), "headers": named}
    return Table(frame(columns, len(listed)), known, **around, **held)


def _place(panels: Mapping[str, pd.DataFrame], code: str) -> int:
    """The column in which an analyte stands."""
    return next(int(frame[f"{code}_col"].max()) for frame in panels.values() if f"{code}_col" in frame)


def _panels(records: list[dict[str, Any]]) -> dict[str, pd.DataFrame]:
    """Panels of the methods that have them, from the records of those methods."""
    made, known = {}, catalogue()["analytes"]
    for method in METHODS:
        index = [row for row, record in enumerate(records) if record.get("method") == method]
        own = [record if record.get("method") == method else {} for record in records]
        columns: dict[str, object] = {}
        for place, code in enumerate(sorted({code for row in index for code in records[row] if code in known})):
            columns |= _analyte(own, code, PANEL_PLACE + place)
        if index:
            made[method] = pd.DataFrame(columns, index=range(len(records))).loc[index]
    return made


def _things(rows: Sequence[Sequence[Any]], columns: tuple[str, ...]) -> pd.DataFrame:
    if not rows:
        return no_things(*columns)
    return pd.DataFrame([[*row, *[None] * (len(columns) - len(row))] for row in rows], columns=list(columns))


def _analyte(records: list[dict[str, Any]], analyte: str, place: int) -> dict[str, object]:
    cells = [read(record.get(analyte)) for record in records]
    present = np.array([cell is not None for cell in cells], dtype=bool)
    shown = [cell or (np.nan, "", 0, "") for cell in cells]
    value, qualifier, decimals, text = (list(part) for part in zip(*shown, strict=True)) if shown else ([], [], [], [])
    rows = np.arange(len(records))
    half = np.full(len(records), np.nan)
    if present.any():
        of = pd.DataFrame(
            {
                "column": [record.get("table", 0) for record in records],
                "batch": [batch_of(str(record.get("label", ""))) for record in records],
                "d": decimals,
            }
        )[present]
        half[present] = half_units(of["column"], of["batch"], of["d"], of["d"])
    rejected = [analyte in record.get("rejected", ()) for record in records]
    return {
        analyte: np.array(value, dtype=float), f"{analyte}_q": qualifier, f"{analyte}_d": decimals, f"{analyte}_h": half,
        f"{analyte}_id": np.where(present, rows * PLACES + place, -1), f"{analyte}_text": text,
        f"{analyte}_col": np.where(present, place + 1, -1), f"{analyte}_row": np.where(present, rows, -1),
        f"{analyte}_rej": np.array(rejected, dtype=bool),
    }  # fmt: skip
