"""The plain-text interchange layout of routine core analysis: records 10 (well), 15 (properties), 20 (core), 30, 36 and 40.

A record starts with a line of its type, the number of lines that follow and, for values, their number. Record 30 gives
the depth and sample number of the record 40 that follows it, 36 what the rock looks like; -1002 is no value. A cell is
named by the place of the value in its line and the number of the line.
"""

import re
from dataclasses import dataclass, field
from datetime import datetime
from itertools import pairwise
from statistics import median

from labdata.intake import values
from labdata.intake.columns import Column
from labdata.intake.fields import field_types
from labdata.intake.findings import Findings
from labdata.intake.importers.records import WellKey, WellRecords, WellRow, WellTable
from labdata.intake.plaintext import Record, records
from labdata.intake.prepared import PreparedTable
from labdata.intake.reading import Settled
from labdata.intake.rows import DEEPEST_M, Row
from labdata.intake.titles import Facts
from labdata.intake.units import FOOT_M
from labdata.intake.workbook import address

_PROPERTY = re.compile(r"^\s*\d+\s+\d+\s+\d+\s+(?:\d\s*)?(.*)$")
# what a property's description says -> its field; the first that fits
_FIELDS = (
    (r"klinkenberg.*vert|vert.*klinkenberg", "KLINK_V"), (r"klinkenberg", "KLINK"),
    (r"perm.*vert|vert.*perm", "KVERT"), (r"perm", "KAIR"),
    (r"poros.*summ|summ.*poros", "PHI_SUM"), (r"poros.*vert|vert.*poros", "PHI_V"), (r"poros", "PHI"),
    (r"oil.*sat", "SO"), (r"water.*sat", "SW"), (r"gas.*sat", "SG"), (r"grain.*dens", "RHOG"), (r"bulk.*dens", "RHOB"),
)  # fmt: skip
_OF_PLUGS = frozenset({"KLINK_V", "KLINK", "KVERT", "KAIR", "PHI_V", "PHI", "RHOG"})


@dataclass
class CoreFile:
    """The records of a file, sorted out."""

    well: str = ""
    country: str = ""
    laboratory: str = ""
    dated: str = ""
    properties: list[str] = field(default_factory=list)
    cores: list[Record] = field(default_factory=list)
    samples: list[tuple[Record, Record | None, Record]] = field(default_factory=list)
    alone: list[Record] = field(default_factory=list)


def read_core_file(text: str) -> CoreFile:
    """The file's records put together: depth, description and values of each sample."""
    made = CoreFile()
    depth: Record | None = None
    looks: Record | None = None
    for record in records(text):
        if record.kind == "10":
            _heading(made, record)
        elif record.kind == "15":
            made.properties = [_property(line) for line in record.lines]
        elif record.kind == "20":
            made.cores.append(record)
        elif record.kind == "30":
            if depth is not None:
                made.alone.append(depth)
            depth, looks = record, None
        elif record.kind == "36":
            looks = record
        elif depth is not None:
            made.samples.append((depth, looks, record))
            depth = None
        else:
            made.alone.append(record)
    if depth is not None:
        made.alone.append(depth)
    return made


def _heading(made: CoreFile, record: Record) -> None:
    parts = re.split(r"\s{2,}", record.lines[0].strip()) if record.lines else []
    made.well, made.country, made.dated = (*parts, "", "", "")[:3]
    made.laboratory = record.lines[1].strip() if len(record.lines) > 1 else ""


def _property(line: str) -> str:
    match = _PROPERTY.match(line)
    return re.split(r"\s{2,}", (match[1] if match else line).strip())[-1]


def field_of(description: str) -> str:
    """The field that a property's description means, or ""."""
    plain = description.casefold()
    return next((code for pattern, code in _FIELDS if re.search(pattern, plain)), "")


def facts(made: CoreFile) -> Facts:
    """What the heading says of the report."""
    said = Facts(well=made.well, laboratory=made.laboratory.replace("-", " ").strip())
    for shape in ("%d%b%y", "%d%b%Y", "%d-%b-%Y", "%Y-%m-%d"):
        try:
            said.reported_on = datetime.strptime(made.dated.strip(), shape).date()
        except ValueError:
            continue
        break
    return said


def take_core_file(made: CoreFile, well: WellKey, findings: Findings, found: WellRecords) -> PreparedTable | None:
    """The file's samples as a table of results; its cores go to ``found``."""
    if not made.samples or not made.properties:
        findings.error("no_table", "The file holds no sample with values.", remedy="Send the file again.")
        return None
    unit = _depth_unit(made, findings)
    for record in made.alone:
        findings.error(
            "record_alone", f"The record of type {record.kind} at line {record.first} lacks its depth or its values.",
            cell=address(record.first - 1, 0), remedy="Send the file again.",
        )  # fmt: skip
    columns = _columns(made, findings)
    rows = [_row(sample, unit, well, findings) for sample in made.samples]
    settled = {column.index: _settle(column, made, findings) for column in columns}
    for at, row in enumerate(rows):
        plug = any(settled[c.index].states[at] == "value" for c in columns if c.field in _OF_PLUGS)
        row.kind = "plug" if plug else "core"
    _cores(made, well, unit, found)
    last = max(column.index for column in columns) if columns else 0
    place = f"{address(rows[0].line - 1, 0)}:{address(rows[-1].line - 1, last)}"
    unmapped = [text for at, text in enumerate(made.properties) if at not in {c.index for c in columns}]
    return PreparedTable("", place, columns, unmapped, rows, settled)


