"""Cell text as a number with its qualifier, or as a depth interval.

The text as reported is kept by the caller; nothing here rounds or guesses. A comma before exactly three digits is
read by the role of the comma in its table, and is ambiguous while that role is unknown.
"""

import math
import re
from collections.abc import Iterable
from functools import lru_cache
from typing import NamedTuple

VALUE, BLANK, UNREADABLE, AMBIGUOUS = "value", "blank", "unreadable", "ambiguous"
THOUSANDS, DECIMAL, UNKNOWN = "thousands", "decimal", ""


class Reading(NamedTuple):
    """A cell as read. ``value`` is None with state "value" only below or above an unknown limit."""

    state: str
    value: float | None = None
    qualifier: str = ""
    decimals: int = 0
    unit: str = ""
    note: str = ""


class Depth(NamedTuple):
    """A depth cell as read: ``base`` is None for a point; ``unit`` is what the cell itself says ("m", "ft" or "")."""

    state: str
    top: float | None = None
    base: float | None = None
    decimals: int = 0
    unit: str = ""
    note: str = ""


EMPTY = Reading(BLANK)
NO_DEPTH = Depth(BLANK)

_TIDY = str.maketrans({
    "\u2212": "-", "\u2012": "-", "\u2013": "-", "\u2014": "-", "\u2010": "-", "\u2011": "-", "\ufe63": "-", "\uff0d": "-",
    "\u00a0": " ", "\u2007": " ", "\u2009": " ", "\u202f": " ", "\u2002": " ", "\u2003": " ", "\u200a": " ", "\u3000": " ",
    "\u200b": None, "\ufeff": None, "\u2060": None, "\uff0c": ",", "\uff0e": ".", "\u2019": "'", "\u2032": "'", "\u00b4": "'",
    "\uff1c": "<", "\uff1e": ">", "\ufe64": "<", "\ufe65": ">",
})  # fmt: skip
BLANKS = frozenset({
    "", "-", "--", "---", ".", "..", "...", "*", "na", "n/a", "n.a", "n.a.", "n. a.", "nan", "null", "none", "nm",
    "n.m.", "n.m", "not analysed", "not analyzed", "not available", "not applicable", "not determined", "not measured",
    "not reported", "no data", "nr", "n.r.", "ns", "n.s.", "no sample", "insufficient sample", "insufficient",
    "i.s.", "nicht bestimmt", "n.b.", "non dosé", "non déterminé", "no determinado", "sin dato", "s/d", "ikke målt",
    "niet bepaald", "não determinado",
})  # fmt: skip
NOT_DETECTED = frozenset({
    "bdl", "b.d.l.", "<dl", "< dl", "<lod", "< lod", "<loq", "< loq", "<mdl", "< mdl", "<ldl", "<rl", "lod", "<lld",
    "below detection", "below detection limit", "below limit", "not detected", "non détecté", "nicht nachgewiesen",
    "nicht nachweisbar", "n.n.", "no detectado", "não detectado", "ikke påvist", "niet aangetoond", "<", "u.d.", "bd",
    "b.d.", "bql", "<ld", "<lq", "blod", "bld", "u.n.g.", "<bg", "<nwg", "nil", "absent",
})  # fmt: skip
TRACES = frozenset({"tr", "tr.", "trace", "traces", "spur", "spuren", "traza", "trazas", "traço", "spor"})
ND = frozenset({"nd", "n.d.", "n.d", "n. d.", "n/d"})
NULL_CODES = frozenset({-999.0, -999.25, -9999.0, -9999.25, -99999.0, -999.99, -1002.0})
_QUALIFIERS = {
    "<": "<", "≤": "<", "<=": "<", "=<": "<", "⩽": "<", "less than": "<", "below": "<", "kleiner": "<", "menor que": "<",
    ">": ">", "≥": ">", ">=": ">", "⩾": ">", "more than": ">", "greater than": ">", "above": ">", "over": ">",
    "~": "~", "≈": "~", "∼": "~", "ca.": "~", "ca": "~", "c.": "~", "approx.": "~", "approx": "~", "about": "~", "circa": "~",
    "est.": "~", "est": "~",
}  # fmt: skip
_LEAD = re.compile("|".join(re.escape(q) for q in sorted(_QUALIFIERS, key=len, reverse=True)), re.I)
_NUMBER = r"[-+]?(?:\d[\d.,' ]*\d|\d)?(?:[.,]\d+)?\.?(?:[eE][-+]?\d{1,3})?"
_PLUS_MINUS = re.compile(rf"^({_NUMBER})\s*(?:±|\+/-|\+-)\s*({_NUMBER})\s*(\S.*)?$")
_MARKED = re.compile(rf"^({_NUMBER})\s*([*†‡§#]+|\([a-z]\)|\[[a-z0-9]\])$")
_WITH_UNIT = re.compile(rf"^({_NUMBER})\s*((?:%|‰|°|µ|μ|[A-Za-z]).*)$")
_DIGITS = re.compile(r"^\d+$")
_POINT = re.compile(r"^\d*\.\d+$|^\d+\.$")
_POINT_THREE = re.compile(r"^[1-9]\d{0,2}\.\d{3}$")
_COMMA = re.compile(r"^\d*,\d+$")
_COMMA_THREE = re.compile(r"^[1-9]\d{0,2},\d{3}$")
_THOUSANDS_POINT = re.compile(r"^[1-9]\d{0,2}(?:,\d{3})+\.\d*$|^[1-9]\d{0,2}(?:,\d{3}){2,}$")
_THOUSANDS_COMMA = re.compile(r"^[1-9]\d{0,2}(?:\.\d{3})+,\d+$|^[1-9]\d{0,2}(?:\.\d{3}){2,}$")
_SPACED = re.compile(r"^[1-9]\d{0,2}(?:[ ']\d{3})+(?:[.,]\d+)?$")
_ERROR_CELL = re.compile(
    r"^#(?:N/A|NV|REF!|BEZUG!|VALUE!|WERT!|DIV/0!|NAME\??|NAME!|NUM!|ZAHL!|NULL!|SPILL!|CALC!)$|^Err:\d+$", re.I
)


