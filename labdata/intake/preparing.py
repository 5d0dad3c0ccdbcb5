"""From bytes to a Prepared file: read, find the tables, map, read values, match wells, settle the report's version."""

import time
from collections.abc import Callable
from dataclasses import dataclass, field

from labdata.intake import values, workbook
from labdata.intake.columns import Column, Mapping, map_columns
from labdata.intake.corrections import Corrections, Said, add_heads
from labdata.intake.errors import UnreadableFile
from labdata.intake.fields import FieldType, with_own
from labdata.intake.findings import Findings
from labdata.intake.importers.taking import RecordReader, settle
from labdata.intake.layouts import Memory
from labdata.intake.matching import SampleDirectory, WellDirectory, WellMatcher, fullest_first
from labdata.intake.plaintext import CORE_TEXT, LAS, TOPS_TEXT
from labdata.intake.prepared import Prepared, PreparedTable
from labdata.intake.reading import Cells, Teller, decimal_comma, read_column
from labdata.intake.rows import Row, RowReader
from labdata.intake.tables import Layout, Table, find_tables, tables_under
from labdata.intake.titles import Facts, read_title
from labdata.intake.turned import find_turned_tables
from labdata.intake.unitchoice import choose_units
from labdata.intake.versions import settle_version
from labdata.intake.wellhead import well_details
from labdata.intake.workbook import Sheet, address
from labdata.models import Analyte, Project

Tick = Callable[[str], None]
OWN_LAYOUTS = (LAS, CORE_TEXT, TOPS_TEXT)
CONFIRM, STORE_IT = "confirm", "store it"


@dataclass
class Request:
    """What came with the file: names, permission to make wells, answers given and by whom.

    ``look``: nothing is stored before a person has looked. ``book``: the file as read already.
    """

    project: Project
    name: str
    content: bytes
    sha256: str
    lab: str = ""
    well: str = ""
    create_wells: bool = False
    answers: dict[str, str] = field(default_factory=dict)
    said_by: dict[str, str] = field(default_factory=dict)
    look: bool = False
    book: workbook.Workbook | None = None


def prepare_file(request: Request, tick: Tick) -> Prepared:
    """Read and match one file outside any transaction. Whatever is wrong with it ends up in the findings."""
    with with_own(own_fields(request.project)):
        return _prepare(request, tick)


def own_fields(project: Project) -> tuple[FieldType, ...]:
    """The project's own analytes as fields, found in headers by their code and their name."""
    own = Analyte.objects.filter(project=project.pk).select_related("method").order_by("code") if project.pk else []
    return tuple(FieldType(a.code, a.method.code, a.unit, a.low, a.high, (a.code, a.name)) for a in own)


def _prepare(request: Request, tick: Tick) -> Prepared:
    started = time.perf_counter()
    made = Prepared(request.project, request.name, request.sha256, Findings(dict(request.answers)))
    try:
        book = request.book or workbook.read(request.name, request.content)
    except UnreadableFile as trouble:
        made.findings.error(trouble.code, trouble.message, remedy=trouble.remedy, value=request.name)
    else:
        _FileReader(request, made, tick, WellDirectory(request.project)).take(book)
    if request.look and not made.findings.has("error"):
        _look_first(made.findings)
    made.seconds = time.perf_counter() - started
    return made


def _look_first(findings: Findings) -> None:
    findings.ask(
        CONFIRM,
        "confirm",
        "You asked to look before anything is stored.",
        [STORE_IT],
        remedy=f"Look at the tables on the mapping desk, then answer «{CONFIRM}» with «{STORE_IT}».",
    )


