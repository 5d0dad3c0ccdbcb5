"""The typed table that rules read: analyses as rows, each analyte as a group of columns.

For every analyte code X of ``ANALYTES``: ``X`` float in the canonical unit (NaN where not measured), ``X_q``
qualifier, ``X_d`` decimals of the cell, ``X_h`` half a unit of the last decimal in the canonical unit, ``X_id``
result id (-1 where none), ``X_text`` as reported, ``X_col`` column of the source table (-1 where none), ``X_row`` the
row of the analysis that holds it (a value may come from another analysis of the same sample), ``X_rej`` True where a
person rejected it.
"""

from collections.abc import Mapping
from dataclasses import dataclass, field, replace

import numpy as np
import pandas as pd

from qc.rules.rule import Answer
from qc.rules.spans import num, word

UNITS = {
    "TOC": "wt%", "TIC": "wt%", "TC": "wt%", "CARB": "wt%", "MINC": "wt%", "S1": "mg/g", "S2": "mg/g", "S3": "mg/g",
    "TMAX": "degC", "HI": "mg/g TOC", "OI": "mg/g TOC", "PI": "fraction", "OSI": "mg/g TOC", "S2S3": "ratio",
    "GP": "mg/g", "PC": "wt%", "RC": "wt%", "RO": "%", "RO_SD": "%", "RO_N": "", "RO_MIN": "%", "RO_MAX": "%",
    "ALGINITE": "%", "SIDERITE": "wt%", "ILLITE": "wt%",
    "TOC_CARBON": "wt%",  # TOC of the separate carbon analysis of the same sample
}  # fmt: skip
ANALYTES = tuple(UNITS)
CORE_KINDS = frozenset({"core", "plug", "sidewall"})
NOT_ROCK = frozenset({"fluid", "additive"})
VALUE_DEFAULTS: dict[str, tuple[object, str]] = {
    "": (np.nan, "float64"), "_q": ("", "object"), "_d": (0, "int64"), "_h": (np.nan, "float64"),
    "_id": (-1, "int64"), "_text": ("", "object"), "_col": (-1, "int64"), "_row": (-1, "int64"),
    "_rej": (False, "bool"),
}  # fmt: skip
IDENTITY: dict[str, object] = {
    "well": 0, "analysis": -1, "sample": -1, "label": "", "kind": "unknown", "formation": "", "unit": "",
    "top_m": np.nan, "base_m": np.nan, "top_text": "", "base_text": "", "depth_unit": "", "depth_kind": "",
    "method": "pyrolysis", "replicate": 1, "replicate_stated": False, "role": "sample", "lab_number": "", "remark": "",
    "laboratory": "", "report": "", "table": 0, "line": 0, "file": "", "sheet": "", "across": False, "match_key": "",
}  # fmt: skip
WELL_COLUMNS = ("name", "uwi", "td_m", "datum_m", "ground_m", "water_m")


@dataclass(frozen=True)
class Table:
    """Analyses of one or more wells, and what is known along the wells.

    ``rows`` as the module says, indexed 0..n-1; ``wells`` indexed by ``rows.well`` with name, uwi, td_m, datum_m,
    ground_m, water_m; ``tops`` (well, name, top_m, version), ``cores`` (well, number, top_m, base_m, shift_m),
    ``muds`` (well, top_m, base_m, kind, additives). ``answers`` are those of the rules that ran before.
    """

    rows: pd.DataFrame
    wells: pd.DataFrame
    tops: pd.DataFrame
    cores: pd.DataFrame
    muds: pd.DataFrame
    answers: Mapping[str, Answer] = field(default_factory=dict)

    def of(self, *methods: str) -> pd.DataFrame:
        """Rows of these methods, index kept."""
        return self.rows[self.rows["method"].isin(methods)]

    def samples(self) -> pd.DataFrame:
        """The first row of each sample: for what is true of the sample whatever was measured on it."""
        return self.rows.drop_duplicates("sample")

    def knowing(self, answers: Mapping[str, Answer]) -> "Table":
        return replace(self, answers=answers)

    def name(self, row: int) -> str:
        """The sample as people call it."""
        label, top = word(self.rows, row, "label"), num(self.rows, row, "top_m")
        depth = "" if np.isnan(top) else f"{top:.2f} m"
        return " at ".join(part for part in (label, depth) if part) or f"line {num(self.rows, row, 'line'):.0f}"


def frame(columns: Mapping[str, object], size: int) -> pd.DataFrame:
    """A rows frame of ``size`` rows from the columns at hand; absent ones get their defaults."""
    made = {name: columns.get(name, default) for name, default in IDENTITY.items()}
    for analyte in ANALYTES:
        for suffix, (default, kind) in VALUE_DEFAULTS.items():
            given = columns.get(f"{analyte}{suffix}", default)
            made[f"{analyte}{suffix}"] = np.full(size, given, dtype=kind) if np.isscalar(given) else given
    kinds = {name: object if isinstance(default, str) else type(default) for name, default in IDENTITY.items()}
    return pd.DataFrame(made, index=pd.RangeIndex(size)).astype(kinds)


def no_things(*columns: str) -> pd.DataFrame:
    """An empty frame for what a well has no record of."""
    return pd.DataFrame({name: pd.Series(dtype=object if name in _TEXTS else float) for name in columns})


_TEXTS = frozenset({"name", "version", "kind", "additives"})
TOPS = ("well", "name", "top_m", "version")
CORES = ("well", "number", "top_m", "base_m", "shift_m")
MUDS = ("well", "top_m", "base_m", "kind", "additives")
