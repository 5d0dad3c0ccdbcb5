"""The files that the two laboratories send: seven to take in, one that waits for an answer, one to refuse."""

from collections.abc import Callable
from dataclasses import dataclass
from functools import cache

import pandas as pd

from labdata.demo import reporting
from labdata.demo.basin import BRACKWATER, FENNICK_1, NINEFOLD, SALLOWBY_1, TARROW_1, TARROW_2, DemoLaboratory, DemoWell
from labdata.demo.composition import OXIDES
from labdata.demo.sheets import Column, Sheet, csv_text, workbook


@dataclass(frozen=True)
class DemoFile:
    """One file as it arrives. ``well`` names the well where the table has no well column."""

    name: str
    laboratory: DemoLaboratory
    make: Callable[[], bytes]
    well: str = ""
    outcome: str = "imported"

    @property
    def content(self) -> bytes:
        return self.make()


IDENTITY = (Column("label", "Sample ID"), Column("kind", "Sample Type"))
DEPTHS = (Column("top", "Top", "m", 2, "Depth (m MD)"), Column("base", "Base", "m", 2, "Depth (m MD)"))
PEAKS = (
    Column("toc", "TOC", "wt%", 2, "Organic carbon"),
    Column("s1", "S1", "mg HC/g rock", 2, "Programmed pyrolysis"),
    Column("s2", "S2", "mg HC/g rock", 2, "Programmed pyrolysis"),
    Column("s3", "S3", "mg CO2/g rock", 2, "Programmed pyrolysis"),
    Column("tmax", "Tmax", "°C", 0, "Programmed pyrolysis"),
    Column("hi", "HI", "mg HC/g TOC", 0, "Calculated"),
    Column("oi", "OI", "mg CO2/g TOC", 0, "Calculated"),
    Column("pi", "PI", "S1/(S1+S2)", 2, "Calculated"),
)
CARBONATE = Column("carb", "CaCO3", "wt%", 1, "Carbonate")
NOTES = (
    "Notes",
    "< : below the reporting limit. Blank: not determined. Tmax is not reported where S2 is below 0.2 mg HC/g rock.",
    "HI = 100 x S2 / TOC; OI = 100 x S3 / TOC; PI = S1 / (S1 + S2), computed before rounding.",
    "Results relate only to the samples as received.",
)


def files() -> tuple[DemoFile, ...]:
    """Every file, in the order in which it arrives."""
    return FILES


def _named(table: pd.DataFrame, well: DemoWell | None = None) -> pd.DataFrame:
    """``table`` with its labels, and the well's name where given, as columns."""
    named = table.reset_index()
    return named if well is None else named.assign(well=well.name)


def _title(laboratory: DemoLaboratory, number: str, revision: int, **lines: str) -> list[tuple[str, str]]:
    block = [("", laboratory.name), ("", laboratory.address), ("Report no.", number), ("Revision", str(revision))]
    return [*block, *((label.replace("_", " "), text) for label, text in lines.items())]


@cache
def tarrow_1(revision: int = 1) -> bytes:
    """Cuttings of one well with merged headers and a units row; revision 2 is the amended report."""
    title = _title(
        BRACKWATER,
        "BRL-24117",
        revision,
        Client=TARROW_1.operator,
        Well=TARROW_1.name,
        Matrix="Cuttings, hand-picked",
    )
    amended = "Amended report: replaces revision 1. Samples " + ", ".join(reporting.RUN_AGAIN) + " were run again."
    sheet = Sheet(
        "Results", title, (*IDENTITY, *DEPTHS, Column("formation", "Formation"), *PEAKS, CARBONATE),
        _named(reporting.pyrolysis(TARROW_1, BRACKWATER, revision)), (*NOTES, *([amended] if revision > 1 else [])),
    )  # fmt: skip
    return workbook([sheet], BRACKWATER.name)


@cache
def tarrow_2() -> bytes:
    """One comma-separated table in feet, units in the headers."""
    table = reporting.in_feet(_named(reporting.pyrolysis(TARROW_2, NINEFOLD), TARROW_2))
    columns = (
        Column("well", "Well"), *IDENTITY, Column("top", "Top Depth", "ft", 1), Column("base", "Base Depth", "ft", 1),
        Column("formation", "Formation"), *PEAKS[:-1], Column("pi", "PI", "", 2), CARBONATE,
    )  # fmt: skip
    return csv_text([f"# {NINEFOLD.name}", "# Report NFA-2210"], columns, table)


@cache
def two_wells() -> bytes:
    """Plugs and cuttings of two wells in one sheet, and combustion carbon and sulphur on a second."""
    title = _title(NINEFOLD, "NFA-2231", 1, Project="Quillane Basin regional study")
    well = Column("well", "Well Name")
    depths = (Column("top", "Depth Top", "m", 2), Column("base", "Depth Base", "m", 2))
    pyrolysis = pd.concat([_named(reporting.pyrolysis(w, NINEFOLD), w) for w in (FENNICK_1, SALLOWBY_1)])
    carbon = pd.concat([_named(reporting.carbon_sulphur(w, 3), w) for w in (FENNICK_1, SALLOWBY_1)])
    parts = (Column("tc", "TC", "wt%", 2), Column("tic", "TIC", "wt%", 2), Column("ts", "TS", "wt%", 2))
    flat = (*(Column(c.source, c.header, c.unit, c.decimals) for c in PEAKS[:-1]), Column("pi", "PI", "", 2))
    sheets = [
        Sheet(
            "Pyrolysis", title, (well, *IDENTITY, *depths, Column("formation", "Formation"), *flat), pyrolysis, NOTES
        ),
        Sheet("Carbon & sulphur", title, (well, *IDENTITY, *depths, *parts), carbon, units_row=False),
    ]
    return workbook(sheets, NINEFOLD.name)


