"""Which wells of the project a file means, and which samples are already there. Reads only; storing is the registry's."""

import re
from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any

from rapidfuzz import fuzz

from labdata.intake.findings import Findings
from labdata.intake.importers.records import WellRow
from labdata.intake.names import name_key, uwi_key
from labdata.intake.rows import Row
from labdata.models import Project, Sample, Well, WellAlias, WellIdentifier

NEW_WELL = "new well"
_NEAR = 84.0


@dataclass
class WellPlan:
    """A well that the file speaks of: an existing one by ``pk``, or one to be made with these details.

    ``completions``: what an existing one lacks and the file gives.
    """

    name: str
    uwi: str = ""
    pk: int | None = None
    details: dict[str, str | float] = field(default_factory=dict)
    aliases: set[str] = field(default_factory=set)
    completions: dict[str, str | float] = field(default_factory=dict)


class WellDirectory:
    """The project's wells by identifier and by folded name."""

    def __init__(self, project: Project) -> None:
        self.wells = {well.pk: well for well in Well.objects.filter(project=project)}
        self.by_uwi: dict[str, int] = {uwi_key(w.uwi): w.pk for w in self.wells.values() if w.uwi}
        self.by_name: dict[str, set[int]] = {}
        for well in self.wells.values():
            self.by_name.setdefault(name_key(well.name), set()).add(well.pk)
        for alias in WellAlias.objects.filter(well__project=project):
            self.by_name.setdefault(name_key(alias.name), set()).add(alias.well_id)
        for other in WellIdentifier.objects.filter(well__project=project):
            self.by_uwi.setdefault(uwi_key(other.value), other.well_id)

    def find(self, name: str, uwi: str) -> set[int]:
        """Wells that the name and identifier fit. The identifier decides; a name alone may fit several."""
        if uwi and (found := self.by_uwi.get(uwi_key(uwi))):
            return {found}
        named = self.by_name.get(name_key(name), set()) if name else set()
        if uwi:  # the same name under another identifier is another well
            return {pk for pk in named if not self.wells[pk].uwi}
        return named or ({self.by_uwi[uwi_key(name)]} if name and uwi_key(name) in self.by_uwi else set())

    def near(self, name: str) -> list[str]:
        """Names of wells that may be meant: the same numbers, and letters a slip or two away."""
        key = name_key(name)
        numbers = re.findall(r"\d+", key)
        scored = [
            (fuzz.ratio(key, other), self.wells[pk].name)
            for other, pks in self.by_name.items()
            for pk in pks
            if re.findall(r"\d+", other) == numbers
        ]
        return list(dict.fromkeys(shown for score, shown in sorted(scored, reverse=True) if score >= _NEAR))[:5]

    def label(self, pk: int) -> str:
        """The well's name with its identifier, so that wells of one name can be told apart."""
        well = self.wells[pk]
        return f"{well.name} ({well.uwi})" if well.uwi else well.name


@dataclass
class WellMatcher:
    """Finds the wells that rows name. ``create``: unknown ones may be made from the file."""

    directory: WellDirectory
    findings: Findings
    create: bool

    def match(self, rows: Sequence[tuple[Row | WellRow, str, str]]) -> dict[tuple[str, str], WellPlan]:
        """(name, uwi) -> well for every pair in the rows; each row comes with its sheet and the address of its well cell."""
        plans: dict[tuple[str, str], WellPlan] = {}
        made: dict[str, WellPlan] = {}
        tried: set[tuple[str, str]] = set()
        for row, sheet, cell in rows:
            if row.well in tried or row.well == ("", ""):
                continue
            tried.add(row.well)
            plan = self._plan(*row.well, place={"sheet": sheet, "cell": cell})
            if plan is not None:
                key = str(plan.pk) if plan.pk else uwi_key(plan.uwi) or f"name {name_key(plan.name)}"
                plans[row.well] = made.setdefault(key, plan)
        return plans

    def _plan(self, name: str, uwi: str, *, place: dict[str, Any]) -> WellPlan | None:
        found = sorted(self.directory.find(name, uwi))
        shown = name or uwi
        if len(found) == 1:
            well = self.directory.wells[found[0]]
            return WellPlan(well.name, well.uwi, well.pk)
        if len(found) > 1:
            return self._ask_which(shown, found, place)
        near = self.directory.near(name) if name else []
        if near and (self.create or f"well:{shown}" in self.findings.answers):
            return self._ask_near(name, uwi, near, place)
        if self.create:
            return WellPlan(name or uwi, uwi)
        self.findings.error(
            "unknown_well",
            f"There is no well «{shown}» in the project.",
            id=f"well:{shown}",
            value=shown,
            remedy=_remedy(shown, near),
            **place,
        )
        return None

    def _ask_which(self, shown: str, found: list[int], place: dict[str, Any]) -> WellPlan | None:
        options = [self.directory.label(pk) for pk in found]
        message = f"«{shown}» may be any of {len(found)} wells."
        answer = self.findings.ask(f"well:{shown}", "well_ambiguous", message, options, value=shown, **place)
        pk = next((pk for pk in found if self.directory.label(pk) == answer), None)
        return WellPlan(shown, pk=pk) if pk else None

    def _ask_near(self, name: str, uwi: str, near: list[str], place: dict[str, Any]) -> WellPlan | None:
        options = [*near, NEW_WELL] if self.create else near
        message = f"There is no well «{name}»; {_either(near)} is spelt nearly the same."
        answer = self.findings.ask(f"well:{name}", "well_near_miss", message, options, value=name, **place)
        if answer is None:
            return None
        if answer == NEW_WELL:
            return WellPlan(name, uwi)
        return WellPlan(answer, pk=min(self.directory.by_name[name_key(answer)]), aliases={name})


