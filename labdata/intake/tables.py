"""Finding the tables in a sheet: title block above, header of one to four rows, units row, data, notes below."""

from dataclasses import dataclass, field

from labdata.intake import units
from labdata.intake.fields import element_symbols, field_types
from labdata.intake.headers import NAME, Guess, is_unit_or_formula, recognise
from labdata.intake.workbook import Cell, Sheet, cell_text

MAX_HEADER_ROWS = 4
REPEATED = "repeats the header"
_NOTE_WORDS = (
    "note",
    "remark",
    "legend",
    "abbrev",
    "*",
    "†",
    "n.d",
    "nd ",
    "nd=",
    "nd:",
    "bdl",
    "page ",
    "end of",
    "signed",
    "approved",
    "©",
    "source",
    "key:",
)


@dataclass(frozen=True)
class Head:
    """One column's header: its own lines from top to bottom, group headings included, and the units row's cell."""

    index: int
    text: str
    guess: Guess | None
    unit_cell: str = ""


@dataclass
class Table:
    """One table. ``rows`` are data rows counted from 0; ``skipped`` are rows that hold no sample, each with the reason."""

    sheet: Sheet
    top: int
    height: int
    unit_row: int | None
    heads: list[Head]
    rows: list[int] = field(default_factory=list)
    skipped: list[tuple[int, str]] = field(default_factory=list)
    notes: list[str] = field(default_factory=list)

    @property
    def cell_range(self) -> str:
        """``A5:Q118``, header to last data row."""
        last = self.rows[-1] if self.rows else self.top + self.height - 1
        used = [head.index for head in self.heads]
        return f"{self.sheet.address(self.top, min(used))}:{self.sheet.address(last, max(used))}"

    def cells(self, index: int) -> list[Cell]:
        """The column's cells in the data rows, "" where a row is short."""
        rows = self.sheet.rows
        return [rows[r][index] if index < len(rows[r]) else "" for r in self.rows]


@dataclass
class Layout:
    """What a sheet holds: its tables, the lines outside them (title blocks and notes), and rows of numbers outside."""

    tables: list[Table]
    title: list[list[str]]
    stray: list[int] = field(default_factory=list)


def find_tables(sheet: Sheet) -> Layout:
    """Every table of results in the sheet, in order."""
    _fill_merged(sheet)
    layout = Layout([], [])
    row = 0
    while (header := _next_header(sheet, row)) is not None:
        _outside(sheet, row, header.top, layout)
        row = _take_rows(sheet, header)
        layout.title += [[note] for note in header.notes]
        layout.tables += _side_by_side(header)
    _outside(sheet, row, len(sheet.rows), layout)
    return layout


def tables_under(sheet: Sheet, headers: list[tuple[int, int]]) -> Layout:
    """The tables below header rows that a person has named: (first, last) rows from 0, in order; none beyond the sheet."""
    _fill_merged(sheet)
    layout = Layout([], [])
    row = 0
    for at, (first, last) in enumerate(headers):
        if last >= len(sheet.rows) or not any(_line(sheet, line) for line in range(first, last + 1)):
            continue
        _outside(sheet, row, first, layout)
        table = header_at(sheet, first, last)
        row = _take_rows(sheet, table)
        if at + 1 < len(headers):
            row = min(row, headers[at + 1][0])
            table.rows = [one for one in table.rows if one < row]
        layout.title += [[note] for note in table.notes]
        layout.tables += _side_by_side(table)
    _outside(sheet, row, len(sheet.rows), layout)
    return layout


def header_at(sheet: Sheet, first: int, last: int) -> Table:
    """The table whose header stands in these rows, from 0, with the units row below it and no data rows yet."""
    height = last - first + 1
    return _with_units_row(Table(sheet, first, height, None, _heads(sheet, first, height)))


def _outside(sheet: Sheet, start: int, stop: int, layout: Layout) -> None:
    """Keep the lines outside the tables, at most 200 of a stretch, and which of them hold several numbers."""
    for row in range(start, stop):
        line = _line(sheet, row)
        if line and row - start < 200:
            layout.title.append(line)
        if sum(1 for cell in sheet.rows[row] if cell != "" and looks_numeric(cell)) >= 3:
            layout.stray.append(row)


def _side_by_side(table: Table) -> list[Table]:
    """Tables that stand beside each other: a gap in the header, and right of it samples or depths of their own."""
    groups: list[list[Head]] = []
    for head in table.heads:
        if groups and head.index == groups[-1][-1].index + 1:
            groups[-1].append(head)
        else:
            groups.append([head])
    parts: list[list[Head]] = []
    for group in groups:
        places = any(head.guess and head.guess.field in {"SAMPLE", "TOP"} for head in group)
        if parts and not (places and _score(group)):
            parts[-1] += group
        else:
            parts.append(group)
    if len(parts) == 1 or not _score(parts[0]):
        return [table]
    return [_part(table, heads) for heads in parts]


