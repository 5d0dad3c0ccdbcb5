"""Who each row speaks of: well, sample, depth, kind, role. Depth in metres; as reported kept beside it."""

import re
from dataclasses import dataclass, field

from labdata.intake import values
from labdata.intake.columns import DEPTH_CHECK, Column, Mapping
from labdata.intake.findings import Findings, place_name
from labdata.intake.kinds import kind_of, reference_name, role_of
from labdata.intake.tables import Table
from labdata.intake.titles import Facts
from labdata.intake.units import FOOT_M
from labdata.intake.workbook import cell_text

_DEPTH_KINDS = {
    "driller": "driller",
    "logger": "logger",
    "log depth": "logger",
    "wireline": "logger",
    "core depth": "core",
}
DEEPEST_M = 13_000.0  # the deepest borehole drilled is 12,262 m
HEAD_FIELDS = ("LATITUDE", "LONGITUDE", "OPERATOR", "ELEVATION", "DATUM", "WELL_ALIAS")  # of the well, not the sample
_REPEAT_LABEL = re.compile(
    r"^(?P<label>.*?)[\s_\-/(]*\b(?:dup(?:licate)?|rpt|rerun|repeat|rep(?:licate)?)\b[\s.#]*(?P<number>\d{0,2})\)?$",
    re.I,
)


@dataclass
class Row:
    """One data row. ``line`` is the sheet's row number; ``well`` (name, uwi) as the file gives it."""

    line: int
    well: tuple[str, str] = ("", "")
    label: str = ""
    kind: str = "unknown"
    top_m: float | None = None
    base_m: float | None = None
    top_text: str = ""
    base_text: str = ""
    depth_unit: str = ""
    depth_kind: str = ""
    formation: str = ""
    role: str = "sample"
    reference: str = ""
    replicate: int | None = None
    lab_number: str = ""
    remark: str = ""
    labs: dict[str, str] = field(default_factory=dict)
    head: dict[str, str] = field(default_factory=dict)
    kept: bool = True

    @property
    def match_key(self) -> str:
        """What finds the sample again: kind, label and depth to a millimetre."""
        return match_key(self.kind, self.label, self.top_m, self.base_m)


def match_key(kind: str, label: str, top_m: float | None, base_m: float | None) -> str:
    """The key of a sample within its well."""
    depths = ["" if depth is None else f"{depth:.3f}" for depth in (top_m, base_m)]
    return f"{kind}|{label}|{depths[0]}|{depths[1]}"