@cache
def reflectance() -> bytes:
    """Vitrinite reflectance of two wells, with a column that intake has no field for."""
    title = _title(BRACKWATER, "BRL-24140", 1, Method="Random reflectance in oil, polished whole-rock pellets")
    table = pd.concat([_named(reporting.reflectance(w, 10), w) for w in (TARROW_1, SALLOWBY_1)])
    table["fluorescence"] = ["yellow" if ro < 0.6 else "orange" if ro < 0.75 else "dull orange" for ro in table["ro"]]
    columns = (
        Column("well", "Well"), *IDENTITY, Column("top", "Top depth", "m", 1), Column("base", "Base depth", "m", 1),
        Column("ro", "Ro mean", "%", 2), Column("ro_sd", "Ro SD", "%", 3), Column("ro_n", "No. of readings", "", 0), Column("fluorescence", "Fluorescence"),
    )  # fmt: skip
    return workbook([Sheet("Reflectance", title, columns, table, units_row=False)], BRACKWATER.name)


@cache
def elemental() -> bytes:
    """Major oxides in wt% and trace elements in ppm by X-ray fluorescence, with values below the limit."""
    title = _title(NINEFOLD, "NFA-2236", 1, Well=TARROW_1.name, Method="Fused bead (majors), pressed pellet (traces)")
    majors = tuple(Column(name, _formula(name), "wt%", 2, "Major oxides") for name in OXIDES)
    traces = tuple(
        Column(name, name.title(), "ppm", 1 if name in {"MO", "U"} else 0, "Trace elements")
        for name in ("V", "NI", "MO", "U")
    )
    sheet = Sheet(
        "XRF", title, (*IDENTITY, *DEPTHS, *majors, *traces), _named(reporting.elemental(TARROW_1, 4)), NOTES[:1]
    )
    return workbook([sheet], NINEFOLD.name)


@cache
def fractions() -> bytes:
    """Carbon of one core as bare numbers that may be fractions: no unit anywhere, so intake must ask."""
    table = _named(reporting.carbon_sulphur(FENNICK_1, 3, first=1), FENNICK_1)
    table["tc"] = table["tc"].astype(float) / 100
    columns = (Column("well", "Well"), *IDENTITY, Column("top", "Depth", "m", 2), Column("tc", "TC", "", 4))
    return csv_text(["# Preliminary figures, core of Fennick 1"], columns, table)


@cache
def refused() -> bytes:
    """A draft with an unknown well and remarks where numbers belong."""
    title = _title(BRACKWATER, "BRL-24155", 1, Status="DRAFT, not released by the laboratory")
    table = _named(reporting.pyrolysis(FENNICK_1, BRACKWATER), FENNICK_1).iloc[:12].assign(well="Fennick 11")
    table.loc[3, "toc"] = "see remark"
    table.loc[7, "s2"] = "repeat"
    columns = (Column("well", "Well"), *IDENTITY, Column("top", "Depth", "m", 2), *PEAKS[:5])
    return workbook([Sheet("Draft", title, columns, table)], BRACKWATER.name)


def _formula(code: str) -> str:
    """An oxide's formula as chemists write it, from its code: SIO2 -> SiO2."""
    spelt = {
        "SIO2": "SiO2",
        "AL2O3": "Al2O3",
        "FE2O3": "Fe2O3",
        "CAO": "CaO",
        "MGO": "MgO",
        "NA2O": "Na2O",
        "TIO2": "TiO2",
    }
    return spelt.get(code, code)


AMENDED = "BRL-24117_Tarrow-1_pyrolysis_Rev2.xlsx"
FILES = (
    DemoFile("BRL-24117_Tarrow-1_pyrolysis.xlsx", BRACKWATER, tarrow_1, TARROW_1.name),
    DemoFile("tarrow2_pyrolysis_NFA-2210.csv", NINEFOLD, tarrow_2),
    DemoFile("NFA-2231_Fennick_Sallowby.xlsx", NINEFOLD, two_wells),
    DemoFile("BRL-24140_reflectance.xlsx", BRACKWATER, reflectance, outcome="imported_with_findings"),
    DemoFile("NFA-2236_Tarrow-1_XRF.xlsx", NINEFOLD, elemental, TARROW_1.name),
    DemoFile("Fennick1_core_carbon_prelim.csv", NINEFOLD, fractions, outcome="waiting"),
    DemoFile("BRL-24155_draft.xlsx", BRACKWATER, refused, outcome="refused"),
    DemoFile(AMENDED, BRACKWATER, lambda: tarrow_1(2), TARROW_1.name),
)
