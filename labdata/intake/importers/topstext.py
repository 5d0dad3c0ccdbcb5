"""Plain-text files of formation tops and core porosity: comment lines say units and elevations, sections follow.

Two dialects: comments by % and cells parted by a tab, or comments by # and cells parted by a comma. The well's
identifier stands in the file's name.
"""

import re
from dataclasses import dataclass, field
from pathlib import PurePath

from labdata.intake import values
from labdata.intake.columns import Column
from labdata.intake.findings import Findings
from labdata.intake.importers.records import WellKey, WellRecords, WellRow, WellTable
from labdata.intake.importers.welltables import well_facts
from labdata.intake.plaintext import COMMENT, split_top
from labdata.intake.prepared import PreparedTable
from labdata.intake.reading import Settled
from labdata.intake.rows import DEEPEST_M, Row
from labdata.intake.units import FOOT_M
from labdata.intake.workbook import address

_FACT = re.compile(r"^(\w+)\s*:\s*(.+)$")
_UWI = re.compile(r"(?<!\d)(\d{10}|\d{12}|\d{14})(?!\d)")


@dataclass
class TopsFile:
    """``sections``: name -> (line from 0, name or depth, number) of its lines; ``facts``: comment key -> text."""

    facts: dict[str, str] = field(default_factory=dict)
    sections: dict[str, list[tuple[int, list[str]]]] = field(default_factory=dict)

    @property
    def unit(self) -> str:
        return {"FT": "ft", "F": "ft", "FEET": "ft", "M": "m", "METRES": "m", "METERS": "m"}.get(
            self.facts.get("UNITS", "").upper(), ""
        )


def read_tops_file(text: str) -> TopsFile:
    """Facts and sections of the file."""
    made, section = TopsFile(), ""
    for at, line in enumerate(text.split("\n")):
        if comment := COMMENT.match(line):
            fact = _FACT.match(comment[1])
            if fact:
                made.facts[fact[1].upper()] = fact[2]
            elif comment[1]:
                section = comment[1].casefold()
                made.sections.setdefault(section, [])
        elif line.strip():
            made.sections.setdefault(section, []).append((at, split_top(line)))
    return made


def uwi_of(name: str) -> str:
    """The API number in a file's name, or ""."""
    match = _UWI.search(PurePath(name).stem)
    return match[1] if match else ""


def take_tops_file(made: TopsFile, well: WellKey, findings: Findings, found: WellRecords) -> list[PreparedTable]:
    """Tops and well facts go to ``found``; porosity becomes a table of results."""
    unit = made.unit
    if not unit:
        unit = (
            findings.ask(
                "unit:depth", "depth_unit_missing", "The file does not say the unit of its depths.", ["m", "ft"]
            )
            or ""
        )
    facts = {code: (text, "") for code in ("GL", "KB", "TD") if (text := made.facts.get(code))}
    found.tell(well, well_facts(facts, unit))
    if "LOC" in made.facts:
        findings.note(
            "position_left",
            f"The position «{made.facts['LOC']}» is in a local grid and is left out.",
            value=made.facts["LOC"],
        )
    tables = []
    for section, lines in made.sections.items():
        if section in {"formations", "formation tops", "tops"}:
            found.tables += _tops(lines, unit, well, findings)
        elif section.startswith("poros"):
            tables += _porosity(lines, unit, well, findings)
        elif lines:
            findings.warning(
                "section_left", f"Section «{section}» with {len(lines)} lines was not understood and is left out.",
                cell=address(lines[0][0], 0), value=section, remedy="Its lines stay in the kept file.",
            )  # fmt: skip
    return tables


def _tops(lines: list[tuple[int, list[str]]], unit: str, well: WellKey, findings: Findings) -> list[WellTable]:
    factor = FOOT_M if unit == "ft" else 1.0
    rows = []
    for at, line in lines:
        depth = _depth(at, 1, line, findings)
        if depth is None:
            continue
        rows.append(WellRow(at + 1, well, {"name": line[0][:120], "top_md_m": depth * factor}))
    if not rows:
        return []
    reason = "section of formation tops"
    columns = [
        Column(0, "Formations", "NAME", "", "", 0.95, reason),
        Column(1, "depth", "MD", unit, unit, 0.95, reason, factor=factor),
    ]
    return [WellTable("", f"A{lines[0][0] + 1}:B{lines[-1][0] + 1}", "tops", columns, [], rows)]


def _depth(at: int, place: int, line: list[str], findings: Findings) -> float | None:
    """The line's depth; a null value is noted, anything else that is no depth is an error."""
    text = line[place] if place < len(line) else ""
    read = values.read_depth(text)
    cell = address(at, place)
    if read.state == values.BLANK:
        findings.note(
            "null_code", f"«{line[0]}» has no depth ({text or 'blank'}), so no top is taken for it.", cell=cell, value=text,
            remedy="Nothing to do.",
        )  # fmt: skip
        return None
    if read.state != values.VALUE or read.top is None or not 0 <= read.top <= DEEPEST_M / FOOT_M:
        findings.error(
            "depth_unreadable", f"Cell {cell} «{text}» is no depth.", cell=cell, value=text, remedy="Correct the line."
        )
        return None
    return read.top


def _porosity(lines: list[tuple[int, list[str]]], unit: str, well: WellKey, findings: Findings) -> list[PreparedTable]:
    """Depth and porosity line by line; percent or fraction as the numbers tell, else asked."""
    factor = FOOT_M if unit == "ft" else 1.0
    rows, settled = [], Settled([], [], [], [], [])
    for at, line in lines:
        depth = _depth(at, 0, line, findings)
        if depth is None:
            continue
        rows.append(Row(at + 1, well, kind="core", top_m=depth * factor, top_text=line[0], depth_unit=unit))
        _value(at, line[1] if len(line) > 1 else "", settled, findings)
    if not rows:
        return []
    share, why = _share(settled, findings)
    settled.values = [None if value is None else float(f"{value * share:.15g}") for value in settled.values]
    said = "fraction" if share != 1 else "%"
    reason = f"section of porosity; {why}"
    column = Column(1, "Porosity", "PHI", said, "", 0.9, reason, "core", factor=share, decimals=max(settled.decimals))
    top = Column(0, "depth", "TOP", unit, unit, 0.95, "section of porosity", factor=factor)
    return [PreparedTable("", f"A{rows[0].line}:B{rows[-1].line}", [top, column], [], rows, {1: settled})]


def _value(at: int, text: str, settled: Settled, findings: Findings) -> None:
    read = values.read_text(text)
    state = read.state if read.state in {values.VALUE, values.BLANK} else "finding"
    if state == "finding":
        cell = address(at, 1)
        findings.error(
            "unreadable_value",
            f"PHI in cell {cell} cannot be read: «{text}».",
            cell=cell,
            value=text,
            remedy="Correct the line.",
        )
    settled.states.append(state)
    settled.values.append(read.value if state == values.VALUE else None)
    settled.qualifiers.append(read.qualifier if state == values.VALUE else "")
    settled.texts.append(text)
    settled.decimals.append(min(read.decimals, 12))


def _share(settled: Settled, findings: Findings) -> tuple[float, str]:
    """(factor into percent, why)."""
    known = [value for value in settled.values if value is not None]
    top = max(known, default=0.0)
    if top > 1.5:
        return 1.0, f"values up to {top:g}, so percent"
    answer = findings.ask(
        "unit:porosity",
        "unit_missing",
        f"Porosity is given without a unit; its largest value is {top:g}.",
        ["fraction", "%"],
    )
    return (1.0 if answer == "%" else 100.0), f"{answer or 'unit'} answered by a person"
