"""The typed table that rules read: analyses as rows, each analyte as a group of columns.

For every analyte code X of ``ANALYTES``: ``X`` float in the canonical unit (NaN where not measured), ``X_q``
qualifier, ``X_d`` decimals of the cell, ``X_h`` half a unit of the last decimal in the canonical unit, ``X_id``
result id (-1 where none), ``X_text`` as reported, ``X_col`` column of the source table (-1 where none), ``X_row`` the
row of the analysis that holds it (a value may come from another analysis of the same sample), ``X_rej`` True where a
person rejected it.
"""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace

import numpy as np
import pandas as pd

from qc.rules.panels import SUFFIXES, gather
from qc.rules.rule import Answer
from qc.rules.spans import num, word

UNITS = {
    "TOC": "wt%", "TIC": "wt%", "TC": "wt%", "CARB": "wt%", "MINC": "wt%", "S1": "mg/g", "S2": "mg/g", "S3": "mg/g",
    "TMAX": "degC", "HI": "mg/g TOC", "OI": "mg/g TOC", "PI": "fraction", "OSI": "mg/g TOC", "S2S3": "ratio",
    "GP": "mg/g", "PC": "wt%", "RC": "wt%", "RO": "%", "RO_SD": "%", "RO_N": "", "RO_MIN": "%", "RO_MAX": "%",
    "ALGINITE": "%", "SIDERITE": "wt%", "ILLITE": "wt%",
    "TOC_CARBON": "wt%",  # TOC of the separate carbon analysis of the same sample
    "ALIQUOT": "mg",  # mass pyrolysed
    "GR": "API",  # of core
    "TS": "wt%",
}  # fmt: skip
ANALYTES = tuple(UNITS)
CORE_KINDS = frozenset({"core", "plug", "sidewall"})
NOT_ROCK = frozenset({"fluid", "additive"})
VALUE_DEFAULTS = dict(SUFFIXES)
IDENTITY: dict[str, object] = {
    "well": 0, "analysis": -1, "sample": -1, "label": "", "kind": "unknown", "formation": "", "unit": "",
    "top_m": np.nan, "base_m": np.nan, "top_text": "", "base_text": "", "depth_unit": "", "depth_kind": "",
    "method": "pyrolysis", "replicate": 1, "replicate_stated": False, "role": "sample", "lab_number": "", "remark": "",
    "laboratory": "", "report": "", "table": 0, "line": 0, "file": "", "sheet": "", "across": False, "match_key": "",
}  # fmt: skip
WELL_COLUMNS = ("name", "uwi", "datum_kind", "td_m", "datum_m", "ground_m", "water_m")
WELL_TEXTS = WELL_COLUMNS[:3]


SHOES = ("well", "md_m")
SURVEY = ("well", "md_m", "inclination_deg", "azimuth_deg")
CURVES = ("well", "name", "quantity", "depths", "values")


@dataclass(frozen=True)
class Table:
    """Analyses of one or more wells, and what is known along the wells.

    ``rows`` as the module says, indexed 0..n-1; ``wells`` indexed by ``rows.well`` with name, uwi, datum_kind, td_m,
    datum_m, ground_m, water_m; the others have the columns named below (``TOPS`` and so on). A curve's ``depths`` [m]
    and ``values`` are arrays. ``answers`` are those of the rules that ran before.
    """

    rows: pd.DataFrame
    wells: pd.DataFrame
    tops: pd.DataFrame
    cores: pd.DataFrame
    muds: pd.DataFrame
    shoes: pd.DataFrame = field(default_factory=lambda: no_things(*SHOES))
    survey: pd.DataFrame = field(default_factory=lambda: no_things(*SURVEY))
    curves: pd.DataFrame = field(default_factory=lambda: no_things(*CURVES))
    answers: Mapping[str, Answer] = field(default_factory=dict)
    panels: Mapping[str, pd.DataFrame] = field(default_factory=dict)
    controls: pd.DataFrame = field(default_factory=lambda: controls_of([]))
    headers: Mapping[tuple[int, int], str] = field(default_factory=dict)

    def of(self, *methods: str) -> pd.DataFrame:
        """Rows of these methods, index kept."""
        return self.rows[self.rows["method"].isin(methods)]

    def panel(self, method: str, *analytes: str) -> pd.DataFrame:
        """Rows of a method that has a panel, with these analytes as measured by it or on the same sample; else empty."""
        return gather(self, method, analytes)

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


_TEXTS = frozenset({"name", "version", "kind", "additives", "quantity", "depths", "values"})
TOPS = ("well", "name", "top_m", "version")
CORES = ("well", "number", "top_m", "base_m", "shift_m", "recovered_m")
MUDS = ("well", "top_m", "base_m", "kind", "additives")
CONTROLS = (
    "project", "table", "line", "laboratory", "method", "analyte", "role", "material", "lot", "report", "date", "value",
    "q", "certified", "uncertainty", "result", "text", "column", "file", "sheet", "across",
)  # fmt: skip
_CONTROL_NUMBERS = frozenset({"value", "certified", "uncertainty"})
_CONTROL_COUNTS = frozenset({"project", "table", "line", "result", "column"})


def no_controls() -> pd.DataFrame:
    """An empty frame of controls."""
    return controls_of([])


def controls_of(records: Sequence[Mapping[str, object]]) -> pd.DataFrame:
    """Controls from plain records: in order of laboratory, method, analyte, material, lot, date, report, table and line.

    ``table`` numbers source tables as ``rows.table`` does; -1 for a table that holds none of the rows at hand.
    """
    defaults: dict[str, object] = {
        name: np.nan if name in _CONTROL_NUMBERS else -1 if name in _CONTROL_COUNTS else "" for name in CONTROLS
    }
    made = pd.DataFrame([{**defaults, "across": False, **record} for record in records], columns=list(CONTROLS))
    kinds = dict.fromkeys(_CONTROL_NUMBERS, "float64") | dict.fromkeys(_CONTROL_COUNTS, "int64")
    order = ["laboratory", "method", "analyte", "material", "lot", "date", "report", "table", "line"]
    return made.astype(kinds).sort_values(order, kind="stable").reset_index(drop=True)
