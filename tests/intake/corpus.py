"""Made-up laboratory workbooks, layouts times oddities, each with the truth of every cell. Seeded; an invented basin.

A sheet is made of columns of cells that know what they mean; oddities change cells, headers or rows, layouts place them.
"""

import csv
import io
import random
from dataclasses import dataclass, field
from itertools import product

import openpyxl
from openpyxl.utils import get_column_letter

FOOT = 0.3048


@dataclass
class Cell:
    """``shown`` as written; ``value`` canonical and ``qualifier``, or value None for a cell that gives no result."""

    shown: object
    value: float | None = None
    qualifier: str = ""
    number_format: str = ""


@dataclass
class Column:
    """A measured column: field code, header, unit as written, factor into the canonical unit."""

    code: str
    head: str
    unit: str
    cells: list[Cell]
    factor: float = 1.0
    decimals: int = 2


@dataclass
class Row:
    label: str
    top: float
    well: str = "Quill 1"
    shown_depth: object = None
    base: float | None = None
    role: str = "sample"


@dataclass
class Book:
    """A sheet to be written: identity of rows, measured columns, header words, and what is expected to be asked."""

    rows: list[Row]
    columns: list[Column]
    words: dict[str, str]
    depth_unit: str = "m"
    show_depth_unit: bool = True
    show_well: bool = False
    answers: dict[str, str] = field(default_factory=dict)
    asked: set[str] = field(default_factory=set)  # codes of columns that must be asked about; "*" for every value
    bad: set[int] = field(default_factory=set)  # ids of cells that must be named in an error
    comma: bool = False
    title: list[list[object]] = field(default_factory=list)
    notes: list[list[object]] = field(default_factory=list)
    blank_rows: set[int] = field(default_factory=set)
    repeat_header: bool = False
    gap_column: bool = False
    summary: bool = False


@dataclass
class Made:
    """A file and its truth: (sheet, address) -> (code, value, qualifier, label, depth in metres)."""

    name: str
    content: bytes
    truth: dict[tuple[str, str], tuple[str, float, str, str, float]]
    book: Book
    bad: set[tuple[str, str]]
    column_of: dict[tuple[str, str], str]


