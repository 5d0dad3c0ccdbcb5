"""The one way Parquet files are written here: the same table gives the same bytes."""

import hashlib
from io import BytesIO
from typing import IO, Any

import pyarrow as pa
import pyarrow.parquet as pq
from django.core.files.base import ContentFile
from django.core.files.storage import default_storage

from labdata.errors import KerogateError

WRITER: dict[str, Any] = {
    "version": "2.6",
    "data_page_version": "1.0",
    "compression": "zstd",
    "compression_level": 3,
    "use_dictionary": True,
    "write_statistics": True,
    "row_group_size": 65_536,
    "coerce_timestamps": "us",
    "store_schema": True,
}
WRITER_NAME = f"pyarrow {pa.__version__}"  # the file names its writer, so another version gives other bytes


class Damaged(KerogateError):
    """A kept file no longer has the bytes that its checksum speaks of."""

    code = "damaged"
    status = 500


def write(table: pa.Table, out: IO[bytes]) -> None:
    """Write ``table`` with the fixed settings; nothing but the data goes in."""
    pq.write_table(table.combine_chunks(), out, **WRITER)


def as_bytes(table: pa.Table) -> tuple[bytes, str]:
    """The file and its SHA-256."""
    out = BytesIO()
    write(table, out)
    content = out.getvalue()
    return content, hashlib.sha256(content).hexdigest()


def keep(name: str, content: bytes) -> str:
    """Put content-addressed bytes into the file store, once. Returns the name."""
    if not default_storage.exists(name):
        stored = default_storage.save(name, ContentFile(content))
        if stored != name:  # somebody stored the same bytes meanwhile
            default_storage.delete(stored)
    return name


def load(name: str, sha256: str) -> pa.Table:
    """The table kept under ``name``. Raises Damaged when its bytes are gone or are not those of ``sha256``."""
    try:
        with default_storage.open(name) as stream:
            content = stream.read()
    except FileNotFoundError:
        raise Damaged(f"The file {name} is gone.", remedy="Restore it from a backup.") from None
    if hashlib.sha256(content).hexdigest() != sha256:
        raise Damaged(f"The file {name} was altered: its SHA-256 is not {sha256}.", remedy="Restore it from a backup.")
    return pq.read_table(BytesIO(content))
