"""The results of a set as columns for the plots and the table: one row a sample and replicate, one column an analyte."""

from collections import defaultdict
from dataclasses import dataclass, field
from typing import Any

from qc.models import ReviewSet, Severity, Verdict
from qc.review import figures
from qc.review.standing import Standing, results_of

VERDICTS = [Verdict.UNDECIDED.value, Verdict.ACCEPTED.value, Verdict.REJECTED.value, Verdict.HELD.value]
SEVERITIES = ["", Severity.INFO.value, Severity.WARN.value, Severity.REJECT_CANDIDATE.value]
DIGITS = 6  # significant digits of a value on its way to the screen; the stored double is untouched


@dataclass
class Column:
    """One analyte by one method, a value a row."""

    key: str
    analyte: str
    method: str
    unit: str
    order: int
    decimals: int = 0
    result: dict[int, int] = field(default_factory=dict)
    value: dict[int, float | None] = field(default_factory=dict)
    qualifier: dict[int, str] = field(default_factory=dict)


@dataclass
class Rows:
    """Rows by (sample, replicate), in order of depth, and the columns over them."""

    samples: list[tuple[Any, ...]]
    columns: list[Column]
    place: dict[int, tuple[int, str]]  # result -> row and column key
    of_analysis: dict[int, int]  # analysis -> row


NAMES = (
    "pk", "value", "qualifier", "decimals", "analysis", "analyte__code", "analyte__unit", "analyte__order",
    "analyte__decimals", "analysis__method__code", "analysis__replicate", "analysis__sample", "analysis__sample__label",
    "analysis__sample__kind", "analysis__sample__top_md_m", "analysis__sample__base_md_m", "analysis__sample__formation",
)  # fmt: skip


def read_rows(review_set: ReviewSet) -> Rows:
    """Everything drawn, in one query."""
    found = list(results_of(review_set).order_by("pk").values_list(*NAMES))
    index, samples = _samples(found)
    columns: dict[tuple[str, str], Column] = {}
    place, of_analysis = {}, {}
    for row in found:
        pk, value, qualifier, decimals, analysis, code, unit, order, usual, method, replicate, sample = row[:12]
        column = columns.get((code, method))
        if column is None:
            column = columns[code, method] = Column(code, code, method, unit, order)
        at = index[sample, replicate]
        column.result[at], column.value[at] = pk, value
        column.decimals = max(column.decimals, min(decimals, max(usual, 4)))
        if qualifier:
            column.qualifier[at] = qualifier
        of_analysis[analysis] = at
    _name(columns)
    for column in columns.values():
        place.update({pk: (at, column.key) for at, pk in column.result.items()})
    ordered = sorted(columns.values(), key=lambda c: (*figures.track_order(c.analyte, c.order), c.method))
    return Rows(samples, ordered, place, of_analysis)


def _samples(found: list[tuple[Any, ...]]) -> tuple[dict[tuple[int, int], int], list[tuple[Any, ...]]]:
    """Row numbers by sample and replicate, shallow first; samples without depth last."""
    seen = {(row[11], row[10]): (row[14] is None, row[14] or 0.0, row[12], row[10], row[11:]) for row in found}
    ordered = sorted(seen, key=lambda key: seen[key][:4])
    return {key: at for at, key in enumerate(ordered)}, [(key[1], *seen[key][4]) for key in ordered]


def _name(columns: dict[tuple[str, str], Column]) -> None:
    """Where two methods gave the same analyte, the column says which."""
    methods = defaultdict(list)
    for code, method in columns:
        methods[code].append(method)
    for (code, method), column in columns.items():
        column.key = code if len(methods[code]) == 1 else f"{code} ({method})"


def as_columns(rows: Rows, decided: dict[int, Standing], severity: dict[int, int]) -> list[dict[str, Any]]:
    """The columns as plain lists over all rows, computed indices last."""
    count = len(rows.samples)
    made = [_plain(column, count, decided, severity) for column in rows.columns]
    return made + [_computed(made, index, count) for index in figures.INDICES if _wanted(made, index)]


def _plain(column: Column, count: int, decided: dict[int, Standing], severity: dict[int, int]) -> dict[str, Any]:
    axis = figures.axis(column.analyte)
    verdict = [0] * count
    flag = [0] * count
    for at, pk in column.result.items():
        verdict[at] = VERDICTS.index(decided[pk].verdict) if pk in decided else 0
        flag[at] = severity.get(pk, 0)
    return {
        "key": column.key, "analyte": column.analyte, "method": column.method, "unit": figures.unit(column.unit),
        "label": column.key.replace(column.analyte, axis.label, 1), "log": axis.log, "zero": axis.zero,
        "decimals": column.decimals, "computed": False,
        "result": [column.result.get(at) for at in range(count)],
        "value": [_rounded(column.value.get(at)) for at in range(count)],
        "qualifier": {str(at): sign for at, sign in column.qualifier.items()},
        "verdict": verdict, "flag": flag,
    }  # fmt: skip


def _rounded(value: float | None) -> float | None:
    return None if value is None else float(f"{value:.{DIGITS}g}")


def _wanted(made: list[dict[str, Any]], index: str) -> bool:
    """An index is computed where the laboratory reported none at all and its inputs are there."""
    keys = {column["key"] for column in made}
    numerator, denominator, _ = figures.INDICES[index]
    return index not in {column["analyte"] for column in made} and {numerator, *denominator} <= keys


def _computed(made: list[dict[str, Any]], index: str, count: int) -> dict[str, Any]:
    """An index computed from accepted or undecided inputs; nothing where an input is qualified, rejected or zero."""
    numerator, terms, factor = figures.INDICES[index]
    by_key = {column["key"]: column for column in made}
    inputs = {key: by_key[key] for key in {numerator, *terms}}
    values: list[float | None] = []
    for at in range(count):
        usable = all(_usable(column, at) for column in inputs.values())
        below = sum(by_key[key]["value"][at] for key in terms) if usable else 0
        values.append(_rounded(factor * by_key[numerator]["value"][at] / below) if below > 0 else None)
    unit = "fraction" if factor == 1 else "mg/g TOC"
    return {
        "key": index, "analyte": index, "method": "", "unit": unit, "label": figures.axis(index).label, "log": False,
        "zero": True, "decimals": 2 if factor == 1 else 0, "computed": True, "result": [None] * count, "value": values,
        "qualifier": {}, "verdict": [0] * count, "flag": [0] * count,
    }  # fmt: skip


def _usable(column: dict[str, Any], at: int) -> bool:
    return (
        column["value"][at] is not None
        and str(at) not in column["qualifier"]
        and VERDICTS[column["verdict"][at]] != Verdict.REJECTED
    )