SUITES = {
    "pyrolysis": [("TOC", "TOC", "wt%", 0.2, 9, 2), ("S1", "S1", "mg/g", 0.02, 3, 2), ("S2", "S2", "mg HC/g rock", 0.3, 40, 2),
                  ("S3", "S3", "mg CO2/g rock", 0.1, 3, 2), ("TMAX", "Tmax", "°C", 410, 465, 0)],
    "carbon": [("TOC", "Total organic carbon", "wt.%", 1.6, 9, 3), ("TC", "Total carbon", "wt.%", 2, 12, 2), ("TS", "Total sulfur", "wt.%", 1.6, 4, 2)],
    "elements": [("AL", "Al", "%", 1, 9, 2), ("CA", "Ca", "%", 0.1, 20, 2), ("MO", "Mo", "ppm", 1, 90, 1), ("V", "V", "ppm", 20, 900, 0),
                 ("NI", "Ni", "ppm", 10, 200, 0)],
    "oxides": [("SIO2", "SiO2", "wt%", 20, 70, 2), ("AL2O3", "Al2O3", "wt%", 2, 18, 2), ("CAO", "CaO", "wt%", 1, 30, 2), ("LOI", "LOI", "wt%", 2, 30, 2)],
    "minerals": [("QUARTZ", "Quartz", "wt%", 10, 60, 1), ("ILLITE", "Illite", "wt%", 2, 30, 1), ("CALCITE", "Calcite", "wt%", 2, 40, 1),
                 ("PYRITE", "Pyrite", "wt%", 1, 9, 1)],
    "core": [("PHI", "Porosity", "%", 2, 28, 1), ("KAIR", "Kair", "mD", 0.01, 900, 2), ("RHOG", "Grain density", "g/cc", 2.6, 2.8, 2),
             ("SW", "Water saturation", "%", 10, 95, 1)],
    "isotopes": [("D13C_ORG", "δ13Corg", "‰", -32, -20, 1), ("D18O_CARB", "δ18Ocarb", "‰", -9, -1, 1)],
    "reflectance": [("RO", "Ro", "%", 0.4, 1.9, 2), ("RO_SD", "Ro SD", "%", 0.02, 0.2, 2), ("RO_N", "No. of readings", "", 10, 60, 0)],
    "ratios": [("PR_PH", "Pr/Ph", "", 0.5, 3, 2), ("PR_NC17", "Pr/nC17", "", 0.2, 2, 2), ("CPI", "CPI", "", 0.9, 1.5, 2)],
}  # fmt: skip
PPM = {"AL": 10_000.0, "CA": 10_000.0}
ENGLISH = {"sample": "Sample ID", "depth": "Depth", "base": "Base depth", "well": "Well"}
LANGUAGES = {
    "de": {"sample": "Probe", "depth": "Teufe", "base": "Teufe bis", "well": "Bohrung", "TOC": "TOC", "TC": "Gesamtkohlenstoff", "TS": "Gesamtschwefel"},
    "fr": {"sample": "Échantillon", "depth": "Profondeur", "base": "Profondeur base", "well": "Puits", "TOC": "COT", "TC": "Carbone total", "TS": "Soufre total"},
    "es": {"sample": "Muestra", "depth": "Profundidad", "base": "Profundidad base", "well": "Pozo", "TOC": "Carbono orgánico total", "TC": "Carbono total", "TS": "Azufre total"},
    "no": {"sample": "Prøve", "depth": "Dyp", "base": "Dyp bunn", "well": "Brønn", "TOC": "Totalt organisk karbon", "TC": "Totalt karbon", "TS": "Totalt svovel"},
    "nl": {"sample": "Monster", "depth": "Diepte", "base": "Diepte tot", "well": "Boring", "TOC": "Organische koolstof", "TC": "Totaal koolstof", "TS": "Zwavel"},
    "pt": {"sample": "Amostra", "depth": "Profundidade", "base": "Profundidade base", "well": "Poço", "TOC": "Carbono orgânico", "TC": "Carbono total", "TS": "Enxofre"},
}  # fmt: skip


def start(suite, rng, count=9):
    """A clean book of one suite."""
    rows = [Row(f"KG-{101 + at}", round(1500 + 12.5 * at + rng.randint(0, 9) / 10, 1)) for at in range(count)]
    columns = []
    for code, head, unit, low, high, decimals in SUITES[suite]:
        factor = PPM.get(code, 1.0)
        cells = []
        for _ in rows:
            number = round(rng.uniform(low, high), decimals)
            number = int(number) if decimals == 0 else number
            cells.append(Cell(number, number * factor))
        columns.append(Column(code, head, unit, cells, factor, decimals))
    return Book(rows, columns, dict(ENGLISH))


# Oddities: each changes a clean book and its truth


def clean(book, rng):
    """Nothing odd."""


def qualified(book, rng):
    for column in book.columns[:2]:
        for at, mark in zip(rng.sample(range(len(book.rows)), 3), ("<", ">", "~"), strict=True):
            cell = column.cells[at]
            column.cells[at] = Cell(f"{mark}{cell.shown}", cell.value, mark)


def blanks(book, rng):
    for column in book.columns:
        for at, shown in zip(rng.sample(range(len(book.rows)), 3), ("", "-", "n.a."), strict=True):
            column.cells[at] = Cell(shown)


def numbers_as_text(book, rng):
    for column in book.columns:
        column.cells = [Cell(f"\u00a0{cell.shown} ".replace("-", "\u2212"), cell.value) for cell in column.cells]


def footnotes(book, rng):
    column = book.columns[0]
    for at in rng.sample(range(len(book.rows)), 2):
        column.cells[at] = Cell(f"{column.cells[at].shown}*", column.cells[at].value)
    book.notes.append(["* sample contaminated by drilling additives, handle with caution"])


def decimal_commas(book, rng):
    book.comma = True


def depth_ranges_in_feet(book, rng):
    book.depth_unit = "ft"
    for row in book.rows:
        top = round(row.top * 6.6)
        row.top, row.base, row.shown_depth = top * FOOT, (top + 10) * FOOT, f"{top}-{top + 10}"


