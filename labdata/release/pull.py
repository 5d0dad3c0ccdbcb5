"""Handing data out: the API and the command ``pull`` both come here, so that they give the same bytes."""

import hashlib
import tempfile
from dataclasses import dataclass
from typing import IO

from django.core.files import File
from django.core.files.storage import default_storage

from labdata.errors import InvalidInput
from labdata.models import Project, Release
from labdata.release import export, las, parquet
from labdata.release.rows import long_table
from labdata.release.shapes import usable, with_rejected

WRITING = 1  # rises when a format is written otherwise than before, so that kept views are written anew
SPOOL_BYTES = 32 * 1024 * 1024
INCLUDES = {"": usable, "rejected": with_rejected}


@dataclass(frozen=True)
class Download:
    """A file ready to be sent. ``file`` is open for reading at its start; ``etag`` is of its bytes."""

    file: IO[bytes]
    size: int
    name: str
    content_type: str
    etag: str


def pull_release(release: Release, *, format_name: str, shape: str, include: str = "") -> Download:
    """The release in one format and shape, without rejected values unless ``include`` is "rejected".

    Written once and kept beside the release; every later pull sends the kept file. Raises InvalidInput.
    """
    export.check(format_name, shape)
    if include not in INCLUDES:
        raise InvalidInput(
            f"«{include}» is nothing that can be included.", remedy="Only include=rejected is known.", field="include"
        )
    kept = f"releases/views/{release.data_sha256}-{WRITING}-{include or 'usable'}-{shape}.{format_name}"
    if not default_storage.exists(kept):
        _keep_view(release, kept, format_name, shape, include)
    etag = hashlib.sha256(kept.encode()).hexdigest()[:32]
    stem = f"{release.project.slug}-release-{release.number}-{shape}{'-with-rejected' if include else ''}"
    return _download(default_storage.open(kept), default_storage.size(kept), stem, format_name, etag)


def _keep_view(release: Release, kept: str, format_name: str, shape: str, include: str) -> None:
    table = INCLUDES[include](parquet.load(release.stored_as, release.data_sha256))
    with tempfile.SpooledTemporaryFile(SPOOL_BYTES) as out:
        export.write(table, format_name, shape, out)
        out.seek(0)
        stored = default_storage.save(kept, File(out))
    if stored != kept:  # another request wrote the same view meanwhile
        default_storage.delete(stored)


def pull_current(project: Project, *, format_name: str, shape: str) -> Download:
    """Today's working data: every current result with its verdict. Raises InvalidInput."""
    export.check(format_name, shape)
    out = tempfile.SpooledTemporaryFile(SPOOL_BYTES)  # noqa: SIM115 - who sends it closes it
    export.write(long_table(project), format_name, shape, out)
    size = out.tell()
    out.seek(0)
    etag = hashlib.file_digest(out, "sha256").hexdigest()[:32]
    out.seek(0)
    return _download(out, size, f"{project.slug}-current-{shape}", format_name, etag)


def _download(file: IO[bytes], size: int, stem: str, format_name: str, etag: str) -> Download:
    written = export.FORMATS[format_name]
    content_type, extension = written.content_type, written.extension
    if format_name == "las" and las.is_zip(file.read(2)):
        content_type, extension = "application/zip", "zip"
    file.seek(0)
    return Download(file, size, f"{export.safe_name(stem)}.{extension}", content_type, f'"{etag}"')