@dataclass
class _FileReader:
    """Takes one workbook in: its sheets, their tables, the wells they name."""

    request: Request
    made: Prepared
    tick: Tick
    directory: WellDirectory
    whole: Facts = field(default_factory=Facts)
    named: list[tuple[Row, str, str]] = field(default_factory=list)
    sheets_with_tables: int = 0
    said: Corrections = field(default_factory=Corrections)
    memory: Memory = field(default_factory=Memory)

    def __post_init__(self) -> None:
        self.records = RecordReader(self.request, self.made, self.directory, self._ask_well)

    @property
    def findings(self) -> Findings:
        return self.made.findings

    def take(self, book: workbook.Workbook) -> None:
        """Fill ``made`` from the workbook."""
        self.said = Corrections.of(self.request.answers, self.request.said_by, self.findings)
        if book.kind in OWN_LAYOUTS:
            self._take_text(book.kind)
            return
        layouts = [(sheet, self._layout(sheet)) for sheet in book.sheets]
        self.whole = read_title([line for _, layout in layouts for line in layout.title])
        self.memory = Memory.of(self.request.project, self.request.lab or self.whole.laboratory)
        layouts = [(sheet, self._remembered(sheet, layout)) for sheet, layout in layouts]
        for name in book.hidden:
            message = f"Sheet «{name}» is hidden and was not read."
            self.findings.note("hidden_sheet", message, sheet=name, remedy="Show it if it holds results.")
        self._sheets_of_records(layouts)
        if not any(layout.tables for _, layout in layouts) and not self.made.records:
            _no_table(self.request.name, layouts, self.findings)
            return
        self.sheets_with_tables = sum(1 for _, layout in layouts if layout.tables)
        self.whole = read_title([line for _, layout in layouts for line in layout.title])
        for sheet, layout in layouts:
            self._sheet(sheet, layout)
        self._finish()

    def _take_text(self, kind: str) -> None:
        """A text with a layout of its own, read whole by its importer."""
        try:
            self.made.tables = self.records.take_file(kind)
        except UnreadableFile as trouble:
            self.findings.error(trouble.code, trouble.message, remedy=trouble.remedy, value=self.request.name)
            return
        self.whole = self.records.facts
        self.named = [(row, "", f"A{row.line}") for table in self.made.tables for row in table.rows]
        self._finish()

    def _sheets_of_records(self, layouts: list[tuple[Sheet, Layout]]) -> None:
        """Sheets without results may hold surveys, tops or other records of wells."""
        for sheet, layout in layouts:
            named = sheet.name in self.said.headers  # a person says where its results stand, or leaves it out
            if not layout.tables and not named and self.records.take_sheet(sheet):
                layout.title, layout.stray = [], []

    def _finish(self) -> None:
        """What follows once everything is read: wells, the report and its version."""
        self.tick("matching wells and samples")
        matcher = WellMatcher(self.directory, self.findings, self.request.create_wells)
        self.made.wells = matcher.match([*self.named, *self.records.name_rows()])
        well_details(self.made)
        settle(self.made, self.directory)
        self.made.laboratory = self.request.lab or self.whole.laboratory
        self.made.reported_on = self.whole.reported_on
        self.said.report_unused(self.findings)
        settle_version(self.request.name, self.whole, self.made)

    def _layout(self, sheet: Sheet) -> Layout:
        """The sheet's tables: below the header rows that a person has named, else as found."""
        rows = self.said.headers.get(sheet.name)
        if rows is not None:
            return tables_under(sheet, rows)
        layout = find_tables(sheet)
        return layout if layout.tables else find_turned_tables(sheet) or layout

    def _remembered(self, sheet: Sheet, layout: Layout) -> Layout:
        """The sheet's tables below header rows as they were named for this layout before, unless they are named now."""
        rows = [] if sheet.name in self.said.headers else self.memory.headers(sheet)
        return tables_under(sheet, rows) if rows else layout

    def _sheet(self, sheet: Sheet, layout: Layout) -> None:
        facts = read_title(layout.title)
        facts.depth_unit = facts.depth_unit or self.whole.depth_unit
        facts.nd = facts.nd or self.whole.nd
        for table in layout.tables:
            self.tick(f"reading {sheet.name or self.request.name}")
            own = self.said.of_table(table)
            said = self.memory.merge(table, own, self.findings)
            add_heads(table, said)
            prepared, mapping = _take_table(table, facts, self.findings, said)
            prepared.header_said = sheet.name in self.said.headers or self.memory.names_header(table)
            prepared.said, prepared.corrected = said, bool(own) or sheet.name in self.said.headers
            self.made.tables.append(prepared)
            self._name_wells(sheet, facts, mapping, prepared)
        if layout.stray and layout.tables:
            _report_stray(sheet, layout.stray, self.findings)
        if not layout.tables and layout.title:
            message = f"Sheet «{sheet.name}» holds no table of results and was not read."
            self.findings.note("no_table_in_sheet", message, sheet=sheet.name, remedy="Nothing to do if it holds none.")

    def _name_wells(self, sheet: Sheet, facts: Facts, mapping: Mapping, prepared: PreparedTable) -> None:
        """Note the well of each row of rock: of its own cell, else one name for the whole table."""
        column = mapping.one("WELL") or mapping.one("UWI")
        rock = [row for row in prepared.rows if row.kept and row.role in {"sample", "duplicate"}]
        if column is None:
            well = self._one_well(sheet, facts)
            for row in rock:
                row.well = well
            self.named += [(row, sheet.name, "") for row in rock[:1]]
            return
        if self.request.well:
            self._option_unused(sheet, column)
        for row in rock:
            cell = sheet.address(row.line - 1, column.index)
            if row.well == ("", ""):
                message = f"{sheet.row_name(row.line)} names no well."
                remedy = f"Fill {column.place.lower()}."
                self.findings.error("row_without_well", message, sheet=sheet.name, cell=cell, remedy=remedy)
            else:
                self.named.append((row, sheet.name, cell))

    def _option_unused(self, sheet: Sheet, column: Column) -> None:
        self.findings.warning(
            "well_option_unused",
            f"The file names its wells in {column.place.lower()}; «{self.request.well}» was not used.",
            sheet=sheet.name,
            cell=column.letter,
            value=self.request.well,
            remedy="Leave the well away for this file.",
        )

    def _one_well(self, sheet: Sheet, facts: Facts) -> tuple[str, str]:
        """(name, uwi) of a table without a well column: as asked for, as the title or sheet says, else asked."""
        if self.request.well:
            return self.request.well, ""
        for said in (facts, self.whole):
            if said.well or said.uwi:
                return said.well, said.uwi
        if sheet.name and len(self.directory.find(sheet.name, "")) == 1:
            message = f"The well is taken from the sheet's name «{sheet.name}»."
            self.findings.note("well_from_sheet_name", message, sheet=sheet.name, remedy="Nothing to do if it is.")
            return sheet.name, ""
        return self._ask_well(sheet), ""

    def _ask_well(self, sheet: Sheet | None = None) -> str:
        """The well of a sheet that names none; sheet by sheet where several do not, since each may be of its own well."""
        several = sheet is not None and self.sheets_with_tables > 1 and "well" not in self.findings.answers
        sheet = sheet or Sheet("", [])
        id_ = f"well:{sheet.name}" if several else "well"
        if any(finding.id == id_ for finding in self.findings.found):
            return ""
        known = sorted({well.name for well in self.directory.wells.values()})
        message = f"Sheet «{sheet.name}» names no well." if several else f"«{self.request.name}» names no well."
        options = [*known, sheet.name] if several and sheet.name not in known else known
        remedy = f"Name the well ({'' if several else '--well, or '}the answer «{id_}»)."
        answer = self.findings.ask(id_, "well_missing", message, options, free=True, sheet=sheet.name, remedy=remedy)
        return answer or ""