def tidy(text: str) -> str:
    """Dashes, blanks and quotes of other alphabets made plain, and blanks around cut off."""
    return text.translate(_TIDY).strip()


def number_text(value: float) -> str:
    """A spreadsheet number as a person sees it: at most 15 digits, no exponent where a plain number will do."""
    if value == int(value) and abs(value) < 1e15:
        return str(int(value))
    return f"{value:.15g}"


def decimals_of(text: str) -> int:
    """How many decimals a plain number shows; 1.5e-3 shows four."""
    mantissa, _, exponent = text.lower().partition("e")
    shown = len(mantissa.partition(".")[2])
    return max(0, shown - int(exponent)) if exponent else shown


@lru_cache(maxsize=200_000)
def read_number(value: float) -> Reading:
    """A number that a spreadsheet holds as a number."""
    if not math.isfinite(value) or abs(value) > 1e300:
        return Reading(UNREADABLE, note="is not a finite number")
    if value in NULL_CODES:
        return Reading(BLANK, note="null code")
    return Reading(VALUE, value, decimals=decimals_of(number_text(value)))


@lru_cache(maxsize=200_000)
def read_text(reported: str, comma: str = THOUSANDS) -> Reading:
    """Read one cell's text. ``comma``: what a comma before three digits is in this table.

    Never raises: what cannot be read says so in ``state``, with the reason in ``note``.
    """
    text = tidy(reported)
    folded = text.casefold()
    if folded in BLANKS:
        return EMPTY
    if folded in ND:
        return Reading(VALUE, None, "<", note="nd")
    if folded in NOT_DETECTED or folded in TRACES:
        return Reading(VALUE, None, "<", note="trace" if folded in TRACES else "below an unknown limit")
    if _ERROR_CELL.match(text):
        return Reading(UNREADABLE, note="is a spreadsheet error")
    qualifier, rest = _qualifier(text)
    return _finish(qualifier, rest, comma)


def _qualifier(text: str) -> tuple[str, str]:
    lead = _LEAD.match(text)
    if lead and (not lead.group()[-1].isalpha() or not text[lead.end() : lead.end() + 1].isalpha()):
        return _QUALIFIERS[lead.group().casefold()], text[lead.end() :].strip()
    return "", text


def _finish(qualifier: str, text: str, comma: str) -> Reading:
    """A number, perhaps followed by an uncertainty, a mark or a unit."""
    plain = _parse(text, comma)
    if plain is not None:
        return _number(plain, qualifier)
    if match := _PLUS_MINUS.match(text):
        number = _parse(match[1], comma)
        if number is not None and _parse(match[2], comma) is not None:
            return _number(number, qualifier, unit=(match[3] or "").strip(), note="uncertainty")
    if match := _MARKED.match(text):
        number = _parse(match[1], comma)
        if number is not None:
            return _number(number, qualifier, note="mark")
    if match := _WITH_UNIT.match(text):
        number = _parse(match[1], comma)
        if number is not None:
            return _number(number, qualifier, unit=match[2].strip())
    return Reading(UNREADABLE, note="is not a number")


def _number(number: tuple[float, int], qualifier: str, unit: str = "", note: str = "") -> Reading:
    value, decimals = number
    if math.isnan(value):
        return Reading(AMBIGUOUS, None, qualifier, decimals, unit, note)
    if not math.isfinite(value) or abs(value) > 1e300:
        return Reading(UNREADABLE, note="is not a finite number")
    if value in NULL_CODES and not qualifier:
        return Reading(BLANK, note="null code")
    return Reading(VALUE, value, qualifier, decimals, unit, note)


