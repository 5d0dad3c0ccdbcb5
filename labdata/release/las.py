"""Datasets as LAS 2.0, one file a well: one file where there is one well, else a zip of them.

A log has one value a depth and curve, and no place for text. Hence: a further value of the same analyte at the same
depth is a curve of its own (TOC_2); an analyte measured by several methods names the method (TOC_CARBON); a
qualifier is a curve beside (TOC_Q: -1 below, 1 above, 2 about). What has no depth is counted under ~Other.
"""

import re
import zipfile
from collections import defaultdict
from collections.abc import Iterator
from dataclasses import dataclass
from itertools import groupby
from typing import IO, Any

import pyarrow as pa

from labdata.errors import InvalidInput

NULL = "-999.25"
QUALIFIER_CODES = {"": "0", "<": "-1", ">": "1", "~": "2"}
FIELDS = [
    "well",
    "uwi",
    "lab",
    "project",
    "method",
    "analyte",
    "unit",
    "top_m",
    "base_m",
    "tvd_top_m",
    "value",
    "qualifier",
]
ZIP_TIME = (1980, 1, 1, 0, 0, 0)  # the data alone makes the bytes
Place = tuple[float, float | None]  # top and base [m MD]


@dataclass(frozen=True, order=True)
class Curve:
    """One curve: the ``nth`` value of an analyte by a method at a depth."""

    at: int
    analyte: str
    method: str
    nth: int
    unit: str


def write(table: pa.Table, out: IO[bytes]) -> None:
    """Write every well of ``table`` (schema STORED, sorted by well). Raises InvalidInput when there is none."""
    rows = table.select(FIELDS).to_pylist()
    wells = [list(members) for (well, _), members in groupby(rows, key=lambda row: (row["well"], row["uwi"])) if well]
    if not wells:
        raise InvalidInput("The dataset has no well, and a log needs one.", remedy="Ask for csv, json or parquet.")
    if len(wells) == 1:
        out.write(_log(wells[0]).encode())
        return
    taken: set[str] = set()
    with zipfile.ZipFile(out, "w", zipfile.ZIP_DEFLATED) as folder:
        for members in wells:
            folder.writestr(zipfile.ZipInfo(_file_name(members[0], taken), ZIP_TIME), _log(members).encode())


def is_zip(start: bytes) -> bool:
    """Whether what ``write`` wrote is a zip, by its first bytes."""
    return start.startswith(b"PK")


def _file_name(row: dict[str, Any], taken: set[str]) -> str:
    stem = re.sub(r"[^A-Za-z0-9._-]+", "-", row["well"]).strip("-.") or "well"
    names = (f"{stem}.las", *(f"{stem}-{number}.las" for number in range(2, 10_000)))
    name = next(name for name in names if name.casefold() not in taken)
    taken.add(name.casefold())
    return name


def _log(rows: list[dict[str, Any]]) -> str:
    """One well as text."""
    placed = [row for row in rows if row["top_m"] is not None]
    curves, values = _curves(placed)
    places = sorted(values, key=lambda place: (place[0], place[0] if place[1] is None else place[1]))
    tvd = {row["top_m"]: row["tvd_top_m"] for row in placed}
    lines = [
        *_head(rows, places),
        *_curve_lines(curves, values),
        "~OTHER INFORMATION",
        *_notes(len(rows) - len(placed)),
    ]
    lines.append("~ASCII LOG DATA")
    columns = list(_columns(curves, values))
    for place in places:
        numbers = [place[0], place[1], tvd[place[0]]]
        lines.append(" ".join([*map(_number, numbers), *(_cell(values[place].get(c), coded) for c, coded in columns)]))
    return "\n".join(lines) + "\n"


Values = dict[Place, dict[Curve, tuple[float | None, str]]]