def _report_stray(sheet: Sheet, rows: list[int], findings: Findings) -> None:
    """Rows of numbers that belong to no table are named, so that none is lost unseen."""
    lines = ", ".join(str(row + 1) for row in rows[:10]) + (" …" if len(rows) > 10 else "")
    findings.warning(
        "rows_outside_tables",
        f"Rows {lines} hold numbers but belong to no table, and were not read.",
        sheet=sheet.name,
        cell=address(rows[0], 0),
        remedy="If they are results, put a header above them.",
    )


def _no_table(name: str, layouts: list[tuple[Sheet, Layout]], findings: Findings) -> None:
    seen = next((line for _, layout in layouts for line in layout.title), [])
    shown = " | ".join(seen)[:200]
    findings.error(
        "no_table",
        f"No table of results was found in «{name}»; its first line reads «{shown}».",
        sheet=layouts[0][0].name,
        cell="A1",
        value=shown,
        remedy="A table needs a header row that names a sample or depth and at least one analyte, "
        "such as Depth (m), TOC (wt%), S2 (mg/g).",
    )


def _take_table(
    table: Table, facts: Facts, findings: Findings, said: dict[int, Said] | None = None
) -> tuple[PreparedTable, Mapping]:
    """One table read whole: identity of rows, units, values."""
    mapping = map_columns(table, findings, said)
    comma = decimal_comma(table, mapping, findings)
    raw = {column.index: table.cells(column.index) for column in mapping.results}
    read = {
        column.index: read_column(table.sheet, column, table.rows, raw[column.index], comma=comma)
        for column in mapping.results
    }
    _place_columns(table, mapping, findings)
    _no_rows(table, findings)
    rows = RowReader(table, mapping, facts, findings, comma, _filled(table, read)).read()
    kept = [row.kept for row in rows]
    for cells in read.values():
        cells.keep(kept)
    choose_units(table, mapping, read, findings)
    settled = {
        column.index: Teller(table, column, findings, facts.nd).settle(read[column.index], raw[column.index], kept)
        for column in mapping.results
    }
    made = PreparedTable(table.sheet.name, table.cell_range, mapping.columns, mapping.unmapped, rows, settled, table)
    return made, mapping


