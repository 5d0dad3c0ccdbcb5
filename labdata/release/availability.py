"""Whether an index may stand: it goes when one of the values it is made of was rejected."""

from collections import defaultdict
from collections.abc import Mapping, Sequence
from typing import NamedTuple

REJECTED = "rejected"


class Row(NamedTuple):
    """What decides on availability. ``sample`` is None for reference materials and blanks."""

    analysis: int
    sample: int | None
    replicate: int
    analyte: str
    verdict: str


Index = dict[tuple[object, ...], list[int]]


def lost_inputs(rows: Sequence[Row], inputs: Mapping[str, Sequence[str]]) -> dict[int, list[str]]:
    """Number of the row of each index that goes -> the inputs it lost. ``inputs``: index -> what it is made of.

    An input is looked for in the same analysis; failing that, on the same sample, in the same replicate if there
    is one, else in any (TOC measured apart from S2). An index made of an index goes with it.
    """
    gone = {number for number, row in enumerate(rows) if row.verdict == REJECTED}
    places = _places(rows, {name for names in inputs.values() for name in names})
    indices = [number for number, row in enumerate(rows) if row.analyte in inputs and number not in gone]
    lost: dict[int, list[str]] = {}
    while gone and indices:
        found = {number: _missing(rows[number], inputs, places, gone) for number in indices}
        fresh = {number: names for number, names in found.items() if names}
        if not fresh:
            break
        lost |= fresh
        gone |= fresh.keys()
        indices = [number for number in indices if number not in fresh]
    return lost


def _places(rows: Sequence[Row], needed: set[str]) -> Index:
    """Where the inputs stand: by analysis, by sample and replicate, and by sample."""
    places: Index = defaultdict(list)
    for number, row in enumerate(rows):
        if row.analyte in needed:
            places["analysis", row.analysis, row.analyte].append(number)
            if row.sample is not None:
                places["replicate", row.sample, row.replicate, row.analyte].append(number)
                places["sample", row.sample, row.analyte].append(number)
    return dict(places)


def _missing(row: Row, inputs: Mapping[str, Sequence[str]], places: Index, gone: set[int]) -> list[str]:
    """Inputs of one index that are gone."""
    missing = []
    for name in inputs[row.analyte]:
        holders = (
            places.get(("analysis", row.analysis, name))
            or places.get(("replicate", row.sample, row.replicate, name))
            or places.get(("sample", row.sample, name), [])
        )
        if any(number in gone for number in holders):
            missing.append(name)
    return missing
