"""How numbers, depths and evidence are written on a page. Nothing is rounded anywhere else."""

import math
from datetime import datetime, timedelta
from typing import Any

from django import template
from django.utils import timezone
from django.utils.timesince import timesince

from labdata.models import Result, Sample

register = template.Library()


@register.filter
def metres(value: float | None) -> str:
    """A depth or elevation to the centimetre, or a dash."""
    return "–" if value is None else f"{value:.2f}"


@register.filter
def bearing(degrees: float | None, letters: str) -> str:
    """Degrees with the letter of their side: -38.2 with "EW" is "38.200000° W"."""
    return "–" if degrees is None else f"{abs(degrees):.6f}° {letters[degrees < 0]}"


@register.filter
def interval(sample: Any) -> str:
    """Top and base of a sample in metres, or what there is of them; a dash where there is no sample."""
    if not isinstance(sample, Sample) or sample.top_md_m is None:
        return "–"
    if sample.base_md_m is None or sample.base_md_m == sample.top_md_m:
        return f"{sample.top_md_m:.2f}"
    return f"{sample.top_md_m:.2f} – {sample.base_md_m:.2f}"


@register.filter
def reported_depth(sample: Sample) -> str:
    """The depth in the laboratory's own words."""
    ends = [end for end in (sample.top_reported, sample.base_reported) if end]
    return f"{' – '.join(ends)} {sample.depth_unit_reported}".strip() if ends else "no depth reported"


def canonical_decimals(decimals: int, factor: float) -> int:
    """Decimals of a converted value that say as much as ``decimals`` did before the factor."""
    shift = round(math.log10(abs(factor))) if factor else 0
    return min(12, max(0, decimals - shift))


@register.filter
def value(result: Result) -> str:
    """The canonical value to the reported precision, with its qualifier."""
    if result.value is None:
        return f"{result.qualifier} limit not stated"
    decimals = canonical_decimals(result.decimals, result.column.factor)
    return f"{result.qualifier}{' ' if result.qualifier else ''}{result.value:.{decimals}f}"


@register.filter
def figure(number: Any) -> str:
    """Any number to six significant figures at most; other things as they are."""
    if isinstance(number, bool) or not isinstance(number, int | float):
        return "–" if number is None else str(number)
    return f"{number:.6g}"


#: Parts of a flag's evidence that the page shows in a form of their own.
SHOWN_APART = {"rule", "version", "inputs", "parameters", "neighbours"}


@register.filter
def evidence(facts: Any) -> list[tuple[str, str]]:
    """What a flag, a job or an audit entry says, as pairs of words; parts shown apart and empty ones left out."""
    if not isinstance(facts, dict):
        return []
    told = [(key, item) for key, item in facts.items() if key not in SHOWN_APART and item not in (None, "", [], {})]
    return [(str(key).replace("_", " "), _plain(item)) for key, item in told]


@register.filter
def columns(rows: list[dict[str, Any]]) -> list[str]:
    """Every key of the rows, in the order of their first appearance."""
    return list(dict.fromkeys(key for row in rows for key in row))


@register.filter
def grid(rows: list[dict[str, Any]]) -> list[list[str]]:
    """The rows as text, a cell for each of their ``columns``."""
    names = columns(rows)
    return [[figure(row[name]) if name in row else "" for name in names] for row in rows]


def _plain(item: Any) -> str:
    if isinstance(item, dict):
        return ", ".join(f"{str(key).replace('_', ' ')} {_plain(part)}" for key, part in item.items())
    if isinstance(item, list | tuple):
        return ", ".join(_plain(part) for part in item)
    return figure(item)


@register.filter
def pick(mapping: Any, key: Any) -> Any:
    """``mapping[key]``, or nothing."""
    return mapping.get(key, "") if isinstance(mapping, dict) else ""


@register.filter
def age(since: datetime | None) -> str:
    """How long ago, in its largest unit, or "just now"."""
    if since is None:
        return ""
    return "just now" if timezone.now() - since < timedelta(minutes=1) else timesince(since, depth=1)


@register.filter
def kind_words(code: str) -> str:
    """A code as words: ``already_held`` becomes "already held"."""
    return str(code).replace("_", " ")
