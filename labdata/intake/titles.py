"""What a title block and the file's name say: report number, version, laboratory, well, date, depth unit."""

import re
from dataclasses import dataclass, field
from datetime import date, datetime
from functools import cache
from pathlib import PurePath

from labdata.intake import units
from labdata.intake.fields import synonyms
from labdata.intake.headers import fold

_VERSION = re.compile(
    r"(?:^|[\s_\-.(,])(?:rev(?:ision)?|version|ver|v|amend(?:ed|ment)?|issue|ausgabe)[\s_\-.:]*(?:no\.?|nr\.?)?[\s_\-]*(\d{1,3})(?=$|[\s_\-.),;])",
    re.I,
)
_AMENDED = re.compile(
    r"\b(?:amended|supersedes|replaces|revised|corrected|ersetzt|remplace|reemplaza|erstatter|vervangt)\b", re.I
)
_NAMED_AMENDED = re.compile(r"[\s_\-.(]*(?:amended|revised|corrected)\)?$", re.I)
_REPORT = re.compile(
    r"\b(?:report|job|batch|certificate|work order|bericht|rapport|informe|auftrag)\s*(?:no\.?|nr\.?|number|id|#|n°)?\s*[:#]?\s*([A-Z0-9][\w\-/.]*\d[\w\-/.]*)",
    re.I,
)
_SUPERSEDES = re.compile(
    r"\b(?:supersedes|replaces|ersetzt|remplace)\s+(?:the\s+)?(?:report|job|version|bericht|rapport)?\s*(?:no\.?|nr\.?)?\s*[:#]?\s*([A-Z0-9][\w\-/.]*\d[\w\-/]*)",
    re.I,
)
_ND = re.compile(r"\bn\.?\s?d\.?\s*(?:=|:|-|–|means|stands for)?\s*[«\"'(]?\s*(not\s+\w+|nicht\s+\w+|no\s+\w+)", re.I)
_DEPTHS = re.compile(
    r"\b(?:all\s+)?depths?\s*(?:are|is|in|:|=|given|reported|quoted|,|units?)+\s*(?:in\s+)?(\w+)", re.I
)


@dataclass
class Facts:
    """What the lines outside the tables say; empty where they say nothing."""

    report: str = ""
    revision: int | None = None
    amended: bool = False
    supersedes: str = ""
    laboratory: str = ""
    well: str = ""
    uwi: str = ""
    kind: str = ""
    formation: str = ""
    depth_unit: str = ""
    nd: str = ""
    reported_on: date | None = None
    lines: list[str] = field(default_factory=list)


@cache
def _words() -> dict[str, str]:
    return {fold(word): what for what, words in synonyms()["title"].items() for word in words}


def read_title(lines: list[list[str]]) -> Facts:
    """Facts from the lines outside the tables, each line a list of its filled cells."""
    facts = Facts(lines=[" ".join(line) for line in lines])
    for line in lines:
        for key, value in _pairs(line):
            _take(facts, key, value)
    for text in facts.lines:
        _take_prose(facts, text)
    if facts.report:
        facts.report, revision, amended = split_version(facts.report)
        facts.revision = revision if facts.revision is None else facts.revision
        facts.amended = facts.amended or amended
    return facts


def _pairs(line: list[str]) -> list[tuple[str, str]]:
    """(what, value) for ``Well: Quill 1`` in one cell, and for ``Well`` | ``Quill 1`` in two."""
    found = []
    for at, cell in enumerate(line):
        key, mark, value = cell.partition(":")
        what = _words().get(fold(key.strip(" #*")))
        if what is None:
            continue
        if mark and value.strip():
            found.append((what, value.strip()))
        elif at + 1 < len(line) and (mark or len(line) <= 8):
            found.append((what, line[at + 1].strip()))
    return found


def _take(facts: Facts, what: str, value: str) -> None:
    if what == "date":
        facts.reported_on = facts.reported_on or read_date(value)
    elif what == "version":
        number = re.search(r"\d+", value)
        facts.revision = int(number.group()) if number and facts.revision is None else facts.revision
    elif what == "depth_unit":
        facts.depth_unit = facts.depth_unit or _length_unit(value)
    elif not getattr(facts, what) and _words().get(fold(value)) is None:
        setattr(facts, what, value[:120])


def _take_prose(facts: Facts, text: str) -> None:
    if facts.revision is None and (match := _VERSION.search(text)):
        facts.revision = int(match.group(1))
    facts.amended = facts.amended or bool(_AMENDED.search(text))
    if not facts.supersedes and (match := _SUPERSEDES.search(text)):
        facts.supersedes = match.group(1)
    elif not facts.report and (match := _REPORT.search(text)):
        facts.report = match.group(1).rstrip(".,;")
    if not facts.nd and (match := _ND.search(text)):
        facts.nd = match.group(1).casefold()
    if not facts.depth_unit and (match := _DEPTHS.search(text)):
        facts.depth_unit = _length_unit(match.group(1))


def _length_unit(text: str) -> str:
    unit = units.parse(text.split(maxsplit=1)[0] if text.split() else "")
    return unit if unit in {"m", "ft"} else ""


def read_date(text: str) -> date | None:
    """An ISO date, or day-month-year with the month in letters; figures that could be either are not guessed."""
    for shape in (
        "%Y-%m-%d",
        "%Y-%m-%d %H:%M",
        "%d %B %Y",
        "%d %b %Y",
        "%d-%b-%Y",
        "%d-%b-%y",
        "%B %d, %Y",
        "%d.%m.%Y",
        "%Y/%m/%d",
    ):
        try:
            return datetime.strptime(text.strip(), shape).date()
        except ValueError:
            continue
    return None


def split_file_name(name: str) -> tuple[str, int | None, bool]:
    """(report number, revision, amended) as the file's name tells: ``KG-17_rev2.xlsx`` is (``KG-17``, 2, False)."""
    stem = PurePath(name).name
    return split_version(
        re.sub(r"\.(?:xlsx|xlsm|xlsb|xls|ods|csv|tsv|txt|las|tops|spwla|asc|dat)$", "", stem, flags=re.I)
    )


def split_version(number: str) -> tuple[str, int | None, bool]:
    """(number, revision, amended) of a report number that carries its version: ``KG-17 Rev 2``, ``KG-17 (amended)``."""
    revision, amended = None, False
    if match := _VERSION.search(number):
        revision = int(match.group(1))
        amended = "amend" in match.group(0).casefold()
        number = (number[: match.start()] + number[match.end() :]).strip(" _-.(),;") or number
    if (match := _NAMED_AMENDED.search(number)) and match.start():
        number, amended = number[: match.start()], True
    return number[:120], revision, amended
