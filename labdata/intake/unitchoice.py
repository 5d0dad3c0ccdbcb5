"""The unit of each column: as its header says, else as the cells, the title or the numbers tell, else asked."""

from collections.abc import Iterable
from statistics import median

from labdata.intake import units
from labdata.intake.columns import Column, Mapping, is_element
from labdata.intake.fields import CARBON, field_types
from labdata.intake.findings import Findings, place_name
from labdata.intake.reading import Cells
from labdata.intake.tables import Table

# Fields that every laboratory reports in one unit; a header without a unit means that one.
ONE_UNIT = frozenset({
    "S1", "S2", "S3", "S3CO", "S3P", "S3COP", "S4CO", "S4CO2", "S5", "TPEAK", "OICO", "GP", "HI", "OI", "OSI", "S2S3", "TMAX", "RO", "RO_SD", "RO_N", "RO_MIN", "RO_MAX", "KAIR", "KLINK", "PR_PH", "PR_NC17",
    "PH_NC18", "CPI", "OEP", "D13C_ORG", "D13C_CARB", "D18O_CARB", "D34S", "GR",
})  # fmt: skip
PERCENT_OR_FRACTION = frozenset({*CARBON, "PC", "RC", "MINC", "PHI", "SW", "SO", "SG", "PI"})


def choose_units(table: Table, mapping: Mapping, cells: dict[int, Cells], findings: Findings) -> None:
    """Set ``unit`` and ``factor`` of every result column; what cannot be told is asked."""
    _shown_as_percent(table, mapping, cells)
    for column in mapping.results:
        if column.unit or (unit := _from_cells(cells[column.index])):
            column.unit = column.unit or unit
            _known(table, column, findings)
    open_columns = [column for column in mapping.results if not column.unit]
    for column in list(open_columns):
        if _told_by_numbers(column, mapping, cells):
            open_columns.remove(column)
    _ask_groups(table, open_columns, cells, findings)
    for column in mapping.results:
        canonical = field_types()[column.field].unit
        column.factor = units.factor(column.unit, canonical) or column.factor
        if column.unit and column.factor == 1:
            column.unit = canonical  # % of a weight is wt%, mg/g of an index is mg/g TOC
        if column.said:
            column.confidence = 1.0


def _shown_as_percent(table: Table, mapping: Mapping, cells: dict[int, Cells]) -> None:
    """A cell that holds 0.0074 and shows 0.74 % holds a fraction; where only some of a column do, those say so themselves."""
    if not table.sheet.percent:
        return
    for column in mapping.results:
        if column.unit not in {"", "%", "wt%"} or column.unit_said:
            continue
        read = cells[column.index]
        numbers = [at for at, reading in enumerate(read.readings) if reading.value is not None and not read.texts[at]]
        shown = [at for at in numbers if (table.rows[at], column.index) in table.sheet.percent]
        if shown and len(shown) == len(numbers):
            column.unit, column.unit_text = "fraction", "shown as percent"
            column.reason += "; its cells hold fractions shown as percent"
            continue
        for at in shown:
            read.readings[at] = read.readings[at]._replace(unit="fraction")


def _from_cells(read: Cells) -> str:
    """The unit that every filled cell of the column carries itself, or ""."""
    said = {units.parse(unit) for unit in read.units_said}
    return said.pop() if len(said) == 1 and read.all_say_unit else ""


def _known(table: Table, column: Column, findings: Findings) -> None:
    """A stated unit must lead to the canonical one; a label that names the wrong substance is noted."""
    kind = field_types()[column.field]
    if column.unit == "mg/g" and column.field == "S3" and "hc" in units.fold(column.unit_text):
        findings.note(
            "unit_label",
            f"{column.place} «{column.header}» gives S3 in mg HC/g rock; S3 is carbon dioxide, so it is read as mg CO2/g rock.",
            sheet=table.sheet.name, cell=_header_cell(table, column), value=column.header, remedy="Nothing to do; tell the laboratory.",
        )  # fmt: skip
    if units.factor(column.unit, kind.unit) is None:
        _not_convertible(table, column, findings, kind.unit)


def _not_convertible(table: Table, column: Column, findings: Findings, canonical: str) -> None:
    """An error, unless a person has answered which unit the numbers really have."""
    message = f"{column.place} «{column.header}» is in {column.unit}, which does not convert to {canonical}."
    options = _options(canonical)
    if _id(table, column) in findings.answers and (answer := _ask(table, column, findings, message, options)):
        column.unit = answer
        column.reason += f"; unit {answer} answered by a person"
        return
    findings.error(
        "unit_not_convertible",
        message,
        id=_id(table, column),
        sheet=table.sheet.name,
        cell=_header_cell(table, column),
        value=column.header,
        remedy=f"Convert the column, or if its header is wrong answer «{_id(table, column)}» with {', '.join(options)}.",
    )
    column.factor = 0.0


