"""Headers of tables of well records: which kind of table it is, what each column holds and in which unit."""

import re
import tomllib
from dataclasses import dataclass
from functools import cache
from pathlib import Path
from typing import Any

from labdata.intake import units
from labdata.intake.headers import fold
from labdata.intake.tables import looks_numeric
from labdata.intake.workbook import Cell, Sheet, cell_text

KINDS = ("survey", "core_runs", "mud", "casing", "tops", "wells")
_BRACKET = re.compile(r"[(\[{]([^()\[\]{}]*)[)\]}]")
_DEGREES = frozenset({"deg", "degree", "degrees", "°", "dega", "grad", "degc"})
_INCHES = frozenset({"in", "inch", "inches", '"', "″", "zoll"})


@dataclass(frozen=True)
class Found:
    """One column of a header. ``unit``: m, ft, deg, in, mm, % or "" when the header gives none."""

    index: int
    text: str
    field: str
    unit: str


@dataclass(frozen=True)
class Header:
    """A header row with its kind; ``first`` is the first data row, ``unknown`` the columns that were not understood."""

    row: int
    first: int
    kind: str
    columns: tuple[Found, ...]
    unknown: tuple[Found, ...]


@cache
def words() -> dict[str, Any]:
    """``welltables.toml`` as it stands."""
    return tomllib.loads((Path(__file__).parent / "welltables.toml").read_text(encoding="utf-8"))


@cache
def _names(kind: str) -> dict[str, str]:
    listed = {**words()["every"], **words()[kind]["names"]}
    return {fold(name): code for code, names in reversed(listed.items()) for name in names}


def unit_of(text: str) -> str:
    """m, ft, deg, in, mm or % as a unit text means it; "" for none of them."""
    plain = text.strip().casefold().strip(".")
    if plain in _DEGREES:
        return "deg"
    if plain in _INCHES:
        return "in"
    if plain in {"mm", "%"}:
        return plain
    parsed = units.parse(text)
    return parsed if parsed in {"m", "ft"} else ""


def split(text: str) -> tuple[str, str]:
    """(name, unit) of a header: ``MD[m]``, ``Depth, ft``, ``Inclination (deg)``."""
    inside = [part for part in _BRACKET.findall(text) if unit_of(part)]
    bare = " ".join(_BRACKET.sub(" ", text).split()) or text
    if inside:
        return bare, unit_of(inside[0])
    tokens = re.split(r"[\s,_]+", bare.strip())
    if len(tokens) > 1 and unit_of(tokens[-1]):
        return " ".join(tokens[:-1]), unit_of(tokens[-1])
    return bare.replace("_", " "), ""


def code_of(kind: str, text: str) -> str:
    """The field of a header text in a table of this kind, or ""."""
    name, _ = split(text)
    return _names(kind).get(fold(name)) or _names(kind).get(fold(text)) or ""


def find_header(sheet: Sheet, start: int, limit: int = 60) -> Header | None:
    """The next header of a table of well records, at most ``limit`` rows down."""
    for row in range(start, min(len(sheet.rows), start + limit)):
        for kind in KINDS:
            header = _as_kind(sheet, row, kind)
            if header is not None:
                return header
    return None


def _as_kind(sheet: Sheet, row: int, kind: str) -> Header | None:
    cells = [(at, cell_text(cell).lstrip("#").strip()) for at, cell in enumerate(sheet.rows[row])]
    texts = [(at, text) for at, text in cells if text]
    if len(texts) < 2 or any(looks_numeric(text) for _, text in texts):
        return None
    first, below = _units_row(sheet, row + 1)
    found = [Found(at, text, code_of(kind, text), split(text)[1] or below.get(at, "")) for at, text in texts]
    if kind == "tops":
        found = _told_top(sheet, first, found)
    known = _once([one for one in found if one.field])
    fields = {one.field for one in known}
    if not _enough(kind, fields):
        return None
    unknown = [one for one in found if one not in known]
    return Header(row, first, kind, tuple(known), tuple(unknown))


def _once(found: list[Found]) -> list[Found]:
    """Each field once, the first column of it; derived columns may be many."""
    seen: dict[str, Found] = {}
    return [one for one in found if one.field in {"DERIVED", "ELSEWHERE"} or seen.setdefault(one.field, one) is one]


def _enough(kind: str, fields: set[str]) -> bool:
    """True when the fields make such a table."""
    if not set(words()[kind]["need"]) <= fields:
        return False
    if kind == "tops":
        return bool(fields & {"MD", "TVD", "TVDSS"})
    if kind == "mud":
        return {"TOP", "BASE"} <= fields
    if kind == "wells":
        return bool(fields & {"WELL", "UWI"}) and len(fields - {"WELL", "UWI", "ELSEWHERE"}) >= 1
    return True


def _told_top(sheet: Sheet, first: int, found: list[Found]) -> list[Found]:
    """A column headed only "Top" is the name of the formation when it holds text, its depth when it holds numbers."""
    told = []
    for one in found:
        if not one.field and fold(split(one.text)[0]) in {"top", "tope", "topo"}:
            below = [text for row in sheet.rows[first : first + 20] if (text := _text(row, one.index))]
            numbers = sum(1 for text in below if looks_numeric(text))
            one = Found(one.index, one.text, "MD" if below and numbers * 2 > len(below) else "NAME", one.unit)  # noqa: PLW2901
        told.append(one)
    return told


def _units_row(sheet: Sheet, row: int) -> tuple[int, dict[int, str]]:
    """(first data row, column -> unit) of a row of units right below the header, if there is one."""
    if row >= len(sheet.rows):
        return row, {}
    filled = {at: text for at, cell in enumerate(sheet.rows[row]) if (text := cell_text(cell).lstrip("#").strip())}
    said = {at: unit for at, text in filled.items() if (unit := unit_of(text.strip("()[]")))}
    return (row + 1, said) if said and len(said) * 2 >= len(filled) else (row, {})


def _text(row: list[Cell], index: int) -> str:
    return cell_text(row[index]) if index < len(row) else ""