def _parse(text: str, comma: str) -> tuple[float, int] | None:
    """(value, decimals); NaN where the comma could be either; None where it is no number."""
    sign = -1.0 if text[:1] == "-" else 1.0
    body = text[1:].lstrip() if text[:1] in "+-" and text else text
    mantissa, mark, exponent = body.partition("e") if "e" in body else body.partition("E")
    if mark and not re.fullmatch(r"[-+]?\d{1,3}", exponent):
        return None
    plain = _plain_number(mantissa, comma)
    if plain is None:
        return None
    if plain == "?":
        return math.nan, 0
    shown = decimals_of(plain)
    value = float(f"{plain}e{exponent}") if mark else float(plain)
    return sign * value, max(0, shown - int(exponent)) if mark else shown


def _plain_number(body: str, comma: str) -> str | None:
    """The digits with a decimal point and no thousands marks; "?" when the comma could be either."""
    if _DIGITS.match(body):
        return body
    if _POINT.match(body):
        return body.replace(".", "") if comma == DECIMAL and _POINT_THREE.match(body) else body
    if _COMMA.match(body):
        if not _COMMA_THREE.match(body) or comma == DECIMAL:
            return body.replace(",", ".")
        return body.replace(",", "") if comma == THOUSANDS else "?"
    if _THOUSANDS_POINT.match(body):
        return body.replace(",", "")
    if _THOUSANDS_COMMA.match(body):
        return body.replace(".", "").replace(",", ".")
    if _SPACED.match(body):
        return body.replace(" ", "").replace("'", "").replace(",", ".")
    return None


def comma_role(texts: Iterable[str]) -> str:
    """What a comma before three digits is in a table, from the cells that leave no doubt.

    "thousands" where points are decimal or commas group twice; "decimal" where commas stand before one, two or
    more than three digits; unknown where no cell tells, even in a file separated by semicolons: 9,870 ft may be
    nine thousand feet there too.
    """
    points = commas = 0
    for text in texts:
        for part in re.findall(r"\d[\d.,]*\d|[.,]\d+", text):
            if _THOUSANDS_POINT.match(part) or (_POINT.match(part) and not _POINT_THREE.match(part)):
                points += 1
            elif _THOUSANDS_COMMA.match(part) or (_COMMA.match(part) and not _COMMA_THREE.match(part)):
                commas += 1
    if points and commas:
        return UNKNOWN
    return THOUSANDS if points else DECIMAL if commas else UNKNOWN


_DEPTH_PART = r"([-+]?[\d.,' ]*?\d[\d.,]*?(?:'\d{3})*(?:\.\d*)?)\s*(ft\.?|feet|foot|fuss|pieds?|pies|mkb|mbkb|mrt|m|metres?|meters?|mtrs?|'|′)?(?:\s*(?:md|mdkb|mdrt))?"
_INTERVAL = re.compile(rf"^{_DEPTH_PART}\s*(?:-|–|/|to|bis|à|al?|til|tot|\.\.\.?)\s*{_DEPTH_PART}$", re.I)
_POINT_DEPTH = re.compile(rf"^{_DEPTH_PART}$", re.I)


def depth_unit(text: str | None) -> str:
    """ "ft" or "m" from a word or mark, "" for none."""
    word = (text or "").casefold().strip(". ")
    if not word:
        return ""
    return "ft" if word[0] in "f'′p" else "m"


@lru_cache(maxsize=200_000)
def read_depth(reported: str, comma: str = THOUSANDS) -> Depth:
    """Read a depth or a depth interval (``10120-10130``, ``10,120'``). Never raises."""
    text = tidy(reported)
    if text.casefold() in BLANKS or text.casefold() in ND:
        return NO_DEPTH
    if _ERROR_CELL.match(text):
        return Depth(UNREADABLE, note="is a spreadsheet error")
    if match := _POINT_DEPTH.match(text):
        return _depth(_parse(match[1].strip(), comma), None, match[2], match[2])
    if match := _INTERVAL.match(text):
        top, base = _parse(match[1].strip(), comma), _parse(match[3].strip(), comma)
        if base is None:
            return Depth(UNREADABLE, note="is not a depth")
        return _depth(top, base, match[2], match[4])
    return Depth(UNREADABLE, note="is not a depth")


def _depth(
    top: tuple[float, int] | None, base: tuple[float, int] | None, top_unit: str | None, base_unit: str | None
) -> Depth:
    if top is None:
        return Depth(UNREADABLE, note="is not a depth")
    units = {depth_unit(top_unit), depth_unit(base_unit)} - {""}
    if len(units) > 1:
        return Depth(UNREADABLE, note="mixes metres and feet")
    if math.isnan(top[0]) or (base is not None and math.isnan(base[0])):
        return Depth(AMBIGUOUS)
    if top[0] in NULL_CODES:
        return Depth(BLANK, note="null code")
    numbers = [top] if base is None else [top, base]
    if any(not math.isfinite(number) for number, _ in numbers):
        return Depth(UNREADABLE, note="is not a finite number")
    return Depth(VALUE, top[0], base[0] if base else None, max(shown for _, shown in numbers), next(iter(units), ""))
