"""Words for sample kinds and for the roles of rows."""

import re
from functools import cache, lru_cache

from labdata.intake.fields import synonyms
from labdata.intake.headers import fold


@cache
def _kind_words() -> dict[str, str]:
    return {fold(word): kind for kind, words in synonyms()["kinds"].items() for word in words}


def kind_of(text: str) -> str | None:
    """The sample kind a word means, "unknown" for "not stated", None for a word that is none."""
    key = fold(text)
    return (
        _kind_words().get(key)
        or _kind_words().get(key.removesuffix("s"))
        or _kind_words().get(key.removesuffix("sample").removesuffix("samples"))
    )


@cache
def _role_words() -> list[tuple[str, str]]:
    pairs = [(word, role) for role, words in synonyms()["roles"].items() for word in words]
    return sorted(pairs, key=lambda pair: -len(pair[0]))


@cache
def _role_pattern() -> re.Pattern[str]:
    """All words in one pattern, the longest first: a group each, in the order of ``_role_words``."""
    ends = ((r"$" if role == "summary" or len(word) == 1 else r"(?=\s|\d|#|$)") for word, role in _role_words())
    words = (f"({re.escape(word)}){end}" for (word, _), end in zip(_role_words(), ends, strict=True))
    return re.compile("|".join(words))


@lru_cache(maxsize=10_000)  # a column of kinds repeats a few words over many rows
def role_of(text: str) -> str:
    """ "blank", "reference", "duplicate" or "summary" when the text is or begins with such a word, else ""."""
    plain = " ".join(re.sub(r"[_\-./:]+", " ", text.casefold()).split())
    found = _role_pattern().match(plain)
    return _role_words()[found.lastindex - 1][1] if found and found.lastindex else ""


def reference_name(label: str) -> str:
    """The material's name: the label without the word that marks it, unless next to nothing is left."""
    plain = label.strip()
    for word, role in _role_words():
        if role == "reference":
            shorter = re.sub(rf"^{re.escape(word)}\b[\s:_\-.]*", "", plain, flags=re.I).strip()
            if shorter != plain:
                plain = shorter if len(shorter) >= 3 else plain
                break
    return (plain or "reference material")[:120]