def feet_with_marks(book, rng):
    book.depth_unit, book.show_depth_unit = "ft", False
    for row in book.rows:
        top = round(row.top * 6.6)
        row.top, row.shown_depth = top * FOOT, f"{top:,}'"


def blank_lines(book, rng):
    book.blank_rows = {2, 5}
    book.gap_column = True


def repeated_header(book, rng):
    book.repeat_header = True


def control_rows(book, rng):
    """A blank, a reference material and a duplicate among the samples, and a mean below them."""
    for place, label, role in (
        (3, "Blank", "blank"),
        (6, "Standard REF-9", "reference"),
        (len(book.rows), "KG-101 dup", "duplicate"),
    ):
        same = book.rows[0]
        top = same.top if role == "duplicate" else None
        book.rows.insert(place, Row(label, top, shown_depth="" if top is None else same.shown_depth, role=role))
        for column in book.columns:
            copied = column.cells[0]
            column.cells.insert(place, Cell(copied.shown, copied.value))
    book.summary = True


def units_unstated(book, rng):
    """The depth unit stands nowhere: asked."""
    book.show_depth_unit = False
    book.answers["depth"] = "m"
    book.asked.add("*")


def a_bad_cell(book, rng):
    column = book.columns[-1]
    at = rng.randrange(len(book.rows))
    column.cells[at] = Cell(rng.choice(["#DIV/0!", "see note", "1.2.3"]))
    book.bad.add(id(column.cells[at]))


def several_wells(book, rng):
    book.show_well = True
    for at, row in enumerate(book.rows):
        row.well = f"Quill {1 + at // 4}"


def title_and_notes(book, rng):
    book.title = [["Basalt House Laboratories"], ["Report no: BH-", 4711], ["Well:", "Quill 1"], []]
    book.notes = [[], ["Note: all values are on dry rock, as received by the laboratory"], ["Signed: A. Person"]]


def in_parts_per_million(book, rng):
    """The first column in another unit than usual."""
    column = book.columns[0]
    factors = {"wt%": ("ppm", 10_000), "wt.%": ("mg/g", 10), "%": ("fraction", 0.01)}
    if column.unit not in factors or column.code in PPM:
        return
    column.unit, times = factors[column.unit]
    for cell in column.cells:
        cell.shown = float(f"{cell.shown * times:.10g}")
    if column.code == "RO":
        column.unit, times = "%", 1
        for cell in column.cells:
            cell.shown = float(f"{cell.shown * 100:.10g}")


def shown_as_percent(book, rng):
    """Cells that hold a fraction and show percent."""
    column = book.columns[0]
    if column.unit not in {"wt%", "wt.%", "%"} or column.code in PPM:
        return
    for cell in column.cells:
        cell.shown, cell.number_format = float(f"{cell.shown / 100:.10g}"), "0.00%"
    column.unit = "%"


def unit_in_every_cell(book, rng):
    column = book.columns[0]
    if column.unit in {"wt%", "wt.%", "%"}:
        column.cells = [Cell(f"{cell.shown} {column.unit}", cell.value) for cell in column.cells]
        column.unit = ""


def thousands_marks(book, rng):
    """Large numbers with marks between thousands, as text."""
    column = book.columns[-1]
    for cell in column.cells:
        number = 1000 + rng.randint(0, 999) + 0.5
        if column.code in {"V", "NI", "KAIR"}:
            cell.shown, cell.value = f"{number:,}", number


def nulls(book, rng):
    """Codes for "no value" of several programs."""
    for column in book.columns:
        for at, shown in zip(rng.sample(range(len(book.rows)), 3), (-999.25, "-9999", "n.m."), strict=True):
            column.cells[at] = Cell(shown)


def uncertainties(book, rng):
    column = book.columns[0]
    for at in rng.sample(range(len(book.rows)), 3):
        column.cells[at] = Cell(f"{column.cells[at].shown} ± 0.1", column.cells[at].value)
    book.title = [["Uncertainties are two standard deviations"]]


