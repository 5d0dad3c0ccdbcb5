"""What a file says of a well besides results: rows of surveys, tops, core runs, casing, mud; log curves; header facts."""

from dataclasses import dataclass, field
from typing import Any

import numpy as np

from labdata.intake.columns import Column

WellKey = tuple[str, str]


@dataclass
class WellRow:
    """One record along a well. ``values`` are fields of the model the record becomes, depths in metres."""

    line: int
    well: WellKey = ("", "")
    values: dict[str, Any] = field(default_factory=dict)


@dataclass
class WellTable:
    """A table of such records as found. ``kind``: survey, core_runs, mud, casing, tops or wells."""

    sheet: str
    cell_range: str
    kind: str
    columns: list[Column]
    unmapped: list[str]
    rows: list[WellRow]

    def as_dict(self) -> dict[str, Any]:
        """The table as the outside contract gives it."""
        return {
            "sheet": self.sheet, "range": self.cell_range, "kind": self.kind,
            "columns": [column.as_dict() for column in self.columns], "unmapped": self.unmapped,
            "header_rows": [], "orientation": "rows",
        }  # fmt: skip


@dataclass
class Curve:
    """One gamma curve: depths in metres and values in ``unit``, NaN where the file has its null value."""

    well: WellKey
    mnemonic: str
    description: str
    quantity: str
    unit: str
    depth_unit: str
    depths: np.ndarray
    values: np.ndarray


@dataclass
class WellRecords:
    """Everything of this kind in one file. ``facts``: well -> fields of Well that the file states.

    ``replaced``: (kind of table, well) whose held records make room for the file's.
    """

    tables: list[WellTable] = field(default_factory=list)
    curves: list[Curve] = field(default_factory=list)
    facts: dict[WellKey, dict[str, Any]] = field(default_factory=dict)
    replaced: set[tuple[str, WellKey]] = field(default_factory=set)

    def tell(self, well: WellKey, facts: dict[str, Any]) -> None:
        """Add facts of a well; what was said first stands."""
        self.facts[well] = {**facts, **self.facts.get(well, {})}

    def __bool__(self) -> bool:
        return bool(self.tables or self.curves)
