"""What of a dataset is shown, and in which shape: one row a result (long) or one row an analysis (wide)."""

from collections.abc import Callable

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc

from labdata.release.columns import IDENTITY, LONG

ACCEPTED = "accepted"


def usable(table: pa.Table) -> pa.Table:
    """Accepted values, without the indices that lost an input: what a release shows unless asked for more."""
    return table.filter(pc.and_(pc.equal(table["verdict"], ACCEPTED), pc.equal(table["lost_inputs"], "")))


def with_rejected(table: pa.Table) -> pa.Table:
    """The usable values and the rejected ones, each with its verdict. An index that lost an input stays out."""
    return table.filter(pc.equal(table["lost_inputs"], ""))


def long(table: pa.Table) -> pa.Table:
    """One row a result, with the columns of LONG."""
    return table.select(LONG.names)


def wide(table: pa.Table) -> pa.Table:
    """One row an analysis: who and where, ``analysis``, a column an analyte in canonical unit.

    ``<analyte>_qualifier`` stands beside it where any value has one, ``<analyte>_verdict`` where any value is not
    accepted. ``table`` holds the rows of an analysis together (rows.read).
    """
    analyses = table["analysis"].to_numpy()
    starts = np.flatnonzero(np.r_[True, analyses[1:] != analyses[:-1]]) if len(analyses) else np.array([], dtype=int)
    group = np.cumsum(np.isin(np.arange(len(analyses)), starts)) - 1
    made = {name: table[name].take(pa.array(starts)) for name in [*IDENTITY, "analysis"]}
    codes = np.asarray(table["analyte"].to_pylist(), dtype=object)
    for code in analytes_of(table):
        rows = np.flatnonzero(codes == code)
        source = np.full(len(starts), -1, dtype=np.int64)
        source[group[rows]] = rows
        picked = table.take(pa.array(source, mask=source < 0))
        made[code] = picked["value"]
        for name, tells in (("qualifier", _is_qualified), ("verdict", _is_not_accepted)):
            if tells(picked[name]):
                made[f"{code}_{name}"] = pc.fill_null(picked[name], "")
    return pa.table(made)


def _is_qualified(column: pa.ChunkedArray) -> bool:
    return bool(pc.any(pc.not_equal(column, "")).as_py())


def _is_not_accepted(column: pa.ChunkedArray) -> bool:
    return bool(pc.any(pc.not_equal(column, ACCEPTED)).as_py())


def analytes_of(table: pa.Table) -> list[str]:
    """Analyte codes present, in the order of the list of analytes."""
    named = (table.schema.metadata or {}).get(b"analytes", b"").decode().split(",")
    present = pc.unique(table["analyte"]).to_pylist()
    return [code for code in dict.fromkeys([*named, *present]) if code in set(present)]


SHAPES: dict[str, Callable[[pa.Table], pa.Table]] = {"long": long, "wide": wide}
