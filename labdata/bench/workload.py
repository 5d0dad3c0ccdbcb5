"""Made-up laboratory workbooks of any length for the benchmarks: 20 columns, header with units, ``<`` values."""

import io
from functools import cache

import numpy as np
import pandas as pd
import xlsxwriter

HEADERS = {
    "well": "Well", "sample": "Sample ID", "kind": "Sample Type", "top": "Top (m)", "base": "Base (m)",
    "formation": "Formation", "toc": "TOC (wt%)", "tic": "TIC (wt%)", "ts": "TS (wt%)", "carb": "CaCO3 (wt%)",
    "s1": "S1 (mg HC/g rock)", "s2": "S2 (mg HC/g rock)", "s3": "S3 (mg CO2/g rock)", "tmax": "Tmax (°C)",
    "hi": "HI (mg HC/g TOC)", "oi": "OI (mg CO2/g TOC)", "pi": "PI", "pc": "PC (wt%)", "rc": "RC (wt%)", "minc": "MinC (wt%)",
}  # fmt: skip
DECIMALS = {"tmax": 0, "hi": 0, "oi": 0, "top": 1, "base": 1, "carb": 1}
ROWS_A_WELL = 500
LIMIT = 0.02


def table(rows: int, seed: int = 1, first_well: int = 1) -> pd.DataFrame:
    """``rows`` samples, 500 a well, with measured values and the indices computed before rounding."""
    random = np.random.default_rng([77, seed])
    number = np.arange(rows)
    depth = 1500.0 + 2.0 * (number % ROWS_A_WELL)
    toc = 1.5 * np.exp(0.7 * random.standard_normal(rows))
    tmax = 425 + 0.02 * (depth - 1500) + 1.5 * random.standard_normal(rows)
    s2 = np.clip(toc * (4.2 + 0.3 * random.standard_normal(rows)) - 0.4, 0.01, None)
    s1 = np.clip(s2 * 0.06 * np.exp(0.3 * random.standard_normal(rows)), 0.001, None)
    s3 = toc * 0.3 * np.exp(0.2 * random.standard_normal(rows))
    tic = 1.2 * np.exp(0.5 * random.standard_normal(rows))
    carbon = 0.083 * (s1 + s2)
    made = pd.DataFrame(
        {
            "well": [f"Bench {first_well + n // ROWS_A_WELL}" for n in number],
            "sample": [f"B{n + 1:06d}" for n in number], "kind": "cuttings", "top": depth, "base": depth + 2.0,
            "formation": np.where(depth < 2000, "Corvane Shale", "Hestwick Shale"), "toc": toc, "tic": tic,
            "ts": toc / 2.8, "carb": tic * 8.333, "s1": s1, "s2": s2, "s3": s3, "tmax": tmax, "hi": 100 * s2 / toc,
            "oi": 100 * s3 / toc, "pi": s1 / (s1 + s2), "pc": carbon, "rc": toc - carbon, "minc": tic,
        }
    )  # fmt: skip
    return made.round({name: DECIMALS.get(name, 2) for name in made.select_dtypes("float").columns})


@cache
def workbook(rows: int, seed: int = 1, first_well: int = 1) -> bytes:
    """``table`` as the bytes of an .xlsx file under a title, S1 below the limit written ``<0.02``."""
    frame = table(rows, seed, first_well)
    stream = io.BytesIO()
    book = xlsxwriter.Workbook(stream, {"in_memory": True})
    page = book.add_worksheet("Results")
    page.write_row(0, 0, [f"Benchmark laboratory, report B-{seed}"])
    page.write_row(2, 0, list(HEADERS.values()))
    position = list(frame.columns).index("s1")
    for row, cells in enumerate(frame.itertuples(index=False, name=None), start=3):
        page.write_row(row, 0, cells)
        if cells[position] < LIMIT:
            page.write_string(row, position, f"<{LIMIT}")
    book.close()
    return stream.getvalue()
