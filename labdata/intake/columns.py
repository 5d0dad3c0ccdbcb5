"""Which column of a table is which field, in which unit: one reading per column, with its reason, or a question."""

from collections import defaultdict
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Any

from labdata.intake import units
from labdata.intake.fields import CARBON, PYROLYSIS_PEAKS, element_symbols, field_types, synonyms
from labdata.intake.findings import Findings, place_name
from labdata.intake.headers import NAME, Guess, fold, formula, unit_in
from labdata.intake.tables import Head, Table
from labdata.intake.workbook import cell_text, column_name, line_letter

if TYPE_CHECKING:
    from labdata.intake.corrections import Said

DEPTH_CHECK = "DEPTH_CHECK"
SPECTRAL = frozenset({"K", "U", "TH"})
LEAVE_OUT = "leave out"
_LIMIT_MARKS = frozenset({"<", ">", "≤", "≥", "~"})
_PLAIN_MARKS = frozenset({"=", "-", "±"})


@dataclass
class Column:
    """A mapped column. ``unit`` is our name of the unit reported, "" while it is not known; ``method`` "" for identity.

    ``said`` names the person whose word the field is, ``unit_said`` is True when the unit is one's word.
    """

    index: int
    header: str
    field: str
    unit: str
    unit_text: str
    confidence: float
    reason: str
    method: str = ""
    factor: float = 1.0
    decimals: int = 0
    words: tuple[str, ...] = ()
    said: str = ""
    unit_said: bool = False

    turned: bool = False

    @property
    def letter(self) -> str:
        """The column's letters; the row's number where samples run along the columns."""
        return line_letter(self.index, self.turned)

    @property
    def place(self) -> str:
        """``Column F``, or ``Row 6`` where samples run along the columns."""
        return f"{'Row' if self.turned else 'Column'} {self.letter}"

    @property
    def is_result(self) -> bool:
        return bool(self.method)

    def as_dict(self) -> dict[str, Any]:
        """The column as the outside contract gives it."""
        return {
            "column": self.letter, "header": self.header, "field": self.field, "unit": self.unit,
            "confidence": round(self.confidence, 2), "reason": self.reason,
        }  # fmt: skip


@dataclass
class Mapping:
    """The columns of one table by place, and the headers that were not understood or are not needed."""

    columns: list[Column]
    unmapped: list[str]

    def one(self, field: str) -> Column | None:
        return next((column for column in self.columns if column.field == field), None)

    @property
    def results(self) -> list[Column]:
        return [column for column in self.columns if column.is_result]


def map_columns(table: Table, findings: Findings, said: "dict[int, Said] | None" = None) -> Mapping:
    """Give every column its field; ask where two columns claim the same one and cannot be told apart.

    ``said``: column -> what a person says it is, which nothing here overrules.
    """
    told_fields = {index: one for index, one in (said or {}).items() if one.field}
    known, unknown = _first_reading(table, told_fields)
    columns = [_column(head, guess) for head, guess in known]
    set_columns, left_out = _as_said(table, told_fields)
    columns += set_columns
    told = _sulfur_by_combustion(unknown, columns) + _readings_count(unknown, columns)
    columns += told
    unknown = [head for head in unknown if head.index not in {column.index for column in told}]
    by_field: dict[str, list[Column]] = defaultdict(list)
    for column in columns:
        by_field[column.field].append(column)
    kept: list[Column] = []
    dropped: list[tuple[Column, str]] = left_out
    for field, claims in by_field.items():
        chosen, rest = _settle(field, claims, by_field, table, findings)
        kept += chosen
        dropped += rest
    _name_by_lab_number(kept)
    _give_methods(kept)
    _units_said(kept, said or {})
    _note_likeness(table, kept, findings)
    _report_unmapped(table, unknown, dropped, findings)
    for column in kept:
        column.turned = table.sheet.turned
    names = [head.text for head in unknown] + [column.header for column, _ in dropped]
    return Mapping(sorted(kept, key=lambda column: column.index), names)