ODDITIES = [
    thousands_marks, nulls, uncertainties,
    clean, qualified, blanks, numbers_as_text, footnotes, decimal_commas, depth_ranges_in_feet, feet_with_marks, blank_lines,
    repeated_header, control_rows, units_unstated, a_bad_cell, several_wells, title_and_notes, in_parts_per_million,
    shown_as_percent, unit_in_every_cell,
]  # fmt: skip

# Layouts: a grid of cells and where the truth stands in it


def _head(text, unit):
    return f"{text} ({unit})" if unit else text


def _identity(book):
    """[(header, unit, cell of row)] of the columns that say which sample a row is of."""
    unit = book.depth_unit if book.show_depth_unit else ""
    depth = [("" if row.top is None else row.top) if row.shown_depth is None else row.shown_depth for row in book.rows]
    columns = [(book.words["sample"], "", [row.label for row in book.rows]), (book.words["depth"], unit, depth)]
    if book.show_well:
        columns.insert(0, (book.words["well"], "", [row.well for row in book.rows]))
    return columns


def _columns(book):
    """[(header, unit, cells)] of all columns, a gap among them where wanted."""
    measured = [(column.head, column.unit, column.cells) for column in book.columns]
    gap = [("", "", [""] * len(book.rows))] if book.gap_column else []
    return [*_identity(book), *gap, *measured]


def upright(book, head_rows):
    """Grid of a table with a sample a row, below the title; ``head_rows`` gives the rows of its header."""
    columns = _columns(book)
    heads = head_rows(columns, book)
    grid = [list(line) for line in book.title] + [list(line) for line in heads]
    for at in range(len(book.rows)):
        if at in book.blank_rows:
            grid.append([])
        if book.repeat_header and at == 5:
            grid += [[], *[list(line) for line in heads]]
        grid.append([cells[at] for _, _, cells in columns])
    if book.summary:
        grid.append(["Mean", *[""] * (len(_identity(book)) - 1), *[1.0] * (len(columns) - len(_identity(book)))])
    return grid + [list(line) for line in book.notes]


def one_row(columns, book):
    return [[_head(head, unit) for head, unit, _ in columns]]


def units_row(columns, book):
    return [[head for head, _, _ in columns], [unit for _, unit, _ in columns]]


def brackets(columns, book):
    return [[f"{head} [{unit}]" if unit else head for head, unit, _ in columns]]


def bare_units(columns, book):
    return [[f"{head}, {unit}" if unit else head for head, unit, _ in columns]]


def grouped(columns, book):
    first = len(columns) - len(book.columns)
    return [[*[""] * first, "Analysis results", *[""] * (len(book.columns) - 1)], *one_row(columns, book)]


def shouting(columns, book):
    return [[_head(head.upper() if len(head) > 3 else head, unit) for head, unit, _ in columns]]


def sample_a_column(book):
    columns = _columns(book)
    return [list(line) for line in book.title] + [
        [_head(head, unit), *[cells[at] for at in range(len(book.rows))]] for head, unit, cells in columns if head
    ] + [list(line) for line in book.notes]  # fmt: skip


def sample_a_column_units_beside(book):
    columns = _columns(book)
    return [list(line) for line in book.title] + [
        [head, unit, *[cells[at] for at in range(len(book.rows))]] for head, unit, cells in columns if head
    ] + [list(line) for line in book.notes]  # fmt: skip


def _half(book, first):
    """The identity of the rows with the first or the second half of the measured columns."""
    middle = len(book.columns) // 2
    chosen = book.columns[:middle] if first else book.columns[middle:]
    return [*_identity(book), *((column.head, column.unit, column.cells) for column in chosen)]


def beside(book):
    """Two tables beside each other with a blank column between."""
    left, right = (
        [*one_row(half, book), *[[cells[at] for _, _, cells in half] for at in range(len(book.rows))]]
        for half in (_half(book, True), _half(book, False))
    )
    grid = [list(line) for line in book.title] + [[*one, "", *other] for one, other in zip(left, right, strict=True)]
    return grid + [list(line) for line in book.notes]