def _either(names: list[str]) -> str:
    return " or ".join(f"«{name}»" for name in names)


def _remedy(shown: str, near: list[str]) -> str:
    if near:
        return (
            f"Did you mean {_either(near)}? Then answer «well:{shown}» with that name; "
            "else register the well, or allow new wells (--create-wells)."
        )
    return "Register the well first, or allow new wells (--create-wells)."


@dataclass
class Held:
    """A sample as much as matching needs; ``pk`` is None for one that the file brings, ``row`` its first row there."""

    pk: int | None
    kind: str
    label: str
    top_m: float | None
    base_m: float | None
    row: Row | None = None


class SampleDirectory:
    """The samples of some wells. Found again by key, or where one side says less, by what both sides say.

    Wells are named by any integer that tells them apart, their id where they have one.
    """

    def __init__(self, wells: set[int]) -> None:
        self.by_key: dict[tuple[int, str], Held] = {}
        self.by_label: dict[tuple[int, str, str], list[Held]] = {}
        self.by_top: dict[tuple[int, str], list[Held]] = {}
        fields = ("well_id", "match_key", "pk", "kind", "label", "top_md_m", "base_md_m")
        for well, key, *rest in Sample.objects.filter(well__in=wells).values_list(*fields):
            self._add(well, key, Held(*rest))

    def _add(self, well: int, key: str, held: Held) -> None:
        self.by_key[well, key] = held
        self.by_label.setdefault((well, held.label, _place(held.top_m, held.base_m)), []).append(held)
        self.by_top.setdefault((well, _place(held.top_m)), []).append(held)

    def place(self, well: int, row: Row) -> Held:
        """The sample that the row speaks of; a new one when none fits."""
        found = self.by_key.get((well, row.match_key)) or self._alike(well, row)
        if found is None:
            found = Held(None, row.kind, row.label, row.top_m, row.base_m, row)
            self._add(well, row.match_key, found)
        return found

    def _alike(self, well: int, row: Row) -> Held | None:
        """The one sample of the same number and depth, or for a row without a number, of the same depth."""
        same = self.by_label.get((well, row.label, _place(row.top_m, row.base_m)), [])
        fitting = [held for held in same if row.kind == "unknown" or (held.kind == "unknown" and row.label)]
        if not fitting and not row.label and row.top_m is not None:
            fitting = [
                held
                for held in self.by_top.get((well, _place(row.top_m)), [])
                if row.kind in {"unknown", held.kind} and row.base_m in {None, held.base_m}
            ]
        return fitting[0] if len(fitting) == 1 else None


def _place(*depths: float | None) -> str:
    return "|".join("" if depth is None else f"{depth:.3f}" for depth in depths)


def fullest_first(rows: list[tuple[int, Row]]) -> list[tuple[int, Row]]:
    """Rows that give a sample number before those that do not, so that the latter find the former."""
    return sorted(rows, key=lambda pair: not pair[1].label)