def _as_said(table: Table, told: "dict[int, Said]") -> tuple[list[Column], list[tuple[Column, str]]]:
    """(columns that a person gave a field, columns that a person leaves out with the reason)."""
    made, left_out = [], []
    for head in table.heads:
        one = told.get(head.index)
        if one is None:
            continue
        kind = field_types().get(one.field)
        if kind is None:
            left_out.append((Column(head.index, head.text, "", "", "", 1.0, one.reason), one.reason))
            continue
        unit, unit_text = unit_in(head.text, kind.unit or "m")
        guess = Guess(one.field, unit, unit_text, 1.0, one.reason, head.guess.words if head.guess else ())
        made.append(replace(_column(head, guess), said=one.reason))
    return made, left_out


def _units_said(columns: list[Column], said: "dict[int, Said]") -> None:
    """Give the units that a person has said."""
    for column in columns:
        one = said.get(column.index)
        if one is not None and one.unit:
            column.unit = column.unit_text = one.unit
            column.unit_said, column.confidence = True, 1.0
            if not column.said:
                column.reason += f"; unit {one.reason}"


def _first_reading(table: Table, told: "dict[int, Said]") -> tuple[list[tuple[Head, Guess]], list[Head]]:
    """(heads with a reading, heads without). Names that say only "Name" are told by the values below them."""
    known, unknown, unclear = [], [], []
    for head in table.heads:
        if head.index in told:
            continue
        guess = head.guess
        if guess is None and (code := formula(head.unit_cell)):
            guess = Guess(code, "", "", 0.7, f"«{head.unit_cell}» below it is the formula of {code}")
        if guess is None:
            unknown.append(head)
        elif guess.field == NAME:
            unclear.append(head)
        else:
            known.append((head, guess))
    for head in unclear:
        taken = {guess.field for _, guess in known} | {one.field for one in told.values()}
        guess = _told_by_values(table, head, taken)
        known.append((head, guess)) if guess else unknown.append(head)
    return known, unknown


def _told_by_values(table: Table, head: Head, taken: set[str]) -> Guess | None:
    """Distinct on nearly every row, "Name" is the sample; repeated, it is the well."""
    values = [text for cell in table.cells(head.index) if (text := cell_text(cell))]
    distinct = len(set(values)) >= 0.9 * len(values) if values else False
    if distinct and "SAMPLE" not in taken and len(values) > 1:
        return Guess("SAMPLE", "", "", 0.8, f"«{head.text}» differs on nearly every row, so it names the sample")
    if not distinct and "WELL" not in taken and values and fold(head.text) == "name":
        return Guess("WELL", "", "", 0.7, f"«{head.text}» repeats down the rows, so it names the well")
    return None


def _column(head: Head, guess: Guess) -> Column:
    kind = field_types()[guess.field]
    unit, unit_text = guess.unit, guess.unit_text
    if not unit and head.unit_cell:
        below = head.unit_cell.strip("()[] ")
        if parsed := units.parse(below) or units.parse(head.unit_cell):
            unit, unit_text = parsed, below
    return Column(
        head.index,
        head.text,
        guess.field,
        unit,
        unit_text,
        guess.confidence,
        guess.reason,
        kind.method,
        words=guess.words,
    )


def _sulfur_by_combustion(unknown: list[Head], columns: list[Column]) -> list[Column]:
    """``Xyz_S %`` beside ``Xyz_TOC``: the word both share is the carbon analyser, so the sulfur is total sulfur."""
    shared = {word for column in columns if column.field in CARBON for word in column.words}
    found = []
    for head in unknown:
        words = head.text.replace("_", " ").split()
        name = [word.casefold() for word in words if not units.parse(word.strip("()[],"))]
        if len(name) == 2 and "s" in name and shared & set(name):
            unit_text = next((word for word in words if units.parse(word.strip("()[],"))), "").strip("()[],")
            reason = f"sulfur by the procedure of the carbon, «{head.text}»"
            guess = Guess("TS", units.parse(unit_text), unit_text, 0.85, reason, tuple(name))
            found.append(_column(head, guess))
    return found


