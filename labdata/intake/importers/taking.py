"""Files and sheets that hold records of wells: who reads them, which well they mean, what is held of it already."""

from collections.abc import Callable
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any

from labdata.intake import plaintext
from labdata.intake.columns import Column
from labdata.intake.importers import coretext, las, topstext, welltables
from labdata.intake.importers.records import WellKey, WellRecords, WellRow, WellTable
from labdata.intake.importers.truedepth import Survey, place_tops
from labdata.intake.matching import WellDirectory, WellPlan
from labdata.intake.titles import Facts
from labdata.intake.workbook import Sheet
from labdata.models import CasingShoe, CoreRun, FormationTop, MudInterval, SurveyStation, Well

if TYPE_CHECKING:
    from labdata.intake.prepared import Prepared, PreparedTable
    from labdata.intake.preparing import Request

REPLACE, KEEP = "replace", "keep"
WORDS = {"survey": "deviation survey", "core_runs": "core runs", "mud": "mud record", "casing": "casing record"}
MODELS: dict[str, tuple[Any, tuple[str, ...]]] = {
    "survey": (SurveyStation, ("md_m", "inclination_deg", "azimuth_deg")),
    "core_runs": (CoreRun, ("number", "top_md_m", "base_md_m", "recovered_m", "shift_to_log_m")),
    "mud": (MudInterval, ("top_md_m", "base_md_m", "kind", "additives")),
    "casing": (CasingShoe, ("md_m", "diameter_in")),
    "tops": (FormationTop, ("name", "top_md_m")),
}


@dataclass
class RecordReader:
    """Reads what is no table of results. ``ask_well`` asks for the well of a file that names none."""

    request: "Request"
    made: "Prepared"
    directory: WellDirectory
    ask_well: Callable[[], str]
    facts: Facts = field(default_factory=Facts)
    places: dict[WellKey, tuple[str, str]] = field(default_factory=dict)

    def take_file(self, kind: str) -> "list[PreparedTable]":
        """Read the whole file as of ``kind`` (a kind of ``workbook.Workbook`` that is no workbook)."""
        content, name, findings = self.request.content, self.request.name, self.made.findings
        if kind == plaintext.LAS:
            self._log(las.LogFile(name, content))
            return []
        text = plaintext.plain_lines(name, content)
        if kind == plaintext.TOPS_TEXT:
            well = self.well_of("", topstext.uwi_of(name))
            return topstext.take_tops_file(topstext.read_tops_file(text), well, findings, self.made.records)
        core = coretext.read_core_file(text)
        self.facts = coretext.facts(core)
        table = coretext.take_core_file(core, self.well_of(core.well, ""), findings, self.made.records)
        return [table] if table else []

    def take_sheet(self, sheet: Sheet) -> bool:
        """Add the sheet's tables of well records; False when it has none."""
        before = len(self.made.records.tables)
        welltables.read_well_tables(sheet, self.made.findings, self.well_of, self.made.records)
        return len(self.made.records.tables) > before

    def _log(self, log: las.LogFile) -> None:
        well = self.well_of(*log.well())
        curves = log.curves(well, self.made.findings)
        self.made.records.curves += curves
        self.made.records.tell(well, log.facts())
        names = [item.mnemonic for item in log.las.curves]
        columns = [
            Column(names.index(c.mnemonic), c.mnemonic, "GR" if c.quantity == "gamma" else c.quantity.upper(), c.unit, c.unit, 0.95,
                   f"«{c.mnemonic}» is a usual name of {c.quantity}")
            for c in curves
        ]  # fmt: skip
        unmapped = [name for name in names[1:] if name not in {c.mnemonic for c in curves}]
        self.made.records.tables.append(WellTable("", "", "gamma", columns, unmapped, []))

    def well_of(self, name: str, uwi: str) -> WellKey:
        """(name, identifier) of the well that a file or sheet states: one of the project's, else the one asked for, else as stated."""
        asked = self.request.well
        stated = name or uwi
        if not stated:
            return (asked or self.ask_well(), "")
        if self.directory.find(name, uwi):
            key = (name, uwi)
        elif uwi and self.directory.find(uwi, ""):
            key = (uwi, "")
        elif asked:
            self.made.findings.note(
                "well_named_otherwise", f"The file names its well «{stated}»; it is taken for «{asked}», as asked.", value=stated,
                remedy="Nothing to do if it is.",
            )  # fmt: skip
            return (asked, "")
        else:
            return (name, uwi)
        if asked and self.directory.find(*key) != self.directory.find(asked, ""):
            self.made.findings.warning(
                "well_option_unused", f"The file is of the well «{stated}»; «{asked}» was not used.", value=asked,
                remedy="Leave the well away for this file.",
            )  # fmt: skip
        return key

    def name_rows(self) -> list[tuple[WellRow, str, str]]:
        """The records with their sheet and cell, for matching their wells."""
        named = []
        for table in self.made.records.tables:
            for row in table.rows:
                cell = f"A{row.line}"
                if row.well == ("", ""):
                    if not self.made.findings.has("question"):
                        self.made.findings.error(
                            "row_without_well",
                            f"Row {row.line} names no well.",
                            sheet=table.sheet,
                            cell=cell,
                            remedy="Name its well.",
                        )
                    continue
                named.append((row, table.sheet, cell))
        others = {curve.well for curve in self.made.records.curves} | set(self.made.records.facts)
        named += [(WellRow(1, well), "", "") for well in sorted(others)]
        return named