def _filled(table: Table, read: dict[int, Cells]) -> list[bool]:
    """Which data rows hold anything in a result column."""
    filled = [False] * len(table.rows)
    for cells in read.values():
        for at, reading in enumerate(cells.readings):
            if reading.state != values.BLANK:
                filled[at] = True
    return filled


def _no_rows(table: Table, findings: Findings) -> None:
    if not table.rows:
        findings.error(
            "no_rows",
            f"The table at {table.cell_range} has a header and no rows.",
            sheet=table.sheet.name,
            cell=table.sheet.address(table.top, table.heads[0].index),
            remedy="Send the file with its values.",
        )


def _place_columns(table: Table, mapping: Mapping, findings: Findings) -> None:
    """A table needs a column that says which sample a row is of."""
    if not any(mapping.one(code) for code in ("SAMPLE", "TOP", "BASE")):
        headers = ", ".join(f"«{head.text}»" for head in table.heads[:8])
        findings.error(
            "no_sample_column",
            f"The table at {table.cell_range} has neither a sample nor a depth column; its headers are {headers}.",
            sheet=table.sheet.name,
            cell=table.sheet.address(table.top, table.heads[0].index),
            value=headers,
            remedy="Head one column Sample or Depth.",
        )


def count_samples(made: Prepared) -> dict[str, int]:
    """How many of the file's samples are new and how many are held already; for a look before storing."""
    numbers = {id(plan): plan.pk or -at for at, plan in enumerate(made.wells.values(), start=1)}
    directory = SampleDirectory({plan.pk for plan in made.wells.values() if plan.pk})
    rock = [
        (numbers[id(made.wells[row.well])], row)
        for table in made.tables
        for row in table.rows
        if row.kept and row.well in made.wells and row.role in {"sample", "duplicate"}
    ]
    placed = {id(held): held for held in (directory.place(well, row) for well, row in fullest_first(rock))}
    new = sum(1 for held in placed.values() if held.pk is None)
    return {"samples_new": new, "samples_matched": len(placed) - new}
