"""Texts with a layout of their own: well logs, core interchange text, tops files. What a text is, and its lines as cells."""

import re
from dataclasses import dataclass

from labdata.intake.textfile import decode

LAS, CORE_TEXT, TOPS_TEXT = "las", "core text", "tops text"
LOG_LINES = 400  # as many lines of a log are shown as cells
COMMENT = re.compile(r"^\s*[#%]\s*(.*?)\s*$")
_RECORD = re.compile(r"^\s{0,3}(10|15|20|30|36|40)\s+(\d{1,4})(?:\s+(\d{1,4}))?\s*$")


@dataclass
class Record:
    """One record of core interchange text: its type, the lines that follow its head, the place of the first from 0."""

    kind: str
    first: int
    lines: list[str]


def plain_lines(name: str, content: bytes) -> str:
    """The text with one kind of line ending."""
    return decode(name, content)[0].replace("\r\n", "\n").replace("\r", "\n")


def kind_of(content: bytes) -> str | None:
    """LAS, CORE_TEXT or TOPS_TEXT; None for any other content."""
    head = content[:8000].decode("latin-1").replace("\r\n", "\n").replace("\r", "\n")
    head = head.removeprefix("ï»¿")
    if _is_las(head):
        return LAS
    if _is_core_text(head):
        return CORE_TEXT
    return TOPS_TEXT if _is_tops_text(head) else None


def _is_las(head: str) -> bool:
    """True for a text whose first section is LAS version information."""
    first = next((line for line in head.split("\n") if line.strip() and not line.lstrip().startswith("#")), "")
    return bool(re.match(r"\s*~V", first, re.I))


def _is_core_text(head: str) -> bool:
    """True for a text that starts with a record 10 and has records of properties."""
    lines = head.split("\n")
    first = next((line for line in lines if line.strip()), "")
    return bool(re.match(r"^\s{0,3}10\s+\d+\s*$", first)) and any(
        re.match(r"^\s{0,3}15\s+\d+", line) for line in lines[:40]
    )


def _is_tops_text(head: str) -> bool:
    """True for a text with a section of formations or tops under comment lines."""
    said = [match[1].casefold() for line in head.split("\n")[:60] if (match := COMMENT.match(line))]
    sections = {"formations", "formation tops", "tops"}
    return any(line in sections for line in said) and any(
        line.partition(":")[0] in {"units", "gl", "td", "kb", "loc"} for line in said
    )


def records(text: str) -> list[Record]:
    """Every record of core interchange text, in order."""
    lines, found, at = text.split("\n"), [], 0
    while at < len(lines):
        match = _RECORD.match(lines[at])
        if match is None:
            at += 1
            continue
        count = int(match[2])
        found.append(Record(match[1], at + 1, lines[at + 1 : at + 1 + count]))
        at += 1 + count
    return found


def split_top(line: str) -> list[str]:
    """Name or depth, and the number, of a line of a tops file."""
    part = "\t" if "\t" in line else ","
    return [cell.strip() for cell in line.rsplit(part, 1)] if line.strip() else []


def cells(kind: str, name: str, content: bytes) -> list[list[str]]:
    """The lines as rows of cells, so that a value's place can be shown.

    Core text: values that run over several lines stand in the first. A log: its header and first lines.
    """
    text = plain_lines(name, content)
    if kind == TOPS_TEXT:
        return [[line.strip()] if COMMENT.match(line) else split_top(line) for line in text.split("\n")]
    lines = text.split("\n") if kind == CORE_TEXT else text.split("\n", LOG_LINES)[:LOG_LINES]
    rows = [re.split(r"\s{2,}", line.strip()) if line.strip() else [] for line in lines]
    if kind == CORE_TEXT:
        for record in records(text):
            if record.kind == "40" and record.first < len(rows):
                rows[record.first] = " ".join(record.lines).split()
    return rows
