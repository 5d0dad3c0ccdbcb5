"""Tables whose samples run along the columns: read as if rows and columns were exchanged, cells named as in the file."""

from itertools import zip_longest

from labdata.intake import units
from labdata.intake.fields import field_types
from labdata.intake.headers import NAME, Guess, recognise
from labdata.intake.tables import Layout, find_tables, looks_numeric
from labdata.intake.workbook import Cell, Sheet, cell_text

MAX_ROWS = 400  # fields run down the rows of such a table, so there are not many
LABEL_COLUMNS = 4  # the names of the fields stand in one of the first columns
_PLACES = {"SAMPLE", "TOP", "LAB_NO"}


def find_turned_tables(sheet: Sheet) -> Layout | None:
    """The tables of a sheet in which each sample has a column; None when there is none."""
    if not 2 <= len(sheet.rows) <= MAX_ROWS:
        return None
    best = max((_labels(sheet, column) for column in range(LABEL_COLUMNS)), key=_worth, default={})
    if not _worth(best):
        return None
    layout = Layout([], [])
    blocks = _blocks(sheet, best)
    for first, last in blocks:
        layout.tables += find_tables(turn(sheet, first, last)).tables
    if not any(table.rows for table in layout.tables):
        return None
    for row in range(len(sheet.rows)):
        if not any(first <= row <= last for first, last in blocks):
            _outside(sheet, row, layout)
    return layout


def turn(sheet: Sheet, first: int, last: int) -> Sheet:
    """The sheet with rows and columns exchanged and only rows ``first`` to ``last`` of the file in it."""
    height, width = len(sheet.rows), max(len(row) for row in sheet.rows)
    kept: list[list[Cell]] = [row if first <= at <= last else [] for at, row in enumerate(sheet.rows)]
    columns = [list(column) for column in zip_longest(*kept, [""] * width, fillvalue="")]
    return Sheet(
        sheet.name,
        [column[:height] for column in columns],
        formats=sheet.row_formats,
        percent={(column, row) for row, column in sheet.percent if first <= row <= last},
        faults={(column, row): fault for (row, column), fault in sheet.faults.items() if first <= row <= last},
        comma_hint=sheet.comma_hint,
        turned=True,
    )


def _labels(sheet: Sheet, column: int) -> dict[int, Guess]:
    """Row -> what its cell in this column means as a header, units in the next column taken along."""
    found = {}
    for at, row in enumerate(sheet.rows):
        text = cell_text(row[column]) if column < len(row) else ""
        guess = recognise(text) if text and not looks_numeric(text) else None
        if guess is None and column + 1 < len(row) and units.parse(cell_text(row[column + 1])):
            guess = recognise(f"{text} ({cell_text(row[column + 1])})") if text else None
        if guess is not None and any(cell_text(cell) for cell in row[column + 1 :]):
            found[at] = guess
    return found


def _worth(labels: dict[int, Guess]) -> float:
    """How surely these are the fields of a table: 0 without two fields, one of them measured and one that places the sample."""
    fields = {guess.field: guess.confidence for guess in labels.values() if guess.field != NAME}
    if len(fields) < 2 or not any(field_types()[code].is_analyte for code in fields):
        return 0.0
    places = bool(_PLACES & set(fields)) or any(guess.field == NAME for guess in labels.values())
    return sum(fields.values()) if places else 0.0


def _blocks(sheet: Sheet, labels: dict[int, Guess]) -> list[tuple[int, int]]:
    """(first, last) rows of each table: cut at a blank row where the rows below place samples of their own."""
    rows = sorted(labels)
    parts: list[list[int]] = []
    for row in rows:
        blank = parts and any(_is_blank(sheet.rows[at]) for at in range(parts[-1][-1] + 1, row))
        if not parts or (blank and _places_samples(labels, row)):
            parts.append([row])
        else:
            parts[-1].append(row)
    return [(part[0], part[-1]) for part in parts]


def _places_samples(labels: dict[int, Guess], row: int) -> bool:
    return labels[row].field in _PLACES | {NAME, "WELL"}


def _is_blank(row: list[Cell]) -> bool:
    return not any(cell_text(cell) for cell in row)


def _outside(sheet: Sheet, row: int, layout: Layout) -> None:
    """A line of the title or the notes, or numbers that belong to no table."""
    line = [text for cell in sheet.rows[row] if (text := cell_text(cell))]
    if line and len(layout.title) < 200:
        layout.title.append(line)
    if sum(1 for cell in sheet.rows[row] if cell != "" and looks_numeric(cell)) >= 3:
        layout.stray.append(row)