def _readings_count(unknown: list[Head], columns: list[Column]) -> list[Column]:
    """``N`` right after reflectance or its standard deviation is the number of readings."""
    after = {column.index + 1 for column in columns if column.method == "reflectance"}
    if any(column.field == "RO_N" for column in columns):
        return []
    return [
        _column(head, Guess("RO_N", "count", "", 0.8, f"«{head.text}» beside the reflectance counts its readings"))
        for head in unknown
        if fold(head.text) == "n" and head.index in after
    ][:1]


def _settle(
    field: str, claims: list[Column], by_field: dict[str, list[Column]], table: Table, findings: Findings
) -> tuple[list[Column], list[tuple[Column, str]]]:
    """(columns kept, columns dropped with the reason) among those that claim ``field``."""
    if len(claims) == 1 or field == "LAB":
        return claims, []
    set_ones = [column for column in claims if column.said]
    if len(set_ones) == 1 and field not in {"TOP", "BASE", "SAMPLE"}:
        best = set_ones[0]
        return [best], [(column, f"{best.letter} is taken for {field}") for column in claims if column is not best]
    if field in {"TOP", "BASE"}:
        return _depths(claims)
    if field == "SAMPLE":
        return _sample_numbers(claims, "LAB_NO" in by_field)
    if not claims[0].is_result:
        best = _best_named(claims)
        return [best], [(column, f"{best.letter} is taken for {field}") for column in claims if column is not best]
    if field in CARBON and (told := _by_procedure(claims)):
        return told, []
    return _ask_which(field, claims, table, findings)


def _depths(claims: list[Column]) -> tuple[list[Column], list[tuple[Column, str]]]:
    """One depth in two units: the first is kept here and the other checked against it when values are read."""
    first = _best_named(claims)
    kept, dropped = [first], []
    for column in claims:
        if column is first:
            continue
        if column.unit and first.unit and column.unit != first.unit:
            reason = f"the depth again in {column.unit}, checked against column {first.letter}"
            kept.append(replace(column, field=DEPTH_CHECK, reason=reason))
        else:
            dropped.append((column, f"{first.letter} is taken for {first.field}"))
    return kept, dropped


def _sample_numbers(claims: list[Column], has_lab_no: bool) -> tuple[list[Column], list[tuple[Column, str]]]:
    """The name nearest to "sample id" is the sample's; a second number is kept as the laboratory's."""
    best = _best_named(claims)
    kept, dropped = [best], []
    for column in claims:
        if column is best:
            continue
        if not has_lab_no:
            kept.append(replace(column, field="LAB_NO", confidence=0.6, reason=f"a second number beside {best.letter}"))
            has_lab_no = True
        else:
            dropped.append((column, f"{best.letter} is taken for SAMPLE"))
    return kept, dropped


def _best_named(claims: list[Column]) -> Column:
    """The column whose name stands first among the field's synonyms."""
    order = {fold(name): place for place, name in reversed(list(enumerate(field_types()[claims[0].field].names)))}

    def rank(column: Column) -> tuple[float, int, int]:
        bare = fold(column.header.split("(")[0])
        return (-column.confidence, order.get(bare, len(order)), column.index)

    return min(claims, key=rank)


def _by_procedure(claims: list[Column]) -> list[Column] | None:
    """TOC by combustion and TOC by pyrolysis are two quantities: each joins its own method. None if they cannot be told."""
    words = synonyms()["words"]
    made = []
    for column in claims:
        said = {fold(word) for text in column.words for word in text.split()}
        pyrolysis, combustion = said & set(words["pyrolysis"]), said & set(words["combustion"])
        if bool(pyrolysis) == bool(combustion):
            return None
        made.append(replace(column, method="pyrolysis" if pyrolysis else "carbon"))
    return made if len({column.method for column in made}) == len(made) else None


def _ask_which(
    field: str, claims: list[Column], table: Table, findings: Findings
) -> tuple[list[Column], list[tuple[Column, str]]]:
    places = ", ".join(f"{column.letter} «{column.header}»" for column in claims)
    first = claims[0]
    answer = findings.ask(
        f"column:{place_name(table.sheet.name, field)}",
        "same_field_twice",
        f"Columns {places} all read as {field}, and nothing tells them apart.",
        [column.letter for column in claims],
        sheet=table.sheet.name,
        cell=table.sheet.address(table.top + table.height - 1, first.index),
        value=first.header,
        remedy=f"Answer with the letter of the column to take for {field}; the other is left out and named.",
    )
    chosen = next((column for column in claims if column.letter == answer), first)
    return [chosen], [(column, f"{chosen.letter} is taken for {field}") for column in claims if column is not chosen]


