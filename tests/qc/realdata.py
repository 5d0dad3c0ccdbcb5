"""Published files through pandas into the table, as their own columns say."""

import json
from pathlib import Path

import pandas as pd

from qc.rules.records import table_of
from qc.rules.table import Table

FOLDER = Path(__file__).parents[1] / "data" / "realdata" / "pyrolysis"
FEET = 0.3048
KINDS = {
    "DRILL CHIPS/CUTTINGS": "cuttings", "CORE CONVENTIONAL": "core", "CORE UNSPECIFIED": "core",
    "SIDEWALL CORE BULLET": "sidewall", "UNKNOWN": "unknown",
}  # fmt: skip
AUSTRALIA = {
    "S1": "S1(mg/g rock)", "S2": "S2(mg/g rock)", "S3": "S3(mg/g rock)", "TOC": "TOC(wt %)", "TMAX": "TMAX(deg C)",
    "PI": "PI", "HI": "HI(mg HC/g TOC)", "OI": "OI(mg CO2/g TOC)",
}  # fmt: skip
REFLECTANCE = {"RO": "VR(%)", "RO_MIN": "VR_MIN(%)", "RO_MAX": "VR_MAX(%)", "RO_N": "VR_NUM"}
MOWRY = {
    "S1": "S1", "S2": "S2", "S3": "S3", "TOC": "LECO TOC", "TMAX": "Tmax", "PI": "PI", "HI": "HI", "OI": "OI",
    "GP": "G.P.", "S2S3": "S2/S3", "OSI": "(S1/TOC)*100", "TC": "TC", "CARB": "% CaCO3",
}  # fmt: skip
EAGLE_FORD = {
    "S1": "S1 (mg HC/g rock)", "S2": "S2 (mg HC/g rock)", "S3": "S3 (mg HC/g rock)", "TOC": "TOC_Leco (%)",
    "TMAX": "Tmax (°C)", "PI": "PI", "HI": "HI (mg HC/g TOC)", "OI": "OI (mg CO2/g TOC)", "TC": "TC_Leco (%)",
}  # fmt: skip


def number(text: str) -> float:
    return float(text.replace(",", "")) if text else float("nan")


def cells(name: str) -> pd.DataFrame:
    return pd.read_csv(FOLDER / name, dtype=str, keep_default_na=False)


def australia() -> Table:
    """791 rows of 35 wells: pyrolysis and reflectance rows apart, as intake makes them."""
    sheet = cells("ga_wells_pyrolysis_reflectance.csv")
    wells = sorted(sheet["WELL NAME"].unique())
    records = []
    for row, line in enumerate(sheet.to_dict("records")):
        sample = {
            "well": wells.index(line["WELL NAME"]), "sample": row, "label": line["SAMPLE ID"], "line": row + 2,
            "kind": KINDS[line["SAMPLE TYPE"]], "top_m": number(line["TOP DEPTH(m)"]), "base_m": number(line["BASE DEPTH(m)"]),
        }  # fmt: skip
        for method, columns in (("pyrolysis", AUSTRALIA), ("reflectance", REFLECTANCE)):
            values = {code: line[column] for code, column in columns.items()}
            if any(values.values()):
                records.append({**sample, **values, "method": method})
    return table_of(records, wells=[{"name": well} for well in wells])


def mowry() -> Table:
    sheet = cells("usgs_mowry_cuttings.csv").iloc[1:]
    wells = sorted(sheet["API"].unique())
    records = [
        {
            "well": wells.index(line["API"]), "label": line["sample #"], "kind": "cuttings", "formation": line["Formation"],
            "top_m": number(line["top"]) * FEET, "base_m": number(line["bottom"]) * FEET,
            **{code: line[column] for code, column in MOWRY.items()},
        }
        for line in sheet.to_dict("records")
    ]  # fmt: skip
    return table_of(records, wells=[{"name": well} for well in wells])


def eagle_ford() -> Table:
    return table_of([
        {
            "label": line["Name"], "kind": "core", "top_m": number(line["Depth (ft)"]) * FEET,
            **{code: line[column] for code, column in EAGLE_FORD.items()},
        }
        for line in cells("usgs_eagleford_core_first31rows.csv").to_dict("records")
    ])  # fmt: skip


def plain_json(value: object) -> str:
    return json.dumps(value, sort_keys=True)
