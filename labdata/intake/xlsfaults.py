"""What a fast reader leaves out of an old .xls workbook: error cells, and which cells show percent.

Walks the compound file to the workbook stream and its records BOUNDSHEET, BOOLERR, FORMULA, FORMAT, XF, NUMBER, RK and
MULRK (Excel binary file format, [MS-XLS] 2.4; [MS-CFB] for the container).
"""

import struct
from collections.abc import Iterator
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from labdata.intake.workbook import Sheet

_ERRORS = {0x00: "#NULL!", 0x07: "#DIV/0!", 0x0F: "#VALUE!", 0x17: "#REF!", 0x1D: "#NAME?", 0x24: "#NUM!", 0x2A: "#N/A"}
_FORMULA, _EOF, _BOUNDSHEET, _BOOLERR = 0x0006, 0x000A, 0x0085, 0x0205
_FORMAT, _XF, _NUMBER, _RK, _MULRK = 0x041E, 0x00E0, 0x0203, 0x027E, 0x00BD
_PERCENT_BUILT_IN = (9, 10)
_LAST_SECTOR = 0xFFFFFFFA


def add_faults(content: bytes, sheets: "list[Sheet]") -> None:
    """Fill ``faults`` and ``percent`` of the sheets; nothing is added when the container has no workbook stream."""
    try:
        stream = _workbook_stream(content)
        starts = dict(_sheets(stream))
        percent = _percent_styles(stream)
        for sheet in sheets:
            if (start := starts.get(sheet.name)) is not None:
                sheet.faults.update(_faults(stream, start))
                if percent:
                    sheet.percent.update(_styled(stream, start, percent))
    except (struct.error, IndexError):
        return  # an unusual container: the cells were read, only their error texts stay unknown


def _records(stream: bytes, start: int) -> Iterator[tuple[int, bytes]]:
    """(record number, content) from ``start`` to the end of the substream."""
    at = start
    while at + 4 <= len(stream):
        number, size = struct.unpack_from("<HH", stream, at)
        yield number, stream[at + 4 : at + 4 + size]
        if number == _EOF:
            return
        at += 4 + size


def _sheets(stream: bytes) -> Iterator[tuple[str, int]]:
    """(name, offset) of every sheet."""
    for number, body in _records(stream, 0):
        if number == _BOUNDSHEET:
            offset, length, wide = struct.unpack_from("<I", body)[0], body[6], body[7] & 1
            name = body[8 : 8 + length * (1 + wide)].decode("utf-16-le" if wide else "latin-1")
            yield name, offset


def _faults(stream: bytes, start: int) -> Iterator[tuple[tuple[int, int], str]]:
    """((row, column), error) of error constants and of formulas whose stored result is an error."""
    for number, body in _records(stream, start):
        if number == _BOOLERR and len(body) >= 8 and body[7]:
            row, column = struct.unpack_from("<HH", body)
            yield (row, column), _ERRORS.get(body[6], "#error")
        elif number == _FORMULA and len(body) >= 14 and body[12:14] == b"\xff\xff" and body[6] == 2:
            row, column = struct.unpack_from("<HH", body)
            yield (row, column), _ERRORS.get(body[8], "#error")


def _percent_styles(stream: bytes) -> set[int]:
    """Numbers of the cell styles whose number format shows percent."""
    formats, styles, count = set(_PERCENT_BUILT_IN), set(), 0
    for number, body in _records(stream, 0):
        if number == _FORMAT and len(body) > 5:
            text = body[5:].decode("utf-16-le" if body[4] & 1 else "latin-1", errors="replace")
            if "%" in text:
                formats.add(struct.unpack_from("<H", body)[0])
        elif number == _XF:
            if struct.unpack_from("<H", body, 2)[0] in formats:
                styles.add(count)
            count += 1
    return styles


def _styled(stream: bytes, start: int, styles: set[int]) -> Iterator[tuple[int, int]]:
    """(row, column) of number cells in one of these styles."""
    for number, body in _records(stream, start):
        if number in {_NUMBER, _RK, _FORMULA} and len(body) >= 6:
            row, column, style = struct.unpack_from("<HHH", body)
            if style in styles:
                yield row, column
        elif number == _MULRK:
            row, first = struct.unpack_from("<HH", body)
            for at in range((len(body) - 6) // 6):
                if struct.unpack_from("<H", body, 4 + 6 * at)[0] in styles:
                    yield row, first + at


def _workbook_stream(content: bytes) -> bytes:
    """The stream named Workbook (or Book) of a compound file."""
    size = 1 << struct.unpack_from("<H", content, 30)[0]
    table = _allocation(content, size)
    directory = _chain(content, struct.unpack_from("<I", content, 48)[0], table, size)
    root = mini = b""
    for at in range(0, len(directory) - 127, 128):
        entry = directory[at : at + 128]
        length = struct.unpack_from("<H", entry, 64)[0]
        name = entry[: max(0, length - 2)].decode("utf-16-le", errors="replace")
        start, whole = struct.unpack_from("<II", entry, 116)
        if entry[66] == 5:
            root = _chain(content, start, table, size)
        if name in {"Workbook", "Book"}:
            if whole >= struct.unpack_from("<I", content, 56)[0]:
                return _chain(content, start, table, size)[:whole]
            mini = mini or _chain(content, struct.unpack_from("<I", content, 60)[0], table, size)
            short = list(struct.unpack(f"<{len(mini) // 4}I", mini[: len(mini) // 4 * 4]))
            return _chain(root, start, short, 64, header=0)[:whole]
    return b""


def _allocation(content: bytes, size: int) -> list[int]:
    """The sector allocation table, from the sectors that the header and its continuation list."""
    listed = list(struct.unpack_from("<109I", content, 76))
    following, count = struct.unpack_from("<II", content, 68)
    for _ in range(count):
        part = struct.unpack_from(f"<{size // 4}I", content, (following + 1) * size)
        listed += part[:-1]
        following = part[-1]
    table: list[int] = []
    for sector in listed:
        if sector < _LAST_SECTOR and (sector + 2) * size <= len(content):
            table += struct.unpack_from(f"<{size // 4}I", content, (sector + 1) * size)
    return table


def _chain(content: bytes, start: int, table: list[int], size: int, header: int = 1) -> bytes:
    """The bytes of a chain of sectors. A chain that runs in a circle ends."""
    parts: list[bytes] = []
    sector = start
    while sector < len(table) and len(parts) <= len(table):
        parts.append(content[(sector + header) * size : (sector + header + 1) * size])
        sector = table[sector]
    return b"".join(parts)