@dataclass
class RowReader:
    """Reads the identity columns of one table."""

    table: Table
    mapping: Mapping
    facts: Facts
    findings: Findings
    comma: str
    has_values: list[bool]

    def __post_init__(self) -> None:
        self.sheet = self.table.sheet.name
        self.texts = {
            column.index: [cell_text(cell) for cell in self.table.cells(column.index)]
            for column in self.mapping.columns
            if not column.is_result
        }
        self.filled_lines = {index + 1: filled for index, filled in zip(self.table.rows, self.has_values, strict=True)}
        self.unknown_kinds: dict[str, str] = {}
        self.kind_default = kind_of(self.facts.kind) or "unknown"

    def read(self) -> list[Row]:
        """One Row per data row, in order."""
        rows = [Row(line=index + 1) for index in self.table.rows]
        self._wells(rows)
        self._plain(rows)
        self._depths(rows)
        self._roles(rows)
        self._check_second_depth(rows)
        self._nameless(rows)
        self._without_depth(rows)
        self._report_kinds()
        return rows

    def _column(self, code: str) -> tuple[Column | None, list[str]]:
        column = self.mapping.one(code)
        return column, self.texts[column.index] if column else []

    def _wells(self, rows: list[Row]) -> None:
        """Well name and UWI per row; a blank name continues the one above, and that is said once."""
        name_column, names = self._column("WELL")
        _, uwis = self._column("UWI")
        filled: list[str] = []
        above = ("", "")
        for at, row in enumerate(rows):
            name = names[at] if names else ""
            uwi = uwis[at] if uwis else ""
            if not name and not uwi and above != ("", "") and self.has_values[at]:
                name, uwi = above
                filled.append(self.table.sheet.address(row.line - 1, name_column.index if name_column else 0))
            elif name in {'"', "''", "do.", "ditto", "″"}:
                name, uwi = above[0], uwi or above[1]
            row.well = (name, uwi)
            above = row.well if name or uwi else above
        if filled and name_column:
            self.findings.note(
                "well_from_above", f"The well of {len(filled)} rows is taken from the row above (from {filled[0]} on).",
                sheet=self.sheet, cell=filled[0], remedy="Write the well on every row to be sure.",
            )  # fmt: skip

    def _plain(self, rows: list[Row]) -> None:
        """Sample number, formation, laboratory number and remarks, as they stand."""
        _, labels = self._column("SAMPLE")
        _, formations = self._column("FORMATION")
        _, numbers = self._column("LAB_NO")
        _, remarks = self._column("REMARK")
        _, preparations = self._column("PREPARATION")
        _, kinds = self._column("KIND")
        for at, row in enumerate(rows):
            row.label = labels[at][:120] if labels else ""
            row.formation = (formations[at] if formations else self.facts.formation)[:120]
            row.lab_number = numbers[at][:120] if numbers else ""
            said = [remarks[at]] if remarks and remarks[at] else []
            if preparations and preparations[at]:
                said.append(f"preparation: {preparations[at]}")
            row.remark = "; ".join(said)
            row.kind = self._kind(kinds[at], row) if kinds and kinds[at] else self.kind_default
        self._laboratories(rows)
        self._replicates(rows)
        for code in HEAD_FIELDS:
            _, texts = self._column(code)
            for row, text in zip(rows, texts, strict=True) if texts else ():
                if text:
                    row.head[code] = text

    def _laboratories(self, rows: list[Row]) -> None:
        for column in self.mapping.columns:
            if column.field == "LAB":
                about = "reflectance" if {"vr", "vro", "ro", "reflectance", "petrography"} & set(column.words) else ""
                about = about or ("pyrolysis" if column.words else "*")
                for row, text in zip(rows, self.texts[column.index], strict=True):
                    if text and "unreported" not in text.casefold() and "unknown" not in text.casefold():
                        row.labs[about] = text[:160]

    def _replicates(self, rows: list[Row]) -> None:
        column, texts = self._column("REPLICATE")
        for row, text in zip(rows, texts, strict=True) if column else ():
            if not text:
                continue
            if re.fullmatch(r"\d{1,3}", text) and int(text) >= 1:
                row.replicate = int(text)
            elif re.fullmatch(r"[A-Za-z]", text):
                row.replicate = ord(text.upper()) - 64
            else:
                self._error(
                    column,
                    row,
                    text,
                    code="replicate_unreadable",
                    message=f"Replicate «{text}» is neither a number from 1 nor a letter.",
                    remedy="Write 1, 2, 3 …",
                )

    def _kind(self, text: str, row: Row) -> str:
        kind = kind_of(text)
        if kind is None:
            if not role_of(text):
                column, _ = self._column("KIND")
                self.unknown_kinds.setdefault(
                    text, self.table.sheet.address(row.line - 1, column.index if column else 0)
                )
            return self.kind_default
        return kind

    def _report_kinds(self) -> None:
        for text, cell in self.unknown_kinds.items():
            self.findings.warning(
                "kind_unknown", f"Sample type «{text}» is not known; the samples are taken in as «not stated».",
                sheet=self.sheet, cell=cell, value=text, remedy="Known: core, plug, sidewall core, cuttings, composite, outcrop, fluid, additive.",
            )  # fmt: skip

    def _error(self, column: Column | None, row: Row, text: str, *, code: str, message: str, remedy: str) -> None:
        cell = self.table.sheet.address(row.line - 1, column.index if column else 0)
        self.findings.error(code, message, sheet=self.sheet, cell=cell, value=text, remedy=remedy)

    def _depths(self, rows: list[Row]) -> None:
        top_column, tops = self._column("TOP")
        base_column, bases = self._column("BASE")
        if top_column is None and base_column is not None:
            top_column, tops, base_column, bases = base_column, bases, None, []
        if top_column is None:
            return
        said = self._units_said(rows, top_column, base_column)
        for at, row in enumerate(rows):
            unit = said[at]
            row.depth_kind = _depth_kind(top_column.header)
            row.top_text = tops[at][:60]
            row.top_m, interval_base = self._depth(top_column, row, tops[at], unit)
            if base_column is not None:
                row.base_text = bases[at][:60]
                row.base_m, _ = self._depth(base_column, row, bases[at], unit)
            if row.base_m is None:
                row.base_m = interval_base
            if row.top_m is None and row.base_m is not None:
                row.top_m, row.base_m = row.base_m, None
            row.depth_unit = unit if row.top_m is not None else ""

    def _units_said(self, rows: list[Row], top: Column, base: Column | None) -> list[str]:
        """The depth unit of each row: of the cell's own mark, the header, a unit column, the title, else asked once."""
        _, per_row = self._column("DEPTH_UNIT")
        stated = top.unit or (base.unit if base else "") or self.facts.depth_unit
        if top.unit or base is None or not base.unit:
            top.unit = top.unit or stated
        said = []
        for at in range(len(rows)):
            own = values.read_depth(self.texts[top.index][at], self.comma).unit
            listed = values.depth_unit(per_row[at]) if per_row and per_row[at] else ""
            said.append(own or listed or stated)
        if all(said) or not any(self.texts[top.index]):
            top.unit = top.unit or (said[0] if len(set(said)) == 1 else "")
        elif any(not unit and text for unit, text in zip(said, self.texts[top.index], strict=True)):
            top.unit = self._ask_unit(top) or ""
            said = [unit or top.unit for unit in said]
        if base is not None:
            base.unit = base.unit or top.unit
        return said

    def _ask_unit(self, column: Column) -> str | None:
        numbers = [
            d.top for text in self.texts[column.index] if (d := values.read_depth(text, self.comma)).top is not None
        ]
        span = f" It runs from {min(numbers):g} to {max(numbers):g}." if numbers else ""
        return self.findings.ask(
            f"unit:{place_name(self.sheet, column.letter)}", "depth_unit_missing",
            f"{column.place} «{column.header}» gives depth without a unit.{span}", ["m", "ft"],
            sheet=self.sheet, cell=self.table.sheet.address(self.table.top + self.table.height - 1, column.index), value=column.header,
        )  # fmt: skip

    def _depth(self, column: Column, row: Row, text: str, unit: str) -> tuple[float | None, float | None]:
        """(top, base) in metres; a depth that cannot be is an error that names the cell."""
        read = values.read_depth(text, self.comma) if text else values.NO_DEPTH
        fault = self.table.sheet.faults.get((row.line - 1, column.index)) if self.table.sheet.faults else None
        if read.state == values.UNREADABLE and not fault and not self.filled_lines[row.line]:
            self._skip(row, f"«{text}» is no depth, and the row has no value")
            return None, None
        if fault or read.state == values.UNREADABLE:
            self._error(
                column,
                row,
                fault or text,
                code="depth_unreadable",
                message=f"Depth «{fault or text}» {'is a spreadsheet error' if fault else read.note}.",
                remedy="Write a number, or two numbers with a dash for an interval.",
            )
            return None, None
        if read.top is None:
            return None, None
        own = read.unit or unit
        factor = FOOT_M if own == "ft" else 1.0
        top, base = read.top * factor, None if read.base is None else read.base * factor
        for depth in (top, base):
            if depth is not None and not self._possible(column, row, text, depth, own):
                return None, None
        column.decimals = max(column.decimals, read.decimals)
        column.factor = factor
        return top, base

    def _possible(self, column: Column, row: Row, text: str, depth: float, unit: str) -> bool:
        if depth < 0:
            self._error(
                column,
                row,
                text,
                code="depth_negative",
                message=f"Depth «{text}» is negative; measured depth runs down from the well's datum.",
                remedy="Give measured depth, not elevation.",
            )
        elif depth > DEEPEST_M:
            self._error(
                column,
                row,
                text,
                code="depth_too_deep",
                message=f"Depth «{text}» is {depth:,.0f} m{' (read as feet)' if unit == 'ft' else ''}, deeper than any well.",
                remedy="Check the unit of the depth column (m or ft).",
            )
        else:
            return True
        return False

    def _roles(self, rows: list[Row]) -> None:
        """Reference materials, blanks, duplicates and summary rows among the samples."""
        _, kinds = self._column("KIND")
        first: dict[tuple[tuple[str, str], str], Row] = {}
        for at, row in enumerate(rows):
            if not row.kept:
                continue
            role = role_of(kinds[at]) if kinds else ""
            texts = self._line_texts(at)
            if not role and row.top_m is None:
                role = role_of(row.label) or (role_of(texts[0]) if texts and not row.label else "")
            if role == "summary" and row.top_m is None:
                self._skip(row, f"«{row.label or texts[0]}» is a summary, not a sample")
            elif role == "blank":
                row.role = "blank"
            elif role == "reference":
                row.role, row.reference = "reference", reference_name(row.label or (texts[0] if texts else ""))
            else:
                self._repeat(row, role, first)
                first.setdefault((row.well, row.label), row)

    def _line_texts(self, at: int) -> list[str]:
        return [text for texts in self.texts.values() if (text := texts[at])]

    def _repeat(self, row: Row, role: str, first: dict[tuple[tuple[str, str], str], Row]) -> None:
        """``S-12 dup`` is a duplicate of ``S-12`` when the file has that sample."""
        match = _REPEAT_LABEL.match(row.label)
        label = match["label"].strip() if match else row.label
        original = first.get((row.well, label))
        if (match and label and original) or role == "duplicate":
            row.role = "duplicate"
            row.label = label or row.label
            if original and row.top_m is None:
                row.top_m, row.base_m, row.kind = original.top_m, original.base_m, original.kind
                row.top_text, row.base_text, row.depth_unit = original.top_text, original.base_text, original.depth_unit
            elif original and row.kind == "unknown":
                row.kind = original.kind

    def _skip(self, row: Row, why: str) -> None:
        row.kept = False
        cell = self.table.sheet.address(row.line - 1, self.table.heads[0].index)
        self.findings.note(
            "row_skipped",
            f"{self.table.sheet.row_name(row.line)} was left out: {why}.",
            sheet=self.sheet,
            cell=cell,
            remedy="Nothing to do.",
        )

    def _nameless(self, rows: list[Row]) -> None:
        """A row with values but neither sample nor depth cannot be placed; one without either and without values is text."""
        for at, row in enumerate(rows):
            if not row.kept or row.role in {"blank", "reference"} or row.label or row.top_m is not None:
                continue
            if not self.has_values[at]:
                self._skip(row, "it has neither sample, depth nor value")
            elif not any(
                f.cell.endswith(str(row.line)) and f.code.startswith("depth_")
                for f in self.findings.found
                if f.sheet == self.sheet
            ):
                cell = self.table.sheet.address(row.line - 1, self.table.heads[0].index)
                self.findings.error(
                    "row_without_sample",
                    f"{self.table.sheet.row_name(row.line)} has values but neither a sample number nor a depth.",
                    sheet=self.sheet,
                    cell=cell,
                    remedy="Give the row a sample number or a depth, or mark it as blank or standard.",
                )

    def _without_depth(self, rows: list[Row]) -> None:
        """Samples without a depth among samples with one are said: a standard that is not called one lands here."""
        column, _ = self._column("TOP")
        bare = [row for row in rows if row.kept and row.role == "sample" and row.top_m is None]
        if column is None or not bare or not any(row.top_m is not None for row in rows if row.kept):
            return
        names = ", ".join(f"«{row.label}» ({self.table.sheet.row_name(row.line).lower()})" for row in bare[:5])
        more = f" and {len(bare) - 5} more" if len(bare) > 5 else ""
        self.findings.warning(
            "sample_without_depth", f"No depth is given for {names}{more}; they are taken as samples of the well.",
            sheet=self.sheet, cell=self.table.sheet.address(bare[0].line - 1, column.index),
            remedy="Give the depth; a reference material or blank is told by its sample type or name.",
        )  # fmt: skip

    def _check_second_depth(self, rows: list[Row]) -> None:
        """The same depth in a second unit must agree within the rounding of both."""
        column, texts = self._column(DEPTH_CHECK)
        main, _ = self._column("TOP")
        if column is None or main is None:
            return
        factor, main_factor = (FOOT_M if c.unit == "ft" else 1.0 for c in (column, main))
        for row, text in zip(rows, texts, strict=True):
            second = values.read_depth(text, self.comma) if text else values.NO_DEPTH
            if second.top is None or row.top_m is None:
                continue
            first = values.read_depth(row.top_text, self.comma)
            room = 0.5 * (factor * 10.0**-second.decimals + main_factor * 10.0**-first.decimals) + 1e-9
            if abs(second.top * factor - row.top_m) > room:
                self.findings.warning(
                    "depths_disagree",
                    f"{self.table.sheet.row_name(row.line)}: {row.top_text} {main.unit} is {row.top_m:.2f} m, but {column.place.lower()} says {text} {column.unit} ({second.top * factor:.2f} m).",
                    sheet=self.sheet, cell=self.table.sheet.address(row.line - 1, column.index), value=text, remedy=f"{main.place} is taken; ask the laboratory which is right.",
                )  # fmt: skip


def _depth_kind(header: str) -> str:
    text = header.casefold()
    return next((kind for word, kind in _DEPTH_KINDS.items() if word in text), "")