def _curves(rows: list[dict[str, Any]]) -> tuple[list[Curve], Values]:
    """The curves in order of the analytes, and each depth's values with their qualifiers."""
    first: dict[tuple[str, str], int] = {}
    values: Values = defaultdict(dict)
    seen: dict[tuple[Place, str, str], int] = defaultdict(int)
    for row in rows:
        place, kind = (row["top_m"], row["base_m"]), (row["analyte"], row["method"])
        seen[place, *kind] += 1
        curve = Curve(first.setdefault(kind, len(first)), *kind, seen[place, *kind], row["unit"])
        values[place][curve] = (row["value"], row["qualifier"])
    return sorted({curve for held in values.values() for curve in held}), dict(values)


def _qualified(values: Values) -> set[Curve]:
    return {curve for held in values.values() for curve, (_, qualifier) in held.items() if qualifier}


def _columns(curves: list[Curve], values: Values) -> Iterator[tuple[Curve, bool]]:
    """Each curve, and after it its qualifiers (True) where it has any."""
    qualified = _qualified(values)
    for curve in curves:
        yield curve, False
        if curve in qualified:
            yield curve, True


def _cell(value: tuple[float | None, str] | None, coded: bool) -> str:
    if value is None:
        return NULL
    return QUALIFIER_CODES[value[1]] if coded else _number(value[0])


def _number(value: float | None) -> str:
    return NULL if value is None else repr(float(value))


def _plain(text: str) -> str:
    """Text on one line, without what LAS gives a meaning."""
    return re.sub(r"\s+", " ", text).replace(":", ";").strip()


def _head(rows: list[dict[str, Any]], places: list[Place]) -> list[str]:
    start, stop = (_number(places[0][0]), _number(places[-1][0])) if places else (NULL, NULL)
    labs = ", ".join(sorted({row["lab"] for row in rows if row["lab"]}))
    return [
        "~VERSION INFORMATION",
        "VERS.   2.0 : LOG ASCII STANDARD - VERSION 2.0",
        "WRAP.    NO : ONE LINE PER DEPTH STEP",
        "~WELL INFORMATION",
        f"STRT.M {start} : FIRST DEPTH",
        f"STOP.M {stop} : LAST DEPTH",
        "STEP.M 0.0 : NOT REGULAR",
        f"NULL.  {NULL} : NO VALUE",
        "COMP.   : COMPANY",
        f"WELL.  {_plain(rows[0]['well'])} : WELL",
        f"FLD.   {_plain(rows[0]['project'])} : FIELD OR PROJECT",
        "LOC.    : LOCATION",
        "PROV.   : PROVINCE",
        f"SRVC.  {_plain(labs)} : LABORATORIES",
        "DATE.   : DATE",
        f"UWI.   {_plain(rows[0]['uwi'])} : UNIQUE WELL IDENTIFIER",
    ]


def _curve_lines(curves: list[Curve], values: Values) -> list[str]:
    """Mnemonic, unit and meaning of every column of the data."""
    methods: dict[str, set[str]] = defaultdict(set)
    for curve in curves:
        methods[curve.analyte].add(curve.method)
    lines = ["~CURVE INFORMATION", "DEPT.M : TOP OF SAMPLE, MEASURED DEPTH", "BASE.M : BASE OF SAMPLE, MEASURED DEPTH"]
    lines.append("TVD.M : TOP OF SAMPLE, TRUE VERTICAL DEPTH")
    for curve, coded in _columns(curves, values):
        name = curve.analyte if len(methods[curve.analyte]) == 1 else f"{curve.analyte}_{curve.method}"
        name = re.sub(r"[^A-Z0-9_]", "_", name.upper()) + (f"_{curve.nth}" if curve.nth > 1 else "")
        nth = f", value {curve.nth} at this depth" if curve.nth > 1 else ""
        if coded:
            lines.append(f"{name}_Q. : qualifier of {name}; -1 below, 1 above, 2 about, 0 as measured")
        else:
            lines.append(f"{name}.{curve.unit.replace(' ', '_')} : {curve.analyte} by {curve.method}{nth}")
    return lines


def _notes(without_depth: int) -> list[str]:
    notes = ["A value with a qualifier (curves ending in _Q) is a limit, not a measurement."]
    if without_depth:
        notes.append(f"{without_depth} results have no measured depth and are not in this log.")
    return notes