def settle(made: "Prepared", directory: WellDirectory) -> None:
    """After the wells are matched: facts of wells, tops by true depth, and what is held already."""
    records = made.records
    for table in records.tables:
        if table.kind == "wells":
            for row in table.rows:
                alias = row.values.pop("alias", "")
                if alias and row.well in made.wells:
                    made.wells[row.well].aliases.add(alias)
                records.tell(row.well, row.values)
    for key, facts in records.facts.items():
        if plan := made.wells.get(key):
            _tell_plan(plan, facts, made, directory)
    surveys = _surveys(made)
    for table in records.tables:
        if table.kind == "tops":
            place_tops(table, made.findings, surveys, lambda key: _datum(key, made, directory))
    for table in list(records.tables):
        if table.kind in MODELS and table.rows:
            _against_held(table, made)


def _tell_plan(plan: WellPlan, facts: dict[str, Any], made: "Prepared", directory: WellDirectory) -> None:
    """A new well takes what the file says; one that is held takes what it lacks, and differences are said, never written."""
    if plan.pk is None:
        plan.details = {**facts, **plan.details}
        return
    held = directory.wells[plan.pk]
    for name, value in facts.items():
        now = getattr(held, name)
        if now in {None, ""}:
            plan.completions.setdefault(name, value)
        elif now != value and not (isinstance(value, float) and abs(now - value) < 0.005):
            label = getattr(Well._meta.get_field(name), "verbose_name", name)
            made.findings.warning(
                "well_differs", f"The file gives {label} of «{held.name}» as {value}; {now} is held and stays.",
                id=f"well_differs:{held.pk}:{name}", value=str(value), remedy="Correct the well if the file is right.",
            )  # fmt: skip


def _surveys(made: "Prepared") -> Callable[[WellKey], Survey]:
    """The survey of a well: of this file, else as held."""
    own: dict[WellKey, Survey] = {}
    for table in made.records.tables:
        if table.kind == "survey":
            for row in table.rows:
                station = (row.values["md_m"], row.values["inclination_deg"], row.values["azimuth_deg"])
                own.setdefault(row.well, []).append(station)

    def survey(key: WellKey) -> Survey:
        if key in own:
            return sorted(own[key])
        plan = made.wells.get(key)
        if plan is None or plan.pk is None:
            return []
        return list(SurveyStation.objects.filter(well=plan.pk).values_list("md_m", "inclination_deg", "azimuth_deg"))

    return survey


def _datum(key: WellKey, made: "Prepared", directory: WellDirectory) -> float | None:
    plan = made.wells.get(key)
    if plan is None:
        return None
    if plan.pk is not None and directory.wells[plan.pk].datum_elevation_m is not None:
        return directory.wells[plan.pk].datum_elevation_m
    said = {**plan.details, **plan.completions}.get("datum_elevation_m")
    return float(said) if said is not None else None


def _against_held(table: WellTable, made: "Prepared") -> None:
    """Rows of wells that hold such records: dropped when they are the same, else a person says whether they replace them."""
    model, fields = MODELS[table.kind]
    for key in {row.well for row in table.rows}:
        plan = made.wells.get(key)
        if plan is None or plan.pk is None:
            continue
        held = set(model.objects.filter(well=plan.pk).values_list(*fields))
        rows = [row for row in table.rows if row.well == key]
        if not held:
            continue
        if {tuple(row.values[name] for name in fields) for row in rows} <= held:
            _drop(table, rows, made, f"The {_word(table)} of «{plan.name}» is held already, with the same values.")
        elif table.kind != "tops":
            _ask_replace(table, rows, plan, made)


def _word(table: WellTable) -> str:
    return WORDS.get(table.kind, "record of tops")


def _drop(table: WellTable, rows: list[WellRow], made: "Prepared", message: str) -> None:
    table.rows = [row for row in table.rows if row not in rows]
    made.findings.note(
        "held_already", message, id=f"held:{table.kind}:{rows[0].line}", sheet=table.sheet, remedy="Nothing to do."
    )


def _ask_replace(table: WellTable, rows: list[WellRow], plan: WellPlan, made: "Prepared") -> None:
    id_ = f"replace:{table.kind}:{plan.name}"
    answer = made.findings.ask(
        id_, "records_held", f"«{plan.name}» has a {_word(table)} already, with other values.", [REPLACE, KEEP], sheet=table.sheet,
        value=plan.name, remedy=f"Answer «{id_}» with «{REPLACE}» to take the file's, or «{KEEP}» to leave it as it is.",
    )  # fmt: skip
    if answer == REPLACE:
        made.records.replaced.add((table.kind, rows[0].well))
    elif answer == KEEP:
        _drop(table, rows, made, f"The {_word(table)} of «{plan.name}» stays as it was.")


__all__ = ["MODELS", "RecordReader", "WellRecords", "settle"]
