"""What a kind of fault is, and what one injection has done."""

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Final

import numpy as np
import pandas as pd

from qc.rehearsal.copying import Copy
from qc.rules.facts import not_rock
from qc.rules.table import Table

MODERATE: Final = "moderate"
STRONG: Final = "strong"
STRENGTHS: Final = (MODERATE, STRONG)
SAMPLE, UNIT, BATCH = "sample", "unit", "batch"

Rows = tuple[int, ...]
Random = np.random.Generator


@dataclass(frozen=True)
class Injected:
    """One fault as injected: the rows that carry it, the rows of samples it involves without fault of theirs, and words."""

    rows: Rows
    what: str
    partners: Rows = ()


@dataclass(frozen=True)
class Kind:
    """One kind of fault.

    ``strengths``: what moderate and strong mean, in numbers. ``rules``: those meant for it. ``targets(table, free)``:
    what may carry it, each the rows of one sample, unit or batch, out of the ``free`` rows (those without doubt at
    the outset). ``inject(copy, rows, strength, random)`` changes the copy and says what it did, or returns None and
    changes nothing where this target cannot carry that strength. ``lacking``: why there may be no target. ``sparse``
    faults come one a well and sample kind at a time: many at once would be another fault.
    """

    id: str
    title: str
    scope: str
    strengths: Mapping[str, str]
    rules: tuple[str, ...]
    targets: Callable[[Table, pd.Index], list[Rows]]
    inject: Callable[[Copy, Rows, str, Random], Injected | None]
    lacking: str
    sparse: bool = False


def measured(table: Table, free: pd.Index, *analytes: str) -> pd.Index:
    """Free pyrolysis rows of rock with measured, not rejected numbers of all these analytes."""
    rows = table.rows.loc[free]
    rows = rows[rows["method"].eq("pyrolysis") & ~not_rock(rows) & rows["kind"].ne("outcrop")]
    for name in analytes:
        rows = rows[rows[name].notna() & ~rows[f"{name}_q"].isin(["<", ">"]) & ~rows[f"{name}_rej"]]
    return rows.index


def each(index: pd.Index) -> list[Rows]:
    """Every row a target of its own."""
    return [(int(row),) for row in index]


def exchanged_digits(text: str) -> list[str]:
    """The readings of a number with two neighbouring unlike digits exchanged."""
    pairs = [at for at in range(len(text) - 1) if text[at].isdigit() and text[at + 1].isdigit()]
    made = [text[:at] + text[at + 1] + text[at] + text[at + 2 :] for at in pairs if text[at] != text[at + 1]]
    return [one for one in made if not one.startswith("0") or one.startswith("0.")]
