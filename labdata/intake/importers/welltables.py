"""Reading tables of well records: deviation surveys, formation tops, core runs, mud, casing, well headers."""

from collections.abc import Callable
from dataclasses import dataclass, field
from typing import Any

from labdata.intake import values
from labdata.intake.columns import Column
from labdata.intake.findings import Findings, place_name
from labdata.intake.headers import fold
from labdata.intake.importers.records import WellKey, WellRecords, WellRow, WellTable
from labdata.intake.importers.wellheads import Found, Header, code_of, find_header, split, words
from labdata.intake.tables import looks_numeric
from labdata.intake.units import FOOT_M
from labdata.intake.workbook import Sheet, address, cell_text
from labdata.models import DatumKind

DEPTHS = frozenset(
    {"MD", "TVD", "TVDSS", "TOP", "BASE", "SHOE", "RECOVERED", "SHIFT", "KB", "RT", "DF", "GL", "WATER", "TD"}
)
ANGLES = frozenset({"INC", "AZI"})
NUMBERS = DEPTHS | ANGLES | {"DIAMETER", "LATITUDE", "LONGITUDE"}
REQUIRED = {
    "survey": ("MD", "INC", "AZI"), "core_runs": ("CORE", "TOP", "BASE"), "mud": ("TOP", "BASE", "MUD"), "casing": ("SHOE",),
    "tops": ("NAME",), "wells": (),
}  # fmt: skip
TEXTS = {"OPERATOR": ("operator", 120), "FIELD": ("field", 120), "COUNTRY": ("country", 80), "CRS": ("crs", 60)}
DATUMS = (("KB", DatumKind.KELLY_BUSHING), ("RT", DatumKind.ROTARY_TABLE), ("DF", DatumKind.DRILL_FLOOR))


def read_well_tables(
    sheet: Sheet, findings: Findings, well_of: Callable[[str, str], WellKey], records: WellRecords
) -> list[list[str]]:
    """Add the sheet's tables of well records to ``records``; returns the lines outside them.

    ``well_of`` gives the well of a table without a well column, from the name and identifier that its title states.
    """
    outside: list[list[str]] = []
    row = 0
    while (header := find_header(sheet, row)) is not None:
        title = [_line(sheet, at) for at in range(row, header.row)]
        outside += [line for line in title if line]
        reader = _TableReader(sheet, header, findings, _facts(title))
        row = reader.take(well_of, records)
    outside += [line for at in range(row, min(len(sheet.rows), row + 60)) if (line := _line(sheet, at))]
    return outside


def _line(sheet: Sheet, row: int) -> list[str]:
    texts = (cell_text(cell).lstrip("#%").strip() for cell in sheet.rows[row])
    return [text for text in texts if text]


def _facts(title: list[list[str]]) -> dict[str, tuple[str, str]]:
    """Header facts of lines like ``KB elevation [m] | 123``: field -> (text, unit)."""
    found: dict[str, tuple[str, str]] = {}
    for line in title:
        parts = line if len(line) > 1 else [part.strip() for part in line[0].split(":", 1)] if line else []
        if len(parts) < 2:
            continue
        code = "WELL" if fold(parts[0]) == "name" else code_of("wells", parts[0])
        if code:
            found.setdefault(code, (parts[1], split(parts[0])[1]))
    return found


def well_facts(said: dict[str, tuple[str, str]], default_unit: str = "") -> dict[str, Any]:
    """Fields of Well, from field codes with (text, unit); elevations in metres. What cannot be read is left out."""
    facts: dict[str, Any] = {}
    for code, (name, length) in TEXTS.items():
        if code in said and said[code][0]:
            facts[name] = said[code][0][:length]
    for code, limit in (("LATITUDE", 90.0), ("LONGITUDE", 180.0)):
        number = values.read_text(said[code][0]).value if code in said else None
        if number is not None and abs(number) <= limit:
            facts[code.lower()] = number
    lengths: dict[str, float | None] = {
        code: _length(*said[code], default_unit) for code in ("KB", "RT", "DF", "GL", "WATER", "TD") if code in said
    }
    for code, kind in DATUMS:
        if lengths.get(code) is not None and "datum_elevation_m" not in facts:
            facts |= {"datum_elevation_m": lengths[code], "datum_kind": str(kind)}
    for code, name in (("GL", "ground_elevation_m"), ("WATER", "water_depth_m"), ("TD", "td_md_m")):
        if lengths.get(code) is not None and (code != "TD" or (lengths[code] or 0) > 0):
            facts[name] = lengths[code]
    return facts


