"""What differs between two releases of a project, row by row."""

from collections import Counter
from typing import Any

import pyarrow as pa

from labdata.errors import InvalidInput
from labdata.models import Release
from labdata.release import parquet
from labdata.release.shapes import long, usable

COMPARED = ("value", "qualifier", "unit", "value_reported", "unit_reported", "formation", "top_m", "base_m")
Key = tuple[Any, ...]


def changes(release: Release, since: Release) -> dict[str, Any]:
    """Rows of ``release`` against those of ``since``: {added, changed, withdrawn}, usable values only.

    A row is known by well, sample, method, replicate and analyte; a sample by its number, or by kind and depth
    where it has none or the number stands for several. Raises InvalidInput for releases of different projects.
    """
    if release.project_id != since.project_id:
        raise InvalidInput(f"{since} is of another project than {release}.", remedy="Compare releases of one project.")
    now, before = _rows(release), _rows(since)
    deep = _ambiguous(now) | _ambiguous(before)
    new, old = ({_key(row, deep): row for row in rows} for rows in (now, before))
    changed = [
        {"before": old[key], "after": row, "fields": differing}
        for key, row in new.items()
        if key in old and (differing := [name for name in COMPARED if row[name] != old[key][name]])
    ]
    return {
        "release": release.pk,
        "since": since.pk,
        "added": [row for key, row in new.items() if key not in old],
        "changed": changed,
        "withdrawn": [row for key, row in old.items() if key not in new],
    }


def _rows(release: Release) -> list[dict[str, Any]]:
    table: pa.Table = long(usable(parquet.load(release.stored_as, release.data_sha256)))
    return table.to_pylist()


def _label(row: dict[str, Any]) -> Key:
    return tuple(row[name] for name in ("well", "uwi", "sample", "method", "replicate", "analyte"))


def _ambiguous(rows: list[dict[str, Any]]) -> set[Key]:
    """Sample numbers that do not tell two rows apart."""
    return {label for label, count in Counter(map(_label, rows)).items() if count > 1 or not label[2]}


def _key(row: dict[str, Any], deep: set[Key]) -> Key:
    label = _label(row)
    return (*label, row["kind"], row["top_m"], row["base_m"]) if label in deep else label
