"""What a column header means: its field, its unit, how sure that is and why."""

import re
import unicodedata
from dataclasses import dataclass
from functools import cache

from rapidfuzz import fuzz, process

from labdata.intake import units
from labdata.intake.fields import by_project, element_symbols, field_types, synonyms

NAME = "NAME"  # a header that says only "Name" or "ID": well or sample, told by its values
_NAME_WORDS = frozenset({"name", "id", "no", "nr", "number", "code"})
_BRACKETS = re.compile(r"[(\[{]([^()\[\]{}]*)[)\]}]")
_NESTED = re.compile(r"\([^()]*\(")
_BARE_UNITS = frozenset(
    {"%", "wt%", "ug/g", "ng/g", "permil", "ft", "m", "degC", "mg/g", "mg/g TOC", "mD", "API", "g/cm3", "fraction"}
)
_FUZZY_FLOOR = 86.0


@dataclass(frozen=True)
class Guess:
    """One reading of a header. ``unit`` is our name for the unit found in it, ``words`` what else it says."""

    field: str
    unit: str
    unit_text: str
    confidence: float
    reason: str
    words: tuple[str, ...] = ()


def fold(text: str) -> str:
    """Letters and digits only (and / + * %), no accents, no case: ``T max`` and ``Tmax`` are ``tmax``."""
    plain = text.casefold().replace("δ", "d").replace("Δ", "d").replace("æ", "ae").replace("ø", "o").replace("ß", "ss")
    plain = unicodedata.normalize("NFKD", plain).replace("⁄", "/")
    plain = re.sub(r"(?<=s\d)['′’]", "prime", plain)  # S3' is another peak than S3
    return re.sub(r"[^a-z0-9/+*%]", "", plain)


def formula(text: str) -> str:
    """The field a formula stands for (``(S2/TOC)*100`` is HI), or ""."""
    return _formulas().get(re.sub(r"[\s()\[\]{}×]", lambda m: "*" if m.group() == "×" else "", text.casefold()), "")


@cache
def _formulas() -> dict[str, str]:
    return {text: code for code, texts in synonyms()["formulas"].items() for text in texts}


@by_project(maxsize=64)
def _names() -> dict[str, str]:
    """Folded header name -> field code. Listed synonyms win over codes and full names."""
    known: dict[str, str] = {}
    for code, kind in field_types().items():
        for name in kind.names:
            known.setdefault(fold(name), code)
    for code, entry in field_types().items():
        if len(code) > 2 or code in {
            "S1",
            "S2",
            "S3",
            "HI",
            "OI",
            "PI",
            "TC",
            "TS",
            "GP",
            "PC",
            "RC",
            "RO",
            "GR",
            "SW",
            "SO",
            "SG",
        }:
            known.setdefault(fold(code), code)
        known.setdefault(fold(_full_name(entry.code)), code)
    known.pop("", None)
    return known


def _full_name(code: str) -> str:
    from labdata.intake.fields import catalogue  # noqa: PLC0415

    return str(catalogue()["analytes"].get(code, {}).get("name", ""))


@by_project(maxsize=20_000)
def recognise(header: str, many_elements: bool = False) -> Guess | None:
    """The best reading of one header text, or None. ``many_elements``: the row has several element symbols."""
    text = " ".join(header.replace("_", " ").split())
    if not text or len(text) > 200:
        return None
    if code := formula(text):
        return Guess(code, "", "", 0.95, f"«{header.strip()}» is the formula of {code}")
    text = _without_formula(text)
    whole = _names().get(fold(text))
    base, unit_text, words = _split(text)
    unit = units.parse(unit_text)
    if element := _element(base, unit, many_elements):
        return Guess(element, unit, unit_text, 0.95 if unit else 0.8, f"«{base}» is an element symbol")
    code = _names().get(fold(base)) or whole or ""
    if code:
        sure = 0.97 if unit or not field_types()[code].unit else 0.9
        return Guess(code, unit, unit_text, sure, f"«{base}» is a usual name of {code}", words)
    if fold(base) in _NAME_WORDS or base in {"#", "No."}:
        return Guess(NAME, "", "", 0.6, f"«{base}» may name the well or the sample")
    return _laboratory(base) or _with_words(base, unit, unit_text, words) or _close(base, unit, unit_text)


def _laboratory(base: str) -> Guess | None:
    """Who measured: ``VR analyst`` is the laboratory of the reflectance, ``XYZ analyst`` of the rest."""
    tokens = base.split()
    if 2 <= len(tokens) <= 3 and fold(tokens[-1]) in {"analyst", "laboratory", "lab"}:
        about = tuple(token.casefold() for token in tokens[:-1])
        return Guess("LAB", "", "", 0.8, f"«{base}» names who measured", about)
    return None


def _without_formula(text: str) -> str:
    """``PI (S1/(S1+S2))`` is ``PI``: brackets within brackets are a formula, the name stands before."""
    before, equals, _ = text.partition("=")
    if equals and fold(before) in _names():
        return before.strip()
    before, mark, _ = text.partition("(")
    nested = bool(mark) and _NESTED.search(text) is not None and before.strip() != "" and fold(before) in _names()
    return before.strip() if nested else text


def _split(text: str) -> tuple[str, str, tuple[str, ...]]:
    """(name, unit text, other words in brackets) of a header."""
    unit_text, words = "", []
    rest = text
    for inside in _BRACKETS.findall(text):
        if not unit_text and units.parse(inside):
            unit_text = inside.strip()
        elif inside.strip():
            words.append(inside.strip().casefold())
    if _BRACKETS.search(text):
        rest = _BRACKETS.sub(" ", text).strip(" ,;:-/") or text
    if not unit_text:
        rest, unit_text = _bare_unit(rest)
    return " ".join(rest.split()), unit_text, tuple(words)


