"""A laboratory file as sheets of cells, whatever its kind. What it is, its bytes tell; its name does not matter."""

import io
import struct
import zipfile
import zlib
from dataclasses import dataclass, field
from datetime import date, datetime, time, timedelta
from typing import Any
from xml.etree import ElementTree

from python_calamine import CalamineError, CalamineWorkbook, SheetVisibleEnum

from labdata.intake import apart, odsfaults, plaintext, sheetxml, textfile, xlsfaults
from labdata.intake.errors import UnreadableFile
from labdata.intake.values import number_text

MAX_BYTES = 200 * 1024 * 1024
MAX_UNPACKED = 1024 * 1024 * 1024
MAX_RATIO = 300
APART_BYTES = 128 * 1024 * 1024  # unpacked; what is larger is read in a child process
MAX_CELLS = 40_000_000
SPARSE_CELLS = 5_000_000  # a rectangle up to so large is read however empty it is
SPARSE_RATIO = 20

Cell = Any  # str, float, int, bool, date, datetime, time, timedelta; "" when empty

_OLE = b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1"
_OTHER_KINDS = (
    (b"%PDF", "a PDF"), (b"\x89PNG", "a picture"), (b"\xff\xd8\xff", "a picture"), (b"GIF8", "a picture"),
    (b"PAR1", "a Parquet file"), (b"\x1f\x8b", "a gzip archive"), (b"7z\xbc\xaf", "a 7z archive"), (b"Rar!", "a RAR archive"),
    (b"SQLite format 3", "a database"), (b"{\\rtf", "a word-processor file"),
)  # fmt: skip


@dataclass
class Sheet:
    """One sheet. ``rows[i][j]`` is the cell in row i + 1 and column j + 1.

    ``turned``: rows and columns are exchanged against the file, so that each sample has a row here too.
    ``merged``: inclusive (top, left, bottom, right) from 0; ``formats``: column -> most decimals that its number
    formats show; ``percent``: (row, column) of cells that hold a fraction and show percent; ``row_formats``: decimals by row, in small sheets; ``faults``: address -> spreadsheet error or unstored formula.
    """

    name: str
    rows: list[list[Cell]]
    merged: list[tuple[int, int, int, int]] = field(default_factory=list)
    formats: dict[int, int] = field(default_factory=dict)
    percent: set[tuple[int, int]] = field(default_factory=set)
    faults: dict[tuple[int, int], str] = field(default_factory=dict)
    comma_hint: str = ""
    row_formats: dict[int, int] = field(default_factory=dict)
    turned: bool = False

    def address(self, row: int, column: int) -> str:
        """The cell's address in the file."""
        return address(column, row) if self.turned else address(row, column)

    def row_name(self, line: int) -> str:
        """``Row 12`` for a sample's line counted from 1; ``Column L`` where samples run along the columns."""
        return column_name(line - 1) if self.turned else f"Row {line}"


@dataclass
class Workbook:
    """A file's visible sheets, and the names of those that are hidden."""

    kind: str
    sheets: list[Sheet]
    hidden: list[str] = field(default_factory=list)


def letters(index: int) -> str:
    """Column letters of a column counted from 0: 0 is A, 26 is AA."""
    name = ""
    number = index + 1
    while number:
        number, rest = divmod(number - 1, 26)
        name = chr(65 + rest) + name
    return name


def line_letter(index: int, turned: bool = False) -> str:
    """``F`` for column 5; ``6`` where it is a row of the file."""
    return str(index + 1) if turned else letters(index)


def column_name(index: int, turned: bool = False) -> str:
    """``Column F`` for column 5; ``Row 6`` where it is a row of the file."""
    return f"{'Row' if turned else 'Column'} {line_letter(index, turned)}"


def address(row: int, column: int) -> str:
    """``F17`` for row and column counted from 0."""
    return f"{letters(column)}{row + 1}"


def cell_text(cell: Cell) -> str:
    """A cell as reported, as text."""
    if isinstance(cell, str):
        return cell.replace("\x00", "").strip()
    if isinstance(cell, bool):
        return "TRUE" if cell else "FALSE"
    if isinstance(cell, (int, float)):
        return number_text(float(cell))
    if isinstance(cell, datetime):
        return cell.isoformat(sep=" ", timespec="minutes")
    if isinstance(cell, (date, time)):
        return cell.isoformat()
    return str(cell) if isinstance(cell, timedelta) else ""


