"""How finely a value was given: half a unit of its last decimal.

Spreadsheets drop trailing zeros (0.90 becomes 0.9), so one cell says little: the largest number of decimals in that
column of that report counts. Laboratories also report batches of different resolution in one table; where a batch
(sample labels or laboratory numbers alike up to their last number) holds at least ``BATCH_MIN`` values, its own
largest number of decimals counts: that five values all end in a dropped zero has odds of one in 100,000.
"""

import re

import numpy as np
import pandas as pd

from qc.rules.spans import Floats

BATCH_MIN = 5
_LAST_NUMBER = re.compile(r"\d+\D*$")


def batch_of(label: str) -> str:
    """``E170504-162`` -> ``E170504-``: the label up to its last number."""
    return _LAST_NUMBER.sub("", label)


def half_units(column: pd.Series, batch: pd.Series, decimals: pd.Series, column_decimals: pd.Series) -> Floats:
    """``0.5 * 10**-d`` a value, in the reported unit.

    ``column`` and ``batch`` say which values stand together; ``decimals`` is the cell's own number of decimals,
    ``column_decimals`` what intake noted for the column (number formats included).
    """
    cells = pd.DataFrame({"column": column, "batch": batch, "d": decimals, "given": column_decimals})
    whole = cells.groupby("column", sort=False)
    of_column = np.maximum(whole["d"].transform("max"), whole["given"].transform("max"))
    own = cells.groupby(["column", "batch"], sort=False)["d"]
    alone = own.transform("size") >= BATCH_MIN
    used = np.where(alone, own.transform("max"), of_column)
    return np.asarray(0.5 * 10.0 ** -used.astype(float), dtype=float)