def _length(text: str, unit: str, default: str) -> float | None:
    read = values.read_depth(text)
    unit = read.unit or unit or default
    return read.top * (FOOT_M if unit == "ft" else 1.0) if read.top is not None and unit in {"m", "ft"} else None


@dataclass
class _TableReader:
    """Reads one table below its header."""

    sheet: Sheet
    header: Header
    findings: Findings
    facts: dict[str, tuple[str, str]]
    columns: dict[str, Found] = field(default_factory=dict)
    units: dict[str, str] = field(default_factory=dict)
    last: int = 0

    def take(self, well_of: Callable[[str, str], WellKey], records: WellRecords) -> int:
        """Add the table to ``records``; returns the row where the search goes on."""
        self.columns = {one.field: one for one in self.header.columns}
        self.last = self.header.first - 1
        rows, after = self._data_rows()
        self._choose_units(rows)
        made = [one for row in rows if (one := self._row(row)) is not None]
        if not made:
            if not rows:
                self._no_rows()
            records.tables.append(self._table([]))
            return after
        if not ({"WELL", "UWI"} & set(self.columns)):
            self._one_well(made, well_of, records)
        if self.header.kind == "survey":
            self._check_survey(made)
        self._not_kept()
        records.tables.append(self._table(made))
        return after

    def _no_rows(self) -> None:
        place = address(self.header.row, self.header.columns[0].index)
        self.findings.error(
            "no_rows", f"The table of {self.header.kind.replace('_', ' ')} at {place} has a header and no rows.",
            sheet=self.sheet.name, cell=place, remedy="Send the file with its rows.",
        )  # fmt: skip

    def _one_well(self, rows: list[WellRow], well_of: Callable[[str, str], WellKey], records: WellRecords) -> None:
        name, uwi = (self.facts.get(code, ("", ""))[0] for code in ("WELL", "UWI"))
        well = well_of(name, uwi)
        for row in rows:
            row.well = well
        records.tell(well, well_facts(self.facts))

    def _data_rows(self) -> tuple[list[int], int]:
        """(rows below the header, row after them): up to the next header."""
        rows: list[int] = []
        for row in range(self.header.first, len(self.sheet.rows)):
            line = _line(self.sheet, row)
            if not line:
                continue
            if not any(looks_numeric(text) for text in line):
                following = find_header(self.sheet, row, 1)
                if following is not None:
                    return rows, row
                if len(line) <= 1:
                    continue
            rows.append(row)
        return rows, len(self.sheet.rows)

    def _text(self, row: int, code: str) -> str:
        column = self.columns.get(code)
        line = self.sheet.rows[row]
        return cell_text(line[column.index]) if column and column.index < len(line) else ""

    def _choose_units(self, rows: list[int]) -> None:
        """Length units as the header says; all columns without one share a unit, which is asked once."""
        lengths = [one for one in self.columns.values() if one.field in DEPTHS]
        said = {one.unit for one in lengths if one.unit in {"m", "ft"}}
        silent = [one for one in lengths if one.unit not in {"m", "ft", "%"}]
        common = said.pop() if len(said) == 1 else ""
        if silent and not common:
            common = self._ask_unit(silent[0], rows) or ""
        self.units = {one.field: one.unit or common for one in lengths}

    def _ask_unit(self, column: Found, rows: list[int]) -> str | None:
        tops = [d.top for row in rows if (d := values.read_depth(self._text(row, column.field))).top is not None]
        span = f" It runs from {min(tops):g} to {max(tops):g}." if tops else ""
        letter = address(0, column.index).rstrip("1")
        return self.findings.ask(
            f"unit:{place_name(self.sheet.name, letter)}", "depth_unit_missing",
            f"Column {letter} «{column.text}» gives depth without a unit.{span}", ["m", "ft"],
            sheet=self.sheet.name, cell=address(self.header.row, column.index), value=column.text,
        )  # fmt: skip

    def _row(self, row: int) -> WellRow | None:
        kind = self.header.kind
        said = {code: self._number(row, code) if code in NUMBERS else self._text(row, code) for code in self.columns}
        missing = [code for code in REQUIRED[kind] if said.get(code) in {None, ""}]
        if missing:
            self._incomplete(row, missing)
            return None
        made = getattr(self, f"_as_{kind}")(row, said)
        if made is None:
            return None
        self.last = row
        return WellRow(row + 1, (self._text(row, "WELL"), self._text(row, "UWI")), made)

    def _incomplete(self, row: int, missing: list[str]) -> None:
        filled = [code for code in self.columns if self._text(row, code)]
        cell = address(row, self.columns[missing[0]].index)
        if filled and any(finding.cell == cell for finding in self.findings.found):
            return
        if not filled or (len(filled) == 1 and not looks_numeric(self._text(row, filled[0]))):
            return
        self.findings.error(
            "row_incomplete", f"Row {row + 1} lacks {' and '.join(missing)}.", sheet=self.sheet.name, cell=cell,
            remedy="Fill the cell, or delete the row.",
        )  # fmt: skip

    def _number(self, row: int, code: str) -> float | None:
        """The cell in metres, degrees or inches; None for a blank or a null value, an error for what is no number."""
        text = self._text(row, code)
        comma = values.DECIMAL if self.sheet.comma_hint == "decimal" else values.THOUSANDS
        read = values.read_depth(text, comma) if code in DEPTHS else values.read_text(text.rstrip('°"″ '), comma)
        number = read.top if isinstance(read, values.Depth) else read.value
        cell = address(row, self.columns[code].index)
        if read.state == values.BLANK:
            if read.note == "null code":
                self._say_null(cell, text)
            return None
        if read.state != values.VALUE or number is None:
            self.findings.error(
                "unreadable_value", f"{code} in cell {cell} cannot be read: «{text}» {read.note or 'is no number'}.",
                sheet=self.sheet.name, cell=cell, value=text, remedy="Correct the cell.",
            )  # fmt: skip
            return None
        unit = (read.unit if isinstance(read, values.Depth) else "") or self.units.get(code, "")
        return number * FOOT_M if code in DEPTHS and unit == "ft" else number

    def _say_null(self, cell: str, text: str) -> None:
        self.findings.note(
            "null_code", f"Cell {cell} holds {text}, which stands for «no value» and is read as blank.",
            sheet=self.sheet.name, cell=cell, value=text,
        )  # fmt: skip

    def _wrong(self, row: int, code: str, message: str, remedy: str) -> None:
        cell = address(row, self.columns[code].index)
        self.findings.error(
            "impossible_value",
            f"Cell {cell}: {message}",
            sheet=self.sheet.name,
            cell=cell,
            value=self._text(row, code),
            remedy=remedy,
        )

    def _as_survey(self, row: int, said: dict[str, Any]) -> dict[str, Any] | None:
        if not 0 <= said["INC"] <= 180:
            self._wrong(
                row,
                "INC",
                f"an inclination of {said['INC']:g}° is not possible.",
                "Inclination runs from 0 to 180 degrees.",
            )
            return None
        if not -360 <= said["AZI"] <= 360:
            self._wrong(
                row, "AZI", f"an azimuth of {said['AZI']:g}° is not possible.", "Azimuth runs from 0 to 360 degrees."
            )
            return None
        return {
            "md_m": said["MD"],
            "inclination_deg": said["INC"],
            "azimuth_deg": said["AZI"] % 360 if said["AZI"] != 360 else 360.0,
        }

    def _check_survey(self, rows: list[WellRow]) -> None:
        """Stations run downward; a depth that comes twice is an error."""
        seen: dict[tuple[WellKey, float], int] = {}
        for row in rows:
            key = (row.well, row.values["md_m"])
            if key in seen:
                self._wrong(
                    row.line - 1, "MD", f"the depth stands in row {seen[key]} too.", "Delete one of the stations."
                )
            seen.setdefault(key, row.line)

    def _as_core_runs(self, row: int, said: dict[str, Any]) -> dict[str, Any] | None:
        number = values.read_text(said["CORE"].casefold().removeprefix("core").strip(" #no.")).value
        if number is None or not 0 < number < 32_000 or number != int(number):
            self._wrong(row, "CORE", f"«{said['CORE']}» is no core number.", "Number the cores 1, 2, 3 …")
            return None
        if said["BASE"] <= said["TOP"]:
            self._wrong(row, "BASE", "the base is not below the top.", "Correct the depths.")
            return None
        recovered = said.get("RECOVERED")
        if recovered is not None and self.columns["RECOVERED"].unit == "%":
            recovered = recovered / 100 * (said["BASE"] - said["TOP"])
        return {
            "number": int(number), "top_md_m": said["TOP"], "base_md_m": said["BASE"], "recovered_m": recovered,
            "shift_to_log_m": said.get("SHIFT"),
        }  # fmt: skip

    def _as_mud(self, row: int, said: dict[str, Any]) -> dict[str, Any] | None:
        kind = mud_kind(said["MUD"])
        if kind is None:
            answer = self.findings.ask(
                f"mud:{said['MUD']}", "mud_kind_unknown", f"What is the mud «{said['MUD']}» based on?", list(words()["mud_kinds"]),
                sheet=self.sheet.name, cell=address(row, self.columns["MUD"].index), value=said["MUD"],
            ) if not any(f.id == f"mud:{said['MUD']}" for f in self.findings.found) else None  # fmt: skip
            kind = answer or "water"
        if said["BASE"] <= said["TOP"]:
            self._wrong(row, "BASE", "the base is not below the top.", "Correct the depths.")
            return None
        additives = "; ".join(text for text in (said["MUD"], said.get("ADDITIVES", "")) if text)
        return {"top_md_m": said["TOP"], "base_md_m": said["BASE"], "kind": kind, "additives": additives[:300]}

    def _as_casing(self, row: int, said: dict[str, Any]) -> dict[str, Any]:
        diameter = said.get("DIAMETER")
        if diameter is not None and self.columns["DIAMETER"].unit == "mm":
            diameter = round(diameter / 25.4, 4)
        return {"md_m": said["SHOE"], "diameter_in": diameter}

    def _as_tops(self, row: int, said: dict[str, Any]) -> dict[str, Any] | None:
        name = said["NAME"][:120]
        if said.get("MD") is not None:
            return {"name": name, "top_md_m": said["MD"]}
        if said.get("TVD") is not None:
            return {"name": name, "tvd_m": said["TVD"]}
        return {"name": name, "tvdss_m": said["TVDSS"]} if said.get("TVDSS") is not None else None

    def _as_wells(self, row: int, said: dict[str, Any]) -> dict[str, Any]:
        texts = {code: (self._text(row, code), self.units.get(code, "")) for code in self.columns}
        alias = self._text(row, "ALIAS")
        return {**well_facts(texts), **({"alias": alias} if alias else {})}

    def _not_kept(self) -> None:
        """Columns that follow from the others, or that nothing here holds, are named."""
        left = [*self.header.unknown, *(one for one in self.header.columns if one.field in {"DERIVED", "ELSEWHERE"})]
        left += [self.columns["BASE"]] if self.header.kind == "tops" and "BASE" in self.columns else []
        for one in left:
            follows = one.field == "DERIVED"
            self.findings.note(
                "unmapped_column",
                f"Column {address(0, one.index).rstrip('1')} «{one.text}» was left out"
                + (": it is computed from depth, inclination and azimuth." if follows else "."),
                sheet=self.sheet.name, cell=address(self.header.row, one.index), value=one.text,
                remedy="Its cells stay in the kept file.",
            )  # fmt: skip

    def _table(self, rows: list[WellRow]) -> WellTable:
        found = sorted(self.header.columns, key=lambda one: one.index)
        kept = [one for one in found if one.field not in {"DERIVED", "ELSEWHERE"}]
        columns = [self._column(one) for one in kept]
        left = min(one.index for one in found)
        cells = f"{address(self.header.row, left)}:{address(self.last, max(one.index for one in found))}"
        unmapped = [one.text for one in (*self.header.unknown, *(one for one in found if one not in kept))]
        return WellTable(self.sheet.name, cells, self.header.kind, columns, unmapped, rows)

    def _column(self, one: Found) -> Column:
        unit = self.units.get(one.field, one.unit) or ("deg" if one.field in ANGLES else "")
        factor = FOOT_M if unit == "ft" else 1.0
        reason = f"«{one.text}» in a table of {self.header.kind.replace('_', ' ')}"
        return Column(one.index, one.text, one.field, unit, one.unit, 0.95, reason, factor=factor)


def mud_kind(text: str) -> str | None:
    """water, oil, synthetic or air; None for a word that says none of them."""
    plain = fold(text)
    for kind, names in words()["mud_kinds"].items():
        if any(plain == fold(name) or (fold(name) in plain and len(fold(name)) > 3) for name in names):
            return str(kind)
    return None