def read(name: str, content: bytes) -> Workbook:
    """Every sheet of the file. Raises UnreadableFile naming the file and what is wrong with it."""
    _refuse_hopeless(name, content)
    if content[:8] == _OLE:  # a few changed bytes make its reader ask for any amount of memory
        roomy = len(content) > APART_BYTES // 4
        return apart.read_apart(name, content) if roomy else apart.read_apart(name, content, *apart.SMALL)
    if content.startswith(b"PK"):
        with _archive(name, content) as archive:
            _refuse_bomb(name, content, archive.infolist())
            if sum(entry.file_size for entry in archive.infolist()) > APART_BYTES:
                return apart.read_apart(name, content)
    return read_here(name, content)


def read_here(name: str, content: bytes) -> Workbook:
    """As ``read``, in this process whatever the size."""
    if content.startswith(b"PK"):
        return _zipped(name, content)
    if content.startswith(_OLE):
        book = _calamine(name, content, "xls")
        xlsfaults.add_faults(content, book.sheets)
        return book
    if content.lstrip()[:5].lower() in {b"<?xml", b"<html", b"<!doc", b"<tabl"}:
        raise UnreadableFile(
            f"«{name}» is a web page or XML, whatever its name says.", remedy="Save it as .xlsx or .csv.", file=name
        )
    if (kind := plaintext.kind_of(content)) is not None:
        return Workbook(kind, [Sheet("", plaintext.cells(kind, name, content))])
    rows, delimiter = textfile.read_rows(name, content)
    if not any(cell.strip() for row in rows for cell in row):
        raise UnreadableFile(f"«{name}» holds nothing but blanks.", remedy="Send the file again.", file=name)
    return Workbook("text", [Sheet("", rows, comma_hint="decimal" if delimiter == ";" else "")])


def _refuse_hopeless(name: str, content: bytes) -> None:
    if not content:
        raise UnreadableFile(f"«{name}» is empty (0 bytes).", remedy="Send the file again.", file=name)
    if len(content) > MAX_BYTES:
        raise UnreadableFile(
            f"«{name}» has {len(content) / 1e6:.0f} MB; {MAX_BYTES / 1e6:.0f} MB is the most that is read.",
            remedy="Split it into several files.",
            file=name,
        )
    for start, kind in _OTHER_KINDS:
        if content.startswith(start):
            raise UnreadableFile(
                f"«{name}» is {kind}, not a table.",
                remedy="Send the table itself as .xlsx, .xls, .ods, .csv, .tsv or .txt.",
                file=name,
            )


def _archive(name: str, content: bytes) -> zipfile.ZipFile:
    try:
        return zipfile.ZipFile(io.BytesIO(content))
    except (zipfile.BadZipFile, ValueError, OSError, NotImplementedError, struct.error):
        raise UnreadableFile(
            f"«{name}» is a damaged or incomplete workbook.", remedy="Send the file again.", file=name
        ) from None


def _zipped(name: str, content: bytes) -> Workbook:
    with _archive(name, content) as archive:
        entries = archive.infolist()
        _refuse_bomb(name, content, entries)
        names = {entry.filename for entry in entries}
        if any(entry.flag_bits & 1 for entry in entries) or "EncryptedPackage" in names:
            raise _encrypted(name)
        if not ({"xl/workbook.xml", "xl/workbook.bin", "content.xml"} & names):
            raise UnreadableFile(
                f"«{name}» is a zip archive, not a workbook.", remedy="Unpack it and send the tables in it.", file=name
            )
        if damaged := _damaged(archive):
            raise UnreadableFile(
                f"«{name}» is a damaged or incomplete workbook ({damaged} in it is not whole).",
                remedy="Send the file again.",
                file=name,
            )
        if _encrypted_ods(archive, names):
            raise _encrypted(name)
        _refuse_entities(name, archive)
        _refuse_sparse(name, archive, names)
        book = _calamine(name, content, "ods" if "content.xml" in names else "xlsx")
        _add_left_out(name, archive, book, names)
    return book


def _add_left_out(name: str, archive: zipfile.ZipFile, book: Workbook, names: set[str]) -> None:
    """What the fast reader leaves out, from the XML itself."""
    try:
        if book.kind == "ods":
            odsfaults.add_faults(archive, book.sheets)
        if "xl/workbook.xml" in names:
            sheetxml.add_formats(archive, book.sheets)
    except (ElementTree.ParseError, KeyError, ValueError) as trouble:
        raise UnreadableFile(
            f"«{name}» is a damaged or incomplete workbook ({trouble}).", remedy="Send the file again.", file=name
        ) from trouble


def _refuse_bomb(name: str, content: bytes, entries: list[zipfile.ZipInfo]) -> None:
    unpacked = sum(entry.file_size for entry in entries)
    if unpacked > MAX_UNPACKED or (unpacked > 50_000_000 and unpacked > MAX_RATIO * len(content)):
        raise UnreadableFile(
            f"«{name}» would unpack to {unpacked / 1e6:.0f} MB from {len(content) / 1e6:.2f} MB; it is not read.",
            remedy="Save the workbook again with only its used cells, or send it as .csv.",
            file=name,
        )


