"""Values below their own detection limit, zeros in place of a limit, columns that are mostly limits."""

from collections.abc import Iterator

import numpy as np
import pandas as pd

from qc.rules.asking import dig, of_sets
from qc.rules.panels import codes_of
from qc.rules.rule import FIRE, INFO, PASS, WARN, Answer, Finding, Rule, merge, say
from qc.rules.spans import num
from qc.rules.table import Table

OF_RATIOS = ("S1", "S2", "S3", "TOC", "AL", "MO", "U", "V", "NI", "CO", "CR", "TH")
OF_ROWS = ("S1", "S2", "S3", "TOC", "TIC", "TC", "TS")


def check(table: Table, *, censored_max: float, values_min: float) -> Answer:
    """One check a measured value of a column that states its limit; one a column that enters ratios."""
    return merge([_frame(frame, code, censored_max, values_min) for frame, code in _limited(table)])


def _limited(table: Table) -> Iterator[tuple[pd.DataFrame, str]]:
    """Frames and analytes of which some value is below a limit: nothing else need be looked at."""
    for code in OF_ROWS:
        if (table.rows[f"{code}_q"] == "<").any():
            yield table.rows, code
    for method in ("elements", "minerals"):
        held = table.panels.get(method)
        if held is None:
            continue
        for code in codes_of(method):
            if f"{code}_q" in held and (held[f"{code}_q"] == "<").any():
                yield table.panel(method, code), code


def _frame(rows: pd.DataFrame, code: str, censored_max: float, values_min: float) -> Answer:
    own = rows[(rows[f"{code}_row"].to_numpy() == rows.index.to_numpy()) & (rows[f"{code}_id"] >= 0)]
    entries = []
    for _, group in own.groupby("table", sort=True):
        below = (group[f"{code}_q"] == "<").to_numpy()
        limit = float(group[code].to_numpy()[below].min()) if below.any() else np.nan
        if np.isnan(limit):
            continue
        for row, value in group.loc[~below, code].items():
            fires = value < limit
            entries.append((int(row), FIRE if fires else PASS, _low(group, code, int(row), limit) if fires else None))
        if code in OF_RATIOS and len(group) >= values_min:
            share = float(below.mean())
            found = _mostly(group, code, share, censored_max) if share > censored_max else None
            entries.append((int(group.index[0]), FIRE if found else PASS, found))
    return of_sets(entries)


def _low(rows: pd.DataFrame, code: str, row: int, limit: float) -> Finding:
    value = num(rows, row, code)
    text = f"{code} {say(value)} is given as measured, but the column's limit is {say(limit)}."
    more = {
        "alternatives": [
            "half of the limit put in for a value below it",
            "a zero or a null code",
            "limit of another dilution",
        ],
        "discriminating_test": "ask for the instrument's own reading and limit",
    }
    return Finding(row, code, WARN, text, (code,), value, limit, more=more)


def _mostly(rows: pd.DataFrame, code: str, share: float, censored_max: float) -> Finding:
    members = tuple(int(row) for row in rows.index)
    text = f"{share:.0%} of {len(members)} {code} values are below the limit: ratios with {code} say little."
    return Finding(None, code, INFO, text, (code,), dig(share, 3), censored_max, rows=members)


RULE = Rule(
    id="detection_limit",
    family="composition",
    title="Values below their own limit",
    tests="In a column that states a limit no measured value may be lower; columns that are mostly limits are named.",
    check=check,
    inputs=OF_RATIOS,
    flags="MO",
    formula="value < lowest stated limit of the column warns; more than 40 % below the limit is said of analytes that enter ratios",
    message="A value is below the detection limit of its column",
    source="our default, no publication",
    must_not_fire="In columns that state no limit.",
    example="Mo 0.2 in a column with <1 fires.",
)
RULES = (RULE,)