def _depth_unit(made: CoreFile, findings: Findings) -> str:
    """m or ft; the layout does not say. Plugs a quarter, a third or half of a unit apart can only be metres, else it is asked."""
    given = findings.answers.get("unit:depth")
    depths = [number for depth, _, _ in made.samples if (number := _numbers(depth)[0]) is not None]
    steps = [below - above for above, below in pairwise(depths) if below > above]
    usual = median(steps) if steps else 0.0
    if given is None and 0.2 <= usual <= 0.55:
        findings.note(
            "depth_unit_told", f"The file does not say its depth unit; samples stand {usual:.2f} apart, as plugs do in metres.",
            id="depth_unit_told", remedy="If depths are feet, answer «unit:depth» with «ft» and send the file again.",
        )  # fmt: skip
        return "m"
    span = f" It runs from {min(depths):g} to {max(depths):g}." if depths else ""
    return (
        findings.ask("unit:depth", "depth_unit_missing", f"The file gives depth without a unit.{span}", ["m", "ft"])
        or ""
    )


def _numbers(record: Record) -> list[float | None]:
    tokens = record.lines[0].split() if record.lines else []
    return [values.read_text(token).value for token in tokens[:2]] or [None]


def _row(sample: tuple[Record, Record | None, Record], unit: str, well: WellKey, findings: Findings) -> Row:
    depth, looks, record = sample
    tokens = depth.lines[0].split() if depth.lines else []
    top = values.read_depth(tokens[0]).top if tokens else None
    factor = FOOT_M if unit == "ft" else 1.0
    row = Row(line=record.first + 1, well=well, depth_unit=unit, depth_kind="core")
    if top is None or not 0 <= top * factor <= DEEPEST_M:
        findings.error(
            "depth_unreadable", f"Line {depth.first + 1} gives no possible depth: «{' '.join(tokens)}».",
            cell=address(depth.first, 0), value=" ".join(tokens)[:60], remedy="Correct the depth.",
        )  # fmt: skip
        return row
    row.top_m, row.top_text = top * factor, tokens[0]
    base = values.read_depth(tokens[1]).top if len(tokens) > 1 else None
    if base and base > top:
        row.base_m, row.base_text = base * factor, tokens[1]
    row.label = tokens[2][:120] if len(tokens) > 2 else ""
    row.remark = " ".join(line.strip() for line in looks.lines) if looks else ""
    return row


def _columns(made: CoreFile, findings: Findings) -> list[Column]:
    """A column for each property that is understood, the first of a field only; the others are named."""
    columns: list[Column] = []
    taken: set[str] = set()
    for at, text in enumerate(made.properties):
        code = field_of(text)
        if not code or code in taken:
            findings.note(
                "unmapped_column", f"Property {at + 1} «{text}» " + (f"is {code} again and" if code else "was not understood and") + " is left out.",
                id=f"unmapped_column:{at + 1}", cell=address(0, at).rstrip("1"), value=text, remedy="Its values stay in the kept file.",
            )  # fmt: skip
            continue
        taken.add(code)
        kind = field_types()[code]
        reason = f"«{text}» of the core interchange layout, which gives it in {kind.unit}"
        columns.append(Column(at, text, code, kind.unit, kind.unit, 0.95, reason, kind.method))
    return columns


def _settle(column: Column, made: CoreFile, findings: Findings) -> Settled:
    """The values of one property over all samples."""
    done = Settled([], [], [], [], [])
    for _, _, record in made.samples:
        tokens = " ".join(record.lines).split()
        text = tokens[column.index] if column.index < len(tokens) else ""
        read = values.read_text(text)
        state = read.state
        if state not in {values.VALUE, values.BLANK}:
            cell = address(record.first, column.index)
            findings.error(
                "unreadable_value", f"{column.field} in cell {cell} cannot be read: «{text}» {read.note}.",
                cell=cell, value=text, remedy="Correct the value.",
            )  # fmt: skip
            state = "finding"
        done.states.append(state)
        done.values.append(read.value if state == values.VALUE else None)
        done.qualifiers.append(read.qualifier if state == values.VALUE else "")
        done.texts.append(text)
        done.decimals.append(min(read.decimals, 12))
    column.decimals = max((d for d, s in zip(done.decimals, done.states, strict=True) if s == values.VALUE), default=0)
    blank = done.states.count(values.BLANK)
    if blank:
        findings.note(
            "null_code", f"{column.field}: {blank} of {len(done.states)} values are the file's «no value» and are read as blank.",
            id=f"null_code:{column.letter}", cell=column.letter, value="-1002",
        )  # fmt: skip
    return done


def _cores(made: CoreFile, well: WellKey, unit: str, found: WellRecords) -> None:
    """Record 20: the cored interval and the number of the core."""
    factor = FOOT_M if unit == "ft" else 1.0
    rows = []
    for record in made.cores:
        numbers = [values.read_text(token).value for token in " ".join(record.lines).split()]
        if len(numbers) >= 6 and all(number is not None for number in numbers[2:6]):
            top, base, number = numbers[2] or 0.0, numbers[3] or 0.0, numbers[5] or 0.0
            if base > top and number == int(number) and number > 0:
                rows.append(WellRow(record.first + 1, well, {
                    "number": int(number), "top_md_m": top * factor, "base_md_m": base * factor, "recovered_m": None, "shift_to_log_m": None,
                }))  # fmt: skip
    if rows:
        reason = "record 20 of the core interchange layout"
        columns = [
            Column(2, "top", "TOP", unit, unit, 0.95, reason, factor=factor), Column(3, "base", "BASE", unit, unit, 0.95, reason, factor=factor),
            Column(5, "core", "CORE", "", "", 0.9, reason),
        ]  # fmt: skip
        place = f"{address(rows[0].line - 1, 2)}:{address(rows[-1].line - 1, 5)}"
        found.tables.append(WellTable("", place, "core_runs", columns, [], rows))