def _part(table: Table, heads: list[Head]) -> Table:
    """The columns of one of the tables, with the rows that are filled there."""
    part = Table(table.sheet, table.top, table.height, table.unit_row, heads, skipped=table.skipped)
    left, right = heads[0].index, heads[-1].index + 1
    part.rows = [row for row in table.rows if not _blank(table.sheet.rows[row][left:right])]
    return part


def _line(sheet: Sheet, row: int) -> list[str]:
    return [text for cell in sheet.rows[row] if (text := cell_text(cell))]


def _fill_merged(sheet: Sheet) -> None:
    """Text of a merged range stands in each of its cells; a merged number stays where it is."""
    for top, left, bottom, right in sheet.merged:
        if top >= len(sheet.rows) or (bottom - top) > 5000 or (right - left) > 500:
            continue
        value = sheet.rows[top][left] if left < len(sheet.rows[top]) else ""
        if not isinstance(value, str) or not value.strip():
            continue
        for r in range(top, min(bottom + 1, len(sheet.rows))):
            line = sheet.rows[r]
            for c in range(left, min(right + 1, len(line))):
                line[c] = value


def looks_numeric(cell: Cell) -> bool:
    """True for a number, or text that begins like one; the cheap test that tells data rows from header rows."""
    if isinstance(cell, (int, float)):
        return True
    if not isinstance(cell, str):
        return True
    text = cell.strip().lstrip("<>~≤≥-+(").strip()
    return bool(text) and text[0].isdigit() and not any(letter.isalpha() for letter in text[:12])


def may_be_header(row: list[Cell]) -> bool:
    """True when a row may be part of a header: text, and next to no numbers."""
    words = numbers = 0
    for cell in row:
        if cell == "" or cell is None:
            continue
        if looks_numeric(cell):
            numbers += 1
            if numbers > 6:
                return False
        elif cell.strip():
            words += 1
    return words > 0 and numbers * 8 <= words


def _next_header(sheet: Sheet, start: int) -> Table | None:
    """The next header at or below ``start``: the first row that scores, unless one of the three below scores better."""
    for row in range(start, len(sheet.rows)):
        if not may_be_header(sheet.rows[row]):
            continue
        found = _best_header(sheet, row)
        if found is None:
            continue
        score, table = found
        for later in range(row + 1, min(row + MAX_HEADER_ROWS, len(sheet.rows))):
            if not may_be_header(sheet.rows[later]):
                break  # a row of numbers is data, and what follows it is no part of this header
            other = _best_header(sheet, later)
            if other is not None and other[0] >= score - 0.01:
                score, table = other
        return table
    return None


def _best_header(sheet: Sheet, row: int) -> tuple[float, Table] | None:
    """(score, table without rows) for the header height that reads best from ``row`` down, or None."""
    best: tuple[float, Table] | None = None
    for height in range(1, MAX_HEADER_ROWS + 1):
        last = row + height - 1
        if (
            last >= len(sheet.rows)
            or not may_be_header(sheet.rows[last])
            or (height > 1 and _is_units(sheet.rows[last]))
        ):
            break
        heads = _heads(sheet, row, height)
        score = _score(heads)
        if score and (best is None or score > best[0] + 0.3):
            best = score, Table(sheet, row, height, None, heads)
    if best is None:
        return None
    _with_units_row(best[1])
    return best


def _with_units_row(table: Table) -> Table:
    """The table with the row of units below its header, when there is one."""
    sheet, below = table.sheet, table.top + table.height
    if below < len(sheet.rows) and _is_units(sheet.rows[below]):
        table.unit_row = below
        table.heads = [
            Head(head.index, head.text, head.guess, _text_at(sheet, below, head.index)) for head in table.heads
        ]
    return table


def _score(heads: list[Head]) -> float:
    """Sum of confidences of distinct fields; 0 unless two are read and one of them is a result."""
    fields: dict[str, float] = {}
    for head in heads:
        if head.guess and head.guess.field != NAME:
            fields[head.guess.field] = max(fields.get(head.guess.field, 0.0), head.guess.confidence)
    kinds = field_types()
    results = [code for code in fields if kinds[code].is_analyte]
    return sum(fields.values()) if results and len(fields) >= 2 else 0.0


def _text_at(sheet: Sheet, row: int, column: int) -> str:
    line = sheet.rows[row]
    return " ".join(cell_text(line[column]).split()) if column < len(line) else ""


def _heads(sheet: Sheet, top: int, height: int) -> list[Head]:
    width = max(len(sheet.rows[r]) for r in range(top, top + height))
    lines = [[_text_at(sheet, r, c) for c in range(width)] for r in range(top, top + height)]
    groups = [_filled_right(line, lines[-1]) for line in lines[:-1]]
    many = sum(1 for text in lines[-1] if _has_symbol(text)) >= 3
    heads = []
    for column in range(width):
        own = [line[column] for line in lines]
        if any(own):
            group = [line[column] for line in groups]
            shown = " ".join(dict.fromkeys(text for text in own if text))
            heads.append(Head(column, shown, _read_head(own, group, many)))
    return heads


