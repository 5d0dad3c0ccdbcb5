"""The columns of a dataset, in order. Depths in metres measured depth; absent text is "", an absent number null."""

import pyarrow as pa

TEXT, REAL, WHOLE = pa.string(), pa.float64(), pa.int32()
INSTANT = pa.timestamp("us", tz="UTC")

LONG = pa.schema([
    ("project", TEXT), ("well", TEXT), ("uwi", TEXT), ("sample", TEXT), ("kind", TEXT), ("formation", TEXT),
    ("top_m", REAL), ("base_m", REAL), ("tvd_top_m", REAL), ("tvd_base_m", REAL),
    ("depth_reported", TEXT), ("depth_unit_reported", TEXT), ("lab", TEXT), ("report", TEXT),
    ("report_version", WHOLE), ("method", TEXT), ("replicate", WHOLE), ("analyte", TEXT), ("value", REAL),
    ("qualifier", TEXT), ("unit", TEXT), ("value_reported", TEXT), ("unit_reported", TEXT), ("verdict", TEXT),
    ("reason", TEXT), ("decided_by", TEXT), ("decided_at", INSTANT), ("signed_by", TEXT), ("signed_at", INSTANT),
    ("flags", TEXT), ("file_sha256", TEXT), ("sheet", TEXT), ("cell", TEXT),
])  # fmt: skip
IDENTITY = LONG.names[: LONG.get_field_index("replicate") + 1]
# beside the long columns, a table in memory and in the file store knows which analysis and result a row is, and
# which inputs an index has lost ("S2,TOC"; "" where it stands)
STORED = pa.schema([*LONG, ("analysis", pa.int64()), ("result", pa.int64()), ("lost_inputs", TEXT)])


def column_letters(number: int) -> str:
    """Spreadsheet letters of a column: 1 is A, 27 is AA."""
    letters = ""
    while number > 0:
        number, rest = divmod(number - 1, 26)
        letters = chr(65 + rest) + letters
    return letters


def cell_address(table_line: int, own_line: int, orientation: str) -> str:
    """Where a value stood. ``table_line``: the mapped column's line, ``own_line``: the analysis's.

    Where samples run along the columns, the mapped "column" is a row of the sheet and the analysis a column.
    """
    across, down = (table_line, own_line) if orientation == "rows" else (own_line, table_line)
    return f"{column_letters(across)}{down}"