def _name_by_lab_number(columns: list[Column]) -> None:
    """Where only the laboratory's number tells rows apart, it is the sample number."""
    fields = {column.field for column in columns}
    if not fields & {"SAMPLE", "TOP", "BASE"}:
        for column in columns:
            if column.field == "LAB_NO":
                column.field, column.confidence = "SAMPLE", 0.7
                column.reason += "; the only thing that names the sample"


def _give_methods(columns: list[Column]) -> None:
    """Carbon that stands beside pyrolysis peaks belongs to the pyrolysis analysis, unless its procedure says otherwise.

    Potassium, uranium and thorium alone beside gamma are spectral gamma.
    """
    fields = [column.field for column in columns]
    elements = {column.field for column in columns if column.method == "elements"}
    if "GR" in fields and elements and elements <= SPECTRAL:
        for column in columns:
            column.method = "gamma" if column.method == "elements" else column.method
    if not any(peak in fields for peak in PYROLYSIS_PEAKS):
        return
    for column in columns:
        if column.field in CARBON and fields.count(column.field) == 1:
            column.method = "pyrolysis"


def _report_unmapped(table: Table, unknown: list[Head], dropped: list[tuple[Column, str]], findings: Findings) -> None:
    row = table.top + table.height - 1
    places = [(head.index, head.text, "") for head in unknown] + [(c.index, c.header, why) for c, why in dropped]
    for index, text, why in sorted(places):
        filled = sum(1 for cell in table.cells(index) if cell_text(cell))
        if not filled:
            continue
        name = column_name(index, table.sheet.turned)
        if _holds_marks(table, index) and not _without_marks(table, index, f"{name} «{text}»", findings):
            continue
        message = f"{name} «{text}» " + (f"was left out: {why}." if why else "was not understood and is left out.")
        findings.note(
            "unmapped_column", message, sheet=table.sheet.name, cell=table.sheet.address(row, index), value=text,
            remedy=f"Its {filled} filled cells stay in the kept file.",
        )  # fmt: skip


def _holds_marks(table: Table, index: int) -> bool:
    """True for a column of nothing but ``<`` and the like, which say what the numbers beside it mean."""
    texts = {text for cell in table.cells(index) if (text := cell_text(cell).strip())}
    return bool(texts & _LIMIT_MARKS) and texts <= _LIMIT_MARKS | _PLAIN_MARKS


def _without_marks(table: Table, index: int, name: str, findings: Findings) -> bool:
    """True when a person has said that the marks do not matter: without them ``<`` 0.05 would be read as 0.05."""
    cell = table.sheet.address(table.top + table.height - 1, index)
    id_ = f"marks:{place_name(table.sheet.name, cell)}"
    return findings.ask(
        id_, "marks_apart", f"{name} holds marks such as < that belong to the numbers of another column.",
        [LEAVE_OUT], sheet=table.sheet.name, cell=cell,
        remedy=f"Write them into the cells of the numbers (<0.05) and send the file again, or answer «{id_}» with «{LEAVE_OUT}».",
    ) is not None  # fmt: skip


def _note_likeness(table: Table, columns: list[Column], findings: Findings) -> None:
    """A header read by likeness of spelling is said aloud."""
    for column in columns:
        if "is close to" in column.reason:
            findings.note(
                "header_by_likeness",
                f"{column.place} is read as {column.field}: {column.reason}.",
                sheet=table.sheet.name,
                cell=table.sheet.address(table.top + table.height - 1, column.index),
                value=column.header,
                remedy="If it is not, correct the header and send the file again.",
            )


def is_element(column: Column) -> bool:
    """True for an element by symbol (not an oxide)."""
    return column.field.capitalize() in element_symbols()