def _has_symbol(text: str) -> bool:
    """True for a header with an element symbol as a word: ``Mo ppm``, ``MO_PPM``."""
    words = [word.strip(",;:()[]") for word in text.replace("_", " ").split()]
    return any(
        word in element_symbols() or (word.isupper() and word.capitalize() in element_symbols()) for word in words
    )


def _filled_right(line: list[str], below: list[str]) -> list[str]:
    """A group heading stands over the columns to its right until the next one."""
    filled, last = [], ""
    for text, lower in zip(line, below, strict=True):
        last = text or (last if lower else "")
        filled.append(last)
    return filled


def _read_head(own: list[str], group: list[str], many: bool) -> Guess | None:
    """The best reading of a header of several lines: its last line, the lines joined, then any line of its own."""
    last = own[-1]
    joined = " ".join(dict.fromkeys(text for text in own if text))
    guess = recognise(last, many) if last else None
    if len(own) == 1:
        return guess
    grouped = " ".join([*dict.fromkeys(text for text in group if text), last]).strip()
    alone = (
        [text for text in reversed(own[:-1]) if text]
        if units.parse(last.strip("()[] ")) not in {"", "count"} or not last
        else []
    )
    for text in (joined, grouped, *alone):
        other = recognise(text, many)
        if (other and (guess is None or guess.field == NAME)) or (
            other and guess and other.field == guess.field and not guess.unit and other.unit
        ):
            guess = other
    if guess and not guess.unit:
        guess = _with_unit_line(guess, [*own, *group])
    return guess


def _with_unit_line(guess: Guess, lines: list[str]) -> Guess:
    """A line of the header, or a group heading's bracket, that is a unit."""
    for text in lines:
        inside = text[text.rfind("(") + 1 :].rstrip(")] ") if "(" in text else text
        if unit := units.parse(inside):
            return Guess(guess.field, unit, inside, guess.confidence, guess.reason, guess.words)
    return guess


def _is_units(row: list[Cell]) -> bool:
    """True for a row of units and formulas: at least half of its cells are such, and none is a number."""
    texts = [text for cell in row if (text := cell_text(cell))]
    if not texts or any(looks_numeric(cell) for cell in row if cell != "" and not _unit_like(cell)):
        return False
    return sum(1 for text in texts if _unit_like(text)) * 2 >= len(texts)


def _unit_like(cell: Cell) -> bool:
    return isinstance(cell, str) and is_unit_or_formula(cell.strip().strip("()[]") if "/" not in cell[:1] else cell)


def _take_rows(sheet: Sheet, table: Table) -> int:
    """Fill the table's data rows; returns the row at which the search for the next table goes on."""
    first = table.top + table.height + (table.unit_row is not None)
    header = [cell_text(cell) for cell in sheet.rows[table.top + table.height - 1]]
    for row in range(first, len(sheet.rows)):
        line = sheet.rows[row]
        if _blank(line):
            continue
        if may_be_header(line):
            if _repeats(line, header):
                table.skipped.append((row, REPEATED))
                continue
            note = _is_note(line)
            if not (note and _header_follows(sheet, row, header)) and _starts_table(sheet, row):
                return row
            if _is_units(line) and (not table.rows or table.skipped[-1:] == [(row - 1, REPEATED)]):
                table.skipped.append((row, "holds units"))
                continue
            if note:
                table.skipped.append((row, "is a note"))
                table.notes.append(" ".join(_line(sheet, row)))
                continue
        table.rows.append(row)
    return len(sheet.rows)


def _starts_table(sheet: Sheet, row: int) -> bool:
    found = _best_header(sheet, row)
    return found is not None and found[0] >= 1.8


def _header_follows(sheet: Sheet, row: int, header: list[str]) -> bool:
    """True when the next filled row repeats the header: a page break."""
    following = next((line for line in sheet.rows[row + 1 : row + 6] if not _blank(line)), [])
    return _repeats(following, header)


def _blank(line: list[Cell]) -> bool:
    return all(cell == "" or (isinstance(cell, str) and not cell.strip()) for cell in line)


def _repeats(line: list[Cell], header: list[str]) -> bool:
    texts = [cell_text(cell) for cell in line]
    pairs = [(a, b) for a, b in zip(texts, header, strict=False) if a or b]
    return len(pairs) >= 2 and sum(a == b for a, b in pairs) >= 0.8 * len(pairs)


def _is_note(line: list[Cell]) -> bool:
    """True for a line of text below the data: one or two cells, a sentence or a known beginning."""
    texts = [text for cell in line if (text := cell_text(cell))]
    lead = texts[0].casefold()
    return len(set(texts)) <= 2 and (len(texts[0]) > 40 or len(texts) == 1 or lead.startswith(_NOTE_WORDS))