def _told_by_numbers(column: Column, mapping: Mapping, cells: dict[int, Cells]) -> bool:
    """True when the field or the numbers leave no doubt about the unit; the reason is kept with the column."""
    kind = field_types()[column.field]
    said = {units.fold(text) for text in (column.unit_text, *column.words)}
    if not kind.unit or units.fold(kind.unit) in said:
        return _settle(column, kind.unit, "the analyte has none" if not kind.unit else "the header says so")
    if len(units.convertible(kind.unit)) == 1 and column.field not in ONE_UNIT:
        return _settle(column, kind.unit, f"{column.field} has no other unit than {kind.unit}")
    if column.field in ONE_UNIT:
        column.unit = kind.unit
        column.confidence = min(column.confidence, 0.9)
        column.reason += f"; no unit given, {column.field} is always in {kind.unit}"
        return True
    top = cells[column.index].largest
    if top is None:
        column.unit = kind.unit
        column.reason += "; the column is empty"
        return True
    if column.field == "PI" and top <= 1:
        return _settle(column, "fraction", "no value above 1, so a fraction")
    if column.field in {"RHOG", "RHOB"} and 1 <= top <= 9:
        return _settle(column, "g/cm3", "the numbers are g/cm3")
    if column.field == "TOC" and (unit := _toc_by_index(mapping, cells)):
        return _settle(column, unit, "HI follows from S2 and TOC in this unit")
    if column.field in PERCENT_OR_FRACTION and column.field != "PI" and 1.5 < top <= 100:
        return _settle(column, "%" if kind.unit == "%" else "wt%", f"values up to {top:g}, so percent")
    return False


def _settle(column: Column, unit: str, why: str) -> bool:
    column.unit = unit
    column.confidence = min(column.confidence, 0.8)
    column.reason += f"; no unit given, {why}"
    return True


def _toc_by_index(mapping: Mapping, cells: dict[int, Cells]) -> str:
    """wt% or fraction when the reported HI agrees with 100 S2/TOC in one of them on most rows, else ""."""
    parts = [mapping.one(field) for field in ("TOC", "S2", "HI")]
    if any(part is None for part in parts):
        return ""
    toc, s2, hi = (cells[part.index].values for part in parts if part)
    ratios = [h * t / (100 * s) for t, s, h in zip(toc, s2, hi, strict=True) if t and s and h]
    if len(ratios) < 3:
        return ""
    middle = median(ratios)
    return "wt%" if 0.9 < middle < 1.1 else "fraction" if 0.009 < middle < 0.011 else ""


def _ask_groups(table: Table, columns: list[Column], cells: dict[int, Cells], findings: Findings) -> None:
    """Elements and minerals without units are asked about once for all of them; every other column by itself."""
    elements = [column for column in columns if column.method == "elements"]
    minerals = [column for column in columns if column.method in {"minerals", "macerals"}]
    for group, name, options in ((elements, "elements", ["wt%", "ug/g"]), (minerals, "minerals", ["wt%", "fraction"])):
        if group and not _closed_sum(group, cells):
            _ask_group(table, group, name, options, findings)
    for column in columns:
        if column not in elements and column not in minerals:
            kind = field_types()[column.field]
            top = cells[column.index].largest or 0.0
            _take(
                column,
                _ask(
                    table,
                    column,
                    findings,
                    f"{column.place} «{column.header}» gives {column.field} without a unit; its largest value is {top:g}.",
                    _options(kind.unit, column.field, top),
                ),
            )


def _closed_sum(group: list[Column], cells: dict[int, Cells]) -> bool:
    """Minerals or oxides whose rows add up to about 100 are percentages."""
    if any(is_element(column) for column in group) or len(group) < 3:
        return False
    rows = zip(*(cells[column.index].values for column in group), strict=True)
    sums = [sum(value for value in row if value is not None) for row in rows]
    middle = median(sums) if sums else 0.0
    if not 80 <= middle <= 108:
        return False
    for column in group:
        _settle(column, "%" if column.method == "macerals" else "wt%", f"the rows add up to about {middle:.0f}")
    return True


def _ask_group(table: Table, group: list[Column], name: str, options: list[str], findings: Findings) -> None:
    own = {column.index: findings.answers.get(_id(table, column)) for column in group}
    rest = [column for column in group if own[column.index] is None]
    listed = ", ".join(f"{column.letter} {column.field}" for column in rest)
    answer = None
    if rest:
        answer = findings.ask(
            f"unit:{place_name(table.sheet.name, name)}", "unit_missing",
            f"No unit is given for the {name}: {listed}.", options,
            sheet=table.sheet.name, cell=_header_cell(table, rest[0]), value=rest[0].header,
        )  # fmt: skip
    for column in group:
        if own[column.index] is None:
            _take(column, answer)
        else:
            _take(column, _ask(table, column, findings, f"{column.place} «{column.header}» has no unit.", options))


def _take(column: Column, answer: str | None) -> None:
    if answer is None:
        column.factor = 0.0
        return
    column.unit = answer
    column.reason += f"; unit {answer} answered by a person"


def _ask(table: Table, column: Column, findings: Findings, message: str, options: Iterable[str]) -> str | None:
    return findings.ask(
        _id(table, column), "unit_missing" if not column.unit else "unit_not_convertible", message, list(options),
        sheet=table.sheet.name, cell=_header_cell(table, column), value=column.header,
    )  # fmt: skip


def _id(table: Table, column: Column) -> str:
    return f"unit:{place_name(table.sheet.name, column.letter)}"


def _header_cell(table: Table, column: Column) -> str:
    return table.sheet.address(table.top + table.height - 1, column.index)


def _options(canonical: str, field: str = "", top: float = 0.0) -> list[str]:
    """The units a person may choose from, likeliest first."""
    if field in PERCENT_OR_FRACTION and canonical in {"wt%", "%"}:
        return ["fraction", canonical] if top <= 1.5 else [canonical, "mg/g", "ug/g"]
    if canonical == "fraction":
        return ["fraction", "%"]
    return units.convertible(canonical)
