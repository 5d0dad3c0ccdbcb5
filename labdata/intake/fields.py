"""Field codes that columns may have: the analytes of analytes.toml and the identity fields of synonyms.toml."""

import tomllib
from dataclasses import dataclass, field
from functools import cache
from pathlib import Path
from typing import Any

ANALYTES = Path(__file__).resolve().parent.parent / "analytes.toml"
SYNONYMS = Path(__file__).resolve().parent / "synonyms.toml"

IDENTITY = (
    "WELL", "WELL_ALIAS", "UWI", "SAMPLE", "TOP", "BASE", "KIND", "FORMATION", "REPLICATE", "LAB_NO", "REMARK",
    "PREPARATION", "LATITUDE", "LONGITUDE", "OPERATOR", "ELEVATION", "DATUM", "DEPTH_UNIT", "LAB",
)  # fmt: skip
CARBON = ("TOC", "TIC", "TC", "TS", "CARB")
PYROLYSIS_PEAKS = ("S1", "S2", "S3", "TMAX")


@dataclass(frozen=True)
class FieldType:
    """A field: its method and canonical unit ("" for identity fields), and the names that headers give it."""

    code: str
    method: str = ""
    unit: str = ""
    low: float | None = None
    high: float | None = None
    names: tuple[str, ...] = ()
    words: dict[str, str] = field(default_factory=dict)

    @property
    def is_analyte(self) -> bool:
        return bool(self.method)


@cache
def catalogue() -> dict[str, Any]:
    """``analytes.toml`` as it stands: {"methods": ..., "analytes": ...}."""
    return tomllib.loads(ANALYTES.read_text(encoding="utf-8"))


@cache
def synonyms() -> dict[str, Any]:
    """``synonyms.toml`` as it stands."""
    return tomllib.loads(SYNONYMS.read_text(encoding="utf-8"))


@cache
def field_types() -> dict[str, FieldType]:
    """Every field code with its type."""
    analytes, names = catalogue()["analytes"], synonyms()["names"]
    made = {
        code: FieldType(
            code, entry["method"], entry["unit"], entry.get("low"), entry.get("high"), tuple(names.get(code, ()))
        )
        for code, entry in analytes.items()
    }
    made |= {code: FieldType(code, names=tuple(names.get(code, ()))) for code in IDENTITY}
    return made


@cache
def element_symbols() -> frozenset[str]:
    """Symbols of the elements that can be reported, in their usual spelling (``Mo``)."""
    elements = (code for code, entry in catalogue()["analytes"].items() if entry["method"] == "elements")
    return frozenset(code.capitalize() for code in elements if len(code) <= 2 and code.isalpha())
