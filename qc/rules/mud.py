"""Which drilling fluid a sample was cut under."""

from typing import Any

import numpy as np
import pandas as pd

from qc.rules.spans import Bools
from qc.rules.table import Table

OILY = frozenset({"oil", "synthetic"})


def under_oil_based(table: Table, rows: pd.DataFrame) -> Bools:
    """Rows from an interval drilled with an oil- or synthetic-based fluid; False where the fluid is unknown."""
    found = np.zeros(len(rows), dtype=bool)
    mud: Any
    for mud in table.muds.itertuples():
        if mud.kind in OILY:
            found |= inside(rows, mud.well, mud.top_m, mud.base_m)
    return found


def inside(rows: pd.DataFrame, well: float, top_m: float, base_m: float) -> Bools:
    """Rows of the well whose top lies in [top_m, base_m)."""
    depth = rows["top_m"]
    return ((rows["well"] == well) & (depth >= top_m) & (depth < base_m)).to_numpy()