def unit_in(text: str, canonical: str) -> tuple[str, str]:
    """(our name, text) of the unit in a header whose name nobody knows: in brackets, or a last word that fits; else ("", "")."""
    for inside in _BRACKETS.findall(text):
        if unit := units.parse(inside):
            return unit, inside.strip()
    last = re.split(r"[\s,;_]+", text.strip())[-1]
    unit = units.parse(last)
    return (unit, last) if units.factor(unit, canonical) is not None else ("", "")


def _bare_unit(text: str) -> tuple[str, str]:
    """A unit that stands before or after the name without brackets: ``Al %``, ``TOC, wt.%``, ``% CaCO3``, ``depth ft``."""
    spaced = re.sub(r"(?<=%)(?=[A-Za-z])|(?<=[A-Za-z])(?=%$)|[,;:](?=\s|%)", " ", text)
    tokens = re.sub(r"\bin (?=\w+$)", "", spaced).split()
    for length in (4, 3, 2, 1):
        if len(tokens) > length:
            tail, head = tokens[-length:], " ".join(tokens[:-length])
            for joined in ("".join(tail), "/".join(tail)):
                if units.parse(joined) in _BARE_UNITS and _is_name(head):
                    return head, " ".join(tail)
            if units.parse("".join(tokens[:length])) in {"%", "wt%", "ug/g", "permil"} and _is_name(
                " ".join(tokens[length:])
            ):
                return " ".join(tokens[length:]), " ".join(tokens[:length])
    return text, ""


def _is_name(text: str) -> bool:
    """True when the text without the unit is a name we know, alone or with a laboratory's word beside it."""
    return (
        fold(text) in _names()
        or text.strip() in element_symbols()
        or _with_words(text, "", "", ()) is not None
        or (text.strip().capitalize() in element_symbols() and text.isupper())
    )


def _element(base: str, unit: str, many_elements: bool) -> str:
    """The code of an element symbol; a bare symbol counts only among others or with a unit of concentration."""
    symbol = base.strip()
    concentration = unit in {"ug/g", "ng/g", "%", "wt%", "mg/g"}
    if symbol in element_symbols() and (concentration or many_elements):
        return "" if symbol == "N" and not (concentration or many_elements) else symbol.upper()
    listed = _names().get(fold(symbol))
    if (
        (many_elements or concentration)
        and symbol.isupper()
        and symbol.capitalize() in element_symbols()
        and not listed
    ):
        return symbol
    return ""


@by_project(maxsize=20_000)
def _with_words(base: str, unit: str, unit_text: str, words: tuple[str, ...]) -> Guess | None:
    """A code with a laboratory's own word before or after it: ``ABC TOC``, ``TC_abc``."""
    tokens = re.sub(r"(?<=\w)-(?=\w\w\w)", " ", base).split()
    if not 2 <= len(tokens) <= 4:
        return None
    for start, stop in _parts(len(tokens)):
        extra = [token.casefold().strip(".,:;-") for token in (*tokens[:start], *tokens[stop:])]
        code = _names().get(fold(" ".join(tokens[start:stop])))
        if code is None or not field_types()[code].is_analyte or len(fold(" ".join(tokens[start:stop]))) < 2:
            continue
        if any(_other_quantity(word) for word in extra):
            continue
        return Guess(
            code, unit, unit_text, 0.85, f"{code} with the laboratory's word «{' '.join(extra)}»", (*words, *extra)
        )
    return None


def _other_quantity(word: str) -> bool:
    """True for a word that makes something else of a code: ``TOC sd``, ``TOC/N``; False for a procedure or a name."""
    words = synonyms()["words"]
    if fold(word) in {fold(known) for known in (*words["pyrolysis"], *words["combustion"])}:
        return False
    field = _names().get(fold(word))
    analyte = field is not None and field_types()[field].is_analyte
    return word in words["another_quantity"] or word.isdigit() or "/" in word or analyte


def _parts(length: int) -> list[tuple[int, int]]:
    """Slices of a token list, the longest first, without the whole."""
    cuts = [(start, stop) for start in range(length) for stop in range(start + 1, length + 1) if stop - start < length]
    return sorted(cuts, key=lambda cut: cut[0] - cut[1])


def _close(base: str, unit: str, unit_text: str) -> Guess | None:
    """A misspelt long name (``Qurtz``): a letter or two away from exactly one field."""
    key = fold(base)
    if len(key) < 5 or any(letter.isdigit() for letter in key):
        return None
    long_names = [name for name in _names() if len(name) >= 5]
    near = process.extract(key, long_names, scorer=fuzz.ratio, score_cutoff=_FUZZY_FLOOR, limit=5)
    codes = {_names()[name] for name, _, _ in near}
    if len(codes) != 1:
        return None
    name, score, _ = near[0]
    return Guess(codes.pop(), unit, unit_text, round(0.6 + (score - 80) / 100, 2), f"«{base}» is close to «{name}»")


def is_unit_or_formula(text: str) -> bool:
    """True for a cell of a units row: a unit, or a formula over peaks and carbon."""
    return (
        bool(units.parse(text))
        or bool(formula(text))
        or bool(
            re.fullmatch(r"[\s()\[\]]*\(?[A-Z][\w ]*\)?[\s*/+()\-\d.]+[\w ()*/+.\-]*", text)
            and re.search(r"[*/+]", text)
            and re.search(r"S[123]|TOC|TC", text)
        )
    )
