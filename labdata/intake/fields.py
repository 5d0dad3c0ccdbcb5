"""Field codes that columns may have: the analytes of analytes.toml and the identity fields of synonyms.toml."""

import tomllib
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from contextvars import ContextVar
from dataclasses import dataclass, field
from functools import cache, lru_cache, wraps
from pathlib import Path
from typing import Any, ParamSpec, TypeVar

P = ParamSpec("P")
T = TypeVar("T")

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
    words: dict[str, str] = field(default_factory=dict, compare=False)

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


Own = tuple[FieldType, ...]
_own: ContextVar[Own] = ContextVar("own", default=())


@contextmanager
def with_own(own: Own) -> Iterator[None]:
    """Within this block the fields are those of a project: every project's, and its own analytes."""
    token = _own.set(own)
    try:
        yield
    finally:
        _own.reset(token)


def by_project(maxsize: int | None = None) -> Callable[[Callable[P, T]], Callable[P, T]]:
    """A cache whose answers differ from project to project, as their own analytes do."""

    def decorate(function: Callable[P, T]) -> Callable[P, T]:
        @lru_cache(maxsize=maxsize)
        def kept(own: Own, *args: P.args, **kwargs: P.kwargs) -> T:
            return function(*args, **kwargs)

        @wraps(function)
        def asked(*args: P.args, **kwargs: P.kwargs) -> T:
            return kept(_own.get(), *args, **kwargs)  # type: ignore[arg-type]  # what is asked is hashable

        return asked

    return decorate


@by_project(maxsize=64)
def field_types() -> dict[str, FieldType]:
    """Every field code with its type; a project's own analytes win over those that every project has."""
    analytes, names = catalogue()["analytes"], synonyms()["names"]
    made = {
        code: FieldType(
            code, entry["method"], entry["unit"], entry.get("low"), entry.get("high"), tuple(names.get(code, ()))
        )
        for code, entry in analytes.items()
    }
    made |= {code: FieldType(code, names=tuple(names.get(code, ()))) for code in IDENTITY}
    return made | {one.code: one for one in _own.get()}


@cache
def element_symbols() -> frozenset[str]:
    """Symbols of the elements that can be reported, in their usual spelling (``Mo``)."""
    elements = (code for code, entry in catalogue()["analytes"].items() if entry["method"] == "elements")
    return frozenset(code.capitalize() for code in elements if len(code) <= 2 and code.isalpha())