def below(book):
    """Two tables, one below the other."""
    grid = [list(line) for line in book.title]
    for half in (_half(book, True), _half(book, False)):
        grid += [*one_row(half, book), *[[cells[at] for _, _, cells in half] for at in range(len(book.rows))], []]
    return grid + [list(line) for line in book.notes]


LAYOUTS = {
    "one row": lambda book: upright(book, one_row), "units row": lambda book: upright(book, units_row),
    "brackets": lambda book: upright(book, brackets), "bare units": lambda book: upright(book, bare_units),
    "grouped": lambda book: upright(book, grouped), "capitals": lambda book: upright(book, shouting),
    "turned": sample_a_column, "turned, units beside": sample_a_column_units_beside,
    "beside": beside, "below": below,
}  # fmt: skip
ONLY_PLAIN = {"blank_lines", "repeated_header", "control_rows"}


def truth_of(book, grid, sheet):
    """Truth, bad cells and column of every address of the grid."""
    place = {
        id(cell): (column, row) for column in book.columns for cell, row in zip(column.cells, book.rows, strict=True)
    }
    truth, bad, column_of = {}, set(), {}
    for down, line in enumerate(grid):
        for across, cell in enumerate(line):
            if not isinstance(cell, Cell):
                continue
            address = f"{get_column_letter(across + 1)}{down + 1}"
            column, row = place[id(cell)]
            column_of[sheet, address] = column.code
            if id(cell) in book.bad:
                bad.add((sheet, address))
            elif cell.value is not None:
                truth[sheet, address] = (column.code, cell.value, cell.qualifier, row.label, row.top)
    return truth, bad, column_of


def written(cell, comma):
    """A cell as the file holds it."""
    shown = cell.shown if isinstance(cell, Cell) else cell
    if comma and isinstance(shown, float):
        return str(shown).replace(".", ",")
    return shown


def as_workbook(book, grid):
    out = openpyxl.Workbook()
    sheet = out.active
    sheet.title = "Results"
    for down, line in enumerate(grid, start=1):
        for across, cell in enumerate(line, start=1):
            value = written(cell, book.comma)
            if value not in {"", None}:
                placed = sheet.cell(down, across, value)
                if isinstance(cell, Cell) and cell.number_format:
                    placed.number_format = cell.number_format
    stream = io.BytesIO()
    out.save(stream)
    return stream.getvalue()


def as_text(book, grid):
    stream = io.StringIO()
    width = max(len(line) for line in grid)
    writer = csv.writer(stream, delimiter=";" if book.comma else ",")
    for line in grid:
        writer.writerow([*(written(cell, book.comma) for cell in line), *[""] * (width - len(line))])
    return stream.getvalue().encode()


def make(layout, oddity, suite, seed, kind):
    """One file with its truth."""
    rng = random.Random(f"{layout} {oddity.__name__} {suite} {seed}")
    book = start(suite, rng)
    language = rng.choice([None, *LANGUAGES]) if suite == "carbon" else None
    if language:
        words = LANGUAGES[language]
        book.words |= {key: words[key] for key in book.words}
        for column in book.columns:
            column.head = words.get(column.code, column.head)
    oddity(book, rng)
    grid = LAYOUTS[layout](book)
    sheet = "Results" if kind == "xlsx" else ""
    truth, bad, column_of = truth_of(book, grid, sheet)
    content = as_workbook(book, grid) if kind == "xlsx" else as_text(book, grid)
    name = f"{layout}-{oddity.__name__}-{suite}.{kind}"
    return Made(name, content, truth, book, bad, column_of)


def corpus(count=1):
    """Every layout with every oddity that it can have, the suites taken in turn."""
    suites = list(SUITES)
    at = 0
    for seed, (layout, oddity) in product(range(count), product(LAYOUTS, ODDITIES)):
        if layout in {"turned", "turned, units beside", "beside", "below"} and oddity.__name__ in ONLY_PLAIN:
            continue
        kind = "csv" if at % 3 == 2 and oddity is not shown_as_percent else "xlsx"
        for suite in {suites[at % len(suites)], "pyrolysis" if at % 2 else "carbon"}:
            yield make(layout, oddity, suite, seed, kind)
        at += 1
