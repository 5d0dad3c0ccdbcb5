"""Text tables: encoding, line endings and delimiter told from the bytes."""

import csv
import io
import re

from charset_normalizer import from_bytes

from labdata.intake.errors import UnreadableFile

_DELIMITERS = ("\t", ";", "|", ",")
_BOMS = (
    (b"\xef\xbb\xbf", "utf-8-sig"),
    (b"\xff\xfe\x00\x00", "utf-32"),
    (b"\xff\xfe", "utf-16"),
    (b"\xfe\xff", "utf-16"),
)


def decode(name: str, content: bytes) -> tuple[str, str]:
    """(text, encoding). UTF-8 first, else the likeliest encoding. Raises UnreadableFile for bytes that are no text."""
    for bom, encoding in _BOMS:
        if content.startswith(bom):
            return content.decode(encoding, errors="replace").lstrip("\ufeff"), encoding
    if b"\x00" in content:
        raise UnreadableFile(
            f"«{name}» is neither a table of text nor a workbook: it holds binary data.",
            remedy="Send .csv, .tsv, .txt, .xlsx, .xlsm, .xls or .ods.",
            file=name,
        )
    try:
        return content.decode("utf-8"), "utf-8"
    except UnicodeDecodeError:
        best = from_bytes(
            content, cp_isolation=["cp1252", "latin_1", "cp1250", "cp1251", "mac_roman", "cp437", "cp850"]
        ).best()
    if best is None:
        raise UnreadableFile(
            f"The encoding of «{name}» could not be told.", remedy="Save it as UTF-8 text, or as .xlsx.", file=name
        )
    encoding = "cp1252" if best.encoding in {"latin_1", "cp1252"} else best.encoding
    return content.decode(encoding, errors="replace"), encoding


def read_rows(name: str, content: bytes) -> tuple[list[list[str]], str]:
    """(rows of cell texts, delimiter). Any line ending, a lone carriage return included."""
    text, _ = decode(name, content)
    text = text.replace("\r\n", "\n").replace("\r", "\n")
    delimiter = sniff(text)
    if delimiter == " ":
        return [re.split(r"\s{2,}|\t", line.strip()) if line.strip() else [] for line in text.split("\n")], delimiter
    try:
        return _split(text, delimiter), delimiter
    except csv.Error as trouble:
        raise UnreadableFile(
            f"«{name}» breaks off inside a quoted cell ({trouble}).",
            remedy="Look for an unpaired quotation mark.",
            file=name,
        ) from trouble


def _split(text: str, delimiter: str) -> list[list[str]]:
    """Rows of cells. A quote that is never closed is an error; other untidy quoting is taken as it stands."""
    try:
        return list(csv.reader(io.StringIO(text, newline=""), delimiter=delimiter, strict=True))
    except csv.Error as trouble:
        if "end of data" in str(trouble) or "field larger" in str(trouble):
            raise
        return list(csv.reader(io.StringIO(text, newline=""), delimiter=delimiter))


def sniff(text: str) -> str:
    """The delimiter that cuts most lines into the same number (at least two) of cells; blanks when none does."""
    lines = [line for line in text[:200_000].split("\n") if line.strip()][:400]
    best, best_score = " ", 0.0
    for delimiter in _DELIMITERS:
        score = _consistency(lines, delimiter)
        if score > best_score * 1.02:
            best, best_score = delimiter, score
    return best


def _consistency(lines: list[str], delimiter: str) -> float:
    """Share of lines with the commonest number of cells, weighted a little by that number."""
    if not any(delimiter in line for line in lines):
        return 0.0
    counts: dict[int, int] = {}
    try:
        for row in csv.reader(lines, delimiter=delimiter):
            counts[len(row)] = counts.get(len(row), 0) + 1
    except csv.Error:
        return 0.0
    cut = {size: number for size, number in counts.items() if size > 1}
    if not cut:
        return 0.0
    size, number = max(cut.items(), key=lambda item: (item[1], item[0]))
    return number / sum(counts.values()) * (1 + min(size, 60) / 100)
