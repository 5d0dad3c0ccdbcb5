"""Finding the samples that rows speak of, and making the new ones."""

from collections.abc import Iterable

from labdata.intake.matching import SampleDirectory
from labdata.intake.rows import Row
from labdata.models import Sample
from labdata.registry import bulk

_COLUMNS = (
    "id", "well_id", "kind", "label", "match_key", "top_md_m", "base_md_m", "top_reported", "base_reported",
    "depth_unit_reported", "depth_kind", "formation", "parent_id", "igsn",
)  # fmt: skip


def place_samples(rows: Iterable[tuple[int, Row]]) -> tuple[dict[int, int], int, int]:
    """(id(row) -> sample id, samples made, samples matched) for rows of rock, each with its well's id."""
    listed = list(rows)
    directory = SampleDirectory({well for well, _ in listed})
    placed: dict[int, int] = {}
    matched: set[int] = set()
    new: dict[tuple[int, str], list[Row]] = {}
    for well, row in listed:
        found = directory.find(well, row)
        if found is None:
            new.setdefault((well, row.match_key), []).append(row)
        else:
            placed[id(row)] = found
            matched.add(found)
    ids = bulk.take_ids(Sample, len(new))
    bulk.insert(
        Sample, _COLUMNS, (_values(pk, well, group[0]) for pk, ((well, _), group) in zip(ids, new.items(), strict=True))
    )
    for pk, group in zip(ids, new.values(), strict=True):
        placed.update({id(row): pk for row in group})
    return placed, len(ids), len(matched)


def _values(pk: int, well: int, row: Row) -> tuple[object, ...]:
    return (
        pk, well, row.kind, row.label, row.match_key, row.top_m, row.base_m, row.top_text, row.base_text,
        row.depth_unit, row.depth_kind, row.formation, None, "",
    )  # fmt: skip
