"""Values of methods that not every well has: one frame a method, holding only the analytes that were measured.

A panel is indexed by row of ``Table.rows`` and has, for each of its analytes X, the columns ``X``, ``X_q``, ``X_d``,
``X_h``, ``X_id``, ``X_text``, ``X_col``, ``X_row``, ``X_rej`` of qc/rules/table.py. A method that nobody measured has no
panel, and rules that read it have nothing to do.
"""

from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

import numpy as np
import pandas as pd

from labdata.intake.fields import catalogue
from qc.rules.spans import num

if TYPE_CHECKING:
    from qc.rules.table import Table

METHODS = ("elements", "minerals", "core", "isotopes", "gc")
SUFFIXES: Mapping[str, tuple[object, str]] = {
    "": (np.nan, "float64"), "_q": ("", "object"), "_d": (0, "int64"), "_h": (np.nan, "float64"),
    "_id": (-1, "int64"), "_text": ("", "object"), "_col": (-1, "int64"), "_row": (-1, "int64"),
    "_rej": (False, "bool"),
}  # fmt: skip


def unit_of(analyte: str) -> str:
    """Canonical unit by the catalogue of analytes; '' where it knows none."""
    return str(catalogue()["analytes"].get(analyte, {}).get("unit", ""))


def codes_of(method: str) -> tuple[str, ...]:
    """Analytes that the catalogue lists under the method, in its order."""
    return tuple(code for code, entry in catalogue()["analytes"].items() if entry["method"] == method)


def gather(table: "Table", method: str, analytes: tuple[str, ...]) -> pd.DataFrame:
    """Rows of one method, with these analytes as measured there, else by another method on the same sample."""
    own = table.panels.get(method)
    if own is None or own.empty:
        return pd.DataFrame()
    rows = table.rows.loc[own.index]
    made = {str(name): rows[name] for name in rows.columns if name in _identity()}
    for analyte in analytes:
        made |= _columns(table, method, own, rows["sample"], analyte)
    return pd.DataFrame(made, index=own.index)


def _identity() -> frozenset[str]:
    from qc.rules.table import IDENTITY  # noqa: PLC0415 - table.py reads this module

    return frozenset(IDENTITY)


def _columns(table: "Table", method: str, own: pd.DataFrame, sample: pd.Series, analyte: str) -> dict[str, pd.Series]:
    size = len(own)
    made = {}
    for suffix, (default, kind) in SUFFIXES.items():
        name = f"{analyte}{suffix}"
        made[name] = own[name].copy() if name in own else pd.Series(np.full(size, default, dtype=kind), index=own.index)
    for donors in _elsewhere(table, method, analyte):
        lacking = made[f"{analyte}_id"].to_numpy() < 0
        takers = own.index[lacking & sample.isin(donors.index).to_numpy()]
        for suffix in SUFFIXES if len(takers) else ():
            made[f"{analyte}{suffix}"].loc[takers] = donors.loc[sample[takers], f"{analyte}{suffix}"].to_numpy()
    return made


def _elsewhere(table: "Table", method: str, analyte: str) -> list[pd.DataFrame]:
    """The first analysis a sample that holds the analyte, by other methods than ``method``; indexed by sample."""
    name = f"{analyte}_id"
    sources = [frame for other, frame in table.panels.items() if other != method and name in frame]
    if name in table.rows:
        sources.append(table.rows[table.rows["method"] != method])
    found = []
    for source in sources:
        holding = source[source[name] >= 0]
        if len(holding):
            found.append(holding.assign(_sample=table.rows.loc[holding.index, "sample"]).drop_duplicates("_sample"))
    return [frame.set_index("_sample") for frame in found]


def cell(table: "Table", row: int, analyte: str) -> dict[str, Any] | None:
    """Value and place of an analyte of one row or, where another method holds it, of its sample: keys of ``SUFFIXES``."""
    method, sample, name = table.rows.at[row, "method"], table.rows.at[row, "sample"], f"{analyte}_id"
    for frame in (table.panels.get(str(method)), table.rows):
        if frame is not None and name in frame and row in frame.index and num(frame, row, name) >= 0:
            return {suffix: frame.at[row, f"{analyte}{suffix}"] for suffix in SUFFIXES}
    for donors in _elsewhere(table, str(method), analyte):
        if sample in donors.index:
            return {suffix: donors.at[sample, f"{analyte}{suffix}"] for suffix in SUFFIXES}
    return None
