"""Finding the samples that rows speak of, and making the new ones."""

from collections.abc import Iterable

from labdata.intake.matching import SampleDirectory, fullest_first
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
    placed = [(well, row, directory.place(well, row)) for well, row in fullest_first(listed)]
    samples = {id(held): (well, held) for well, _, held in placed}
    new = [(well, held) for well, held in samples.values() if held.pk is None]
    for (_, held), pk in zip(new, bulk.take_ids(Sample, len(new)), strict=True):
        held.pk = pk
    bulk.insert(Sample, _COLUMNS, (_values(held.pk, well, held.row) for well, held in new if held.pk and held.row))
    found = {id(row): held.pk for _, row, held in placed if held.pk}
    return found, len(new), len(samples) - len(new)


def _values(pk: int, well: int, row: Row) -> tuple[object, ...]:
    return (
        pk, well, row.kind, row.label, row.match_key, row.top_m, row.base_m, row.top_text, row.base_text,
        row.depth_unit, row.depth_kind, row.formation, None, "",
    )  # fmt: skip
