"""What reading a file turned up, each with its place and what would do."""

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any

LEVELS = ("error", "question", "warning", "note")


@dataclass(frozen=True)
class Finding:
    """One thing a person should know. ``cells`` are the addresses that gave no result because of it."""

    level: str
    id: str
    code: str
    message: str
    remedy: str = ""
    sheet: str = ""
    cell: str = ""
    value: str = ""
    options: tuple[str, ...] = ()
    cells: tuple[str, ...] = ()

    def as_dict(self) -> dict[str, Any]:
        """The finding as the outside contract gives it."""
        shown: dict[str, Any] = {
            "level": self.level, "id": self.id, "code": self.code, "sheet": self.sheet, "cell": self.cell,
            "value": self.value, "message": self.message, "remedy": self.remedy,
        }  # fmt: skip
        if self.level == "question":
            shown["options"] = list(self.options)
        if self.cells:
            shown["cells"] = list(self.cells)
        return shown


@dataclass
class Findings:
    """Collects findings and takes the answers a person has given to questions."""

    answers: dict[str, str] = field(default_factory=dict)
    found: list[Finding] = field(default_factory=list)

    def error(self, code: str, message: str, **place: Any) -> None:
        self._add("error", code, message, place)

    def warning(self, code: str, message: str, **place: Any) -> None:
        self._add("warning", code, message, place)

    def note(self, code: str, message: str, **place: Any) -> None:
        self._add("note", code, message, place)

    def ask(
        self, id: str, code: str, message: str, options: Sequence[str], *, free: bool = False, **place: Any
    ) -> str | None:
        """The answer to a question, else None after asking it. With ``free`` any text will do, the options are offered."""
        given = self.answers.get(id)
        if given is not None:
            chosen = accept(str(given), () if free else options)
            if chosen is not None:
                return chosen
            message = f"{message} The answer «{given}» is none of the options."
        place.setdefault("remedy", _choices(id, options))
        self.found.append(Finding("question", id, code, message, options=tuple(options), **place))
        return None

    def has(self, level: str) -> bool:
        return any(finding.level == level for finding in self.found)

    def _add(self, level: str, code: str, message: str, place: dict[str, Any]) -> None:
        where = place_name(place.get("sheet", ""), place.get("cell", ""))
        id_ = place.pop("id", "") or (f"{code}:{where}" if where else code)
        self.found.append(Finding(level, id_, code, message, **place))

    def ordered(self) -> list[Finding]:
        """Errors first, then questions, warnings and notes; in the order found within each."""
        return sorted(self.found, key=lambda finding: LEVELS.index(finding.level))


def place_name(sheet: str, cell: str) -> str:
    """``Sheet1!B7``; without a sheet name, as in a text file, ``B7``."""
    return f"{sheet}!{cell}" if sheet and cell else sheet or cell


def _choices(id: str, options: Sequence[str]) -> str:
    listed = ", ".join(f"«{option}»" for option in options)
    return f"Answer «{id}» with one of {listed}." if options else f"Answer «{id}»."


SAME_ANSWER = {
    "percent": "wt%", "%": "wt%", "weight percent": "wt%", "wt %": "wt%", "wt.%": "wt%", "pct": "wt%",
    "fractions": "fraction", "decimal fraction": "fraction", "g/g": "fraction",
    "feet": "ft", "foot": "ft", "metre": "m", "metres": "m", "meter": "m", "meters": "m",
    "ppm": "ug/g", "mg/kg": "ug/g", "µg/g": "ug/g",
    "amended": "amended version", "amendment": "amended version", "new version": "amended version",
    "separate": "separate report",
}  # fmt: skip


def accept(given: str, options: Sequence[str]) -> str | None:
    """The option that an answer means, or None. Without options any text is an answer."""
    text = given.strip()
    if not options:
        return text or None
    folded = {option.casefold(): option for option in options}
    key = text.casefold()
    return folded.get(key) or folded.get(SAME_ANSWER.get(key, "").casefold()) or _in_other_words(key, folded)


def _in_other_words(key: str, folded: dict[str, str]) -> str | None:
    """An option that shares its meaning with the answer (``%`` for an option ``percent``)."""
    meaning = SAME_ANSWER.get(key, key)
    for option_key, option in folded.items():
        if SAME_ANSWER.get(option_key, option_key) == meaning:
            return option
    return None