def _refuse_entities(name: str, archive: zipfile.ZipFile) -> None:
    """Refuse parts that declare entities: no spreadsheet program writes any, and they can unfold without end."""
    for entry in archive.infolist():
        if entry.filename.endswith((".xml", ".rels")):
            with archive.open(entry) as stream:
                head = stream.read(4096).replace(b"\x00", b"").upper()
            if b"<!DOCTYPE" in head or b"<!ENTITY" in head:
                raise UnreadableFile(
                    f"«{name}» declares XML entities ({entry.filename}); no workbook needs any, and it is not read.",
                    remedy="Save it again with a spreadsheet program.",
                    file=name,
                )


def _refuse_sparse(name: str, archive: zipfile.ZipFile, names: set[str]) -> None:
    """Refuse a sheet whose few cells lie so far apart that the rectangle around them would fill the memory."""
    parts = [part for part in names if part.startswith("xl/worksheets/") and part.endswith(".xml")]
    try:
        spans = [sheetxml.extent(archive.read(part)) for part in sorted(parts)]
        spans += [odsfaults.extent(archive.read("content.xml"))] if "content.xml" in names else []
    except (ElementTree.ParseError, ValueError) as trouble:
        raise UnreadableFile(
            f"«{name}» is a damaged or incomplete workbook ({trouble}).", remedy="Send the file again.", file=name
        ) from trouble
    for rows, columns, cells in spans:
        if rows * columns > max(SPARSE_CELLS, SPARSE_RATIO * cells):
            raise UnreadableFile(
                f"A sheet of «{name}» spans {rows} rows and {columns} columns for {cells} cells; it is not read.",
                remedy="Delete the rows and columns outside the table and save it again.",
                file=name,
            )


def _damaged(archive: zipfile.ZipFile) -> str:
    """The first part that does not unpack to its declared size and checksum, or ""."""
    try:
        return archive.testzip() or ""
    except (
        zipfile.BadZipFile,
        EOFError,
        zlib.error,
        OSError,
        NotImplementedError,
        ValueError,
        RuntimeError,
        struct.error,
    ):
        return "a part"


def _encrypted_ods(archive: zipfile.ZipFile, names: set[str]) -> bool:
    manifest = "META-INF/manifest.xml"
    return manifest in names and b"encryption-data" in archive.read(manifest)


def _encrypted(name: str) -> UnreadableFile:
    return UnreadableFile(
        f"«{name}» is protected with a password.", remedy="Save it without a password and send it again.", file=name
    )


def _calamine(name: str, content: bytes, kind: str) -> Workbook:
    if kind == "xls" and (
        "EncryptedPackage".encode("utf-16-le") in content or "EncryptionInfo".encode("utf-16-le") in content
    ):
        raise _encrypted(name)
    try:
        book = CalamineWorkbook.from_filelike(io.BytesIO(content))
        return _sheets(name, book, kind)
    except BaseException as trouble:
        if not isinstance(trouble, (CalamineError, OSError, ValueError)) and type(trouble).__name__ != "PanicException":
            raise
        if "password" in str(trouble).lower() or "encrypt" in str(trouble).lower():
            raise _encrypted(name) from trouble
        raise UnreadableFile(
            f"«{name}» is a damaged or incomplete workbook ({trouble}).", remedy="Send the file again.", file=name
        ) from trouble


def _sheets(name: str, book: CalamineWorkbook, kind: str) -> Workbook:
    made, hidden = [], []
    for meta in book.sheets_metadata:
        if meta.visible != SheetVisibleEnum.Visible:
            hidden.append(meta.name)
            continue
        sheet = book.get_sheet_by_name(meta.name)
        if sheet.total_height * sheet.total_width > MAX_CELLS:
            raise UnreadableFile(
                f"Sheet «{meta.name}» of «{name}» spans {sheet.total_height} rows and {sheet.total_width} columns.",
                remedy="Delete the rows and columns outside the table and save it again.",
                file=name,
            )
        merged = [(top, left, bottom, right) for (top, left), (bottom, right) in sheet.merged_cell_ranges or []]
        made.append(Sheet(meta.name, sheet.to_python(skip_empty_area=False), merged))
    if not any(sheet.rows for sheet in made):
        raise UnreadableFile(f"No visible sheet of «{name}» holds anything.", remedy="Send the file again.", file=name)
    return Workbook(kind, made, hidden)
