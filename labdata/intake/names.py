"""Names folded so that spellings of the same well meet."""

import re
import unicodedata

_APART = re.compile(r"(?<=[a-z])(?=\d)|(?<=\d)(?=[a-z])")


def name_key(name: str) -> str:
    """Casefolded, accents and punctuation dropped, blanks collapsed: ``Quill-1`` and ``QUILL  #01`` are ``quill 1``."""
    plain = unicodedata.normalize("NFKD", name).casefold()
    plain = "".join(letter for letter in plain if not unicodedata.combining(letter))
    words = re.sub(r"[^\w]+|_", " ", plain)
    words = _APART.sub(" ", words)
    return " ".join(word.lstrip("0") or "0" if word.isdigit() else word for word in words.split())[:120]


def uwi_key(uwi: str) -> str:
    """An API number or UWI without punctuation; an API number's zero suffixes (sidetrack, completion) are dropped."""
    key = re.sub(r"[^0-9a-z]", "", uwi.casefold())
    key = key.removeprefix("uwi").removeprefix("api")
    if key.isdigit() and len(key) in {12, 14} and not key[10:].strip("0"):
        return key[:10]
    return key
