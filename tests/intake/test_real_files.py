"""Every value of the real files, compared with the cells read independently by pandas.

Files, licences and expected figures: tests/data/realdata/ATTRIBUTION.md; the figures were computed with pandas
from the files' own columns.
"""

import json
from collections import Counter
from pathlib import Path

import pandas as pd
import pytest

from labdata.intake.services import answer_questions
from labdata.intake.workbook import letters
from labdata.models import Sample, Well
from tests.factories import ProjectFactory
from tests.intake.landing import carry, cells_of, findings_of, land

pytestmark = [pytest.mark.django_db, pytest.mark.both]
REAL = Path(__file__).resolve().parent.parent / "data" / "realdata"
FRACTION, PPM = 100.0, 10_000.0


def bring_in(path, **options):
    landed = land(ProjectFactory(), (REAL / path).read_bytes(), Path(path).name, **options)
    assert landed.report is not None, json.dumps(landed.upload.answer["findings"], indent=1)
    return landed


def raw_cells(path):
    """{address: text} of every cell, by pandas and without any header."""
    table = pd.read_csv(REAL / path, dtype=str, header=None, keep_default_na=False)
    return {f"{letters(column)}{row + 1}": text for column in table.columns for row, text in enumerate(table[column])}


def check_every_cell(path, landed, first_data_row, result_columns):
    """``result_columns``: letter -> (analyte, factor). Every filled cell is a result and every result is a cell."""
    raw = raw_cells(path)
    stored = cells_of(landed.report)
    expected = {}
    for address, text in raw.items():
        letter = address.rstrip("0123456789")
        if letter in result_columns and int(address[len(letter) :]) >= first_data_row and text.strip():
            expected[address] = (text, *result_columns[letter])
    assert {address for _, address in stored} == set(expected)
    for (sheet, address), row in stored.items():
        text, analyte, factor = expected[address]
        below = text.startswith("<")
        assert sheet == ""
        assert row["analyte__code"] == analyte, address
        assert row["value_reported"] == text.strip(), address
        assert row["qualifier"] == ("<" if below else ""), address
        number = float(text.lstrip("<").replace(",", ""))
        assert row["value"] == pytest.approx(number * factor, rel=1e-12), address
        assert row["decimals"] == len(text.partition(".")[2]), address
    return stored


def by_analysis(landed):
    """One row an analysis, one column an analyte, NaN where there is no uncensored value."""
    frame = pd.DataFrame(cells_of(landed.report).values())
    frame = frame[frame["qualifier"] == ""]
    keys = [frame["analysis__line"], frame["analysis__method__code"]]
    return frame.pivot_table(
        index=[key.rename(name) for key, name in zip(keys, ("line", "method"), strict=True)],
        columns="analyte__code",
        values="value",
    )


def hi_agreement(table):
    """(pairs, within 1 %, within 1 unit) of reported HI against 100 S2/TOC."""
    rows = table.dropna(subset=["HI", "S2", "TOC"])
    recomputed = 100 * rows["S2"] / rows["TOC"]
    apart = (rows["HI"] - recomputed).abs()
    relative = apart / recomputed.where(recomputed != 0)  # one row has S2 and HI of 0: no relative difference
    return len(rows), int((relative <= 0.01).sum()), int((apart <= 1).sum())


def pi_counts(table):
    """(rows with S1 + S2 > 0, PI > 0.2, PI > 0.2 and Tmax < 435)."""
    rows = table.dropna(subset=["S1", "S2"])
    rows = rows[rows["S1"] + rows["S2"] > 0]
    high = rows[rows["S1"] / (rows["S1"] + rows["S2"]) > 0.2]
    return len(rows), len(high), int((high["TMAX"] < 435).sum())


# GA: 791 rows, units inside the headers; columns P to AG hold results
GA_FIELDS = [
    "S1",
    "S2",
    "S3",
    "TOC",
    "TMAX",
    "PI",
    "HI",
    "OI",
    "-",
    "RO",
    "RO_MIN",
    "RO_MAX",
    "RO_N",
    "ALGINITE",
    "EXINITE",
    "INERTINITE",
    "VITRINITE",
    "MACERAL_OTHER",
]


def test_australian_wells_every_cell():
    path = "pyrolysis/ga_wells_pyrolysis_reflectance.csv"
    landed = bring_in(path)
    columns = {letters(15 + at): (code, 1.0) for at, code in enumerate(GA_FIELDS) if code != "-"}
    check_every_cell(path, landed, 2, columns)
    assert Well.objects.count() == 35
    table = by_analysis(landed)
    pyrolysis = table.xs("pyrolysis", level="method")
    assert (pyrolysis["TOC"].count(), pyrolysis["TOC"].min(), pyrolysis["TOC"].max()) == (491, 0.03, 58.02)
    assert (pyrolysis["S2"].count(), int((pyrolysis["S2"] < 0.2).sum())) == (277, 32)
    assert (pyrolysis["TMAX"].count(), pyrolysis["TMAX"].min(), pyrolysis["TMAX"].max()) == (175, 304, 539)
    reflectance = table.xs("reflectance", level="method")
    assert (reflectance["RO"].count(), reflectance["RO"].min(), reflectance["RO"].max()) == (444, 0.03, 5.47)
    assert hi_agreement(pyrolysis) == (277, 276, 277)
    assert pi_counts(pyrolysis) == (275, 115, 18)
    tops = Sample.objects.values_list("top_md_m", flat=True)
    assert (min(tops), max(tops)) == (30, 3096)
    kinds = Counter(Sample.objects.values_list("kind", flat=True))
    assert kinds["cuttings"] == 334
    assert (kinds["core"], kinds["sidewall"]) == (165, 32)


def test_wyoming_cuttings_every_cell():
    path = "pyrolysis/usgs_mowry_cuttings.csv"
    landed = bring_in(path)
    fields = ["CARB", "TMAX", "S1", "S2", "GP", "S3", "PI", "S2S3", "TOC", "TC", "HI", "OI", "OSI"]
    check_every_cell(path, landed, 3, {letters(17 + at): (code, 1.0) for at, code in enumerate(fields)})
    table = by_analysis(landed).xs("pyrolysis", level="method")
    assert (table["TOC"].count(), table["TOC"].min(), table["TOC"].max()) == (129, 0.76, 4.27)
    assert (table["TMAX"].count(), table["TMAX"].min(), table["TMAX"].max()) == (129, 417, 438)
    assert int((table["S2"] < 0.2).sum()) == 1
    assert hi_agreement(table) == (129, 127, 129)
    assert pi_counts(table) == (129, 13, 11)
    assert int(((table["GP"] - table["S1"] - table["S2"]).abs() > 0.011).sum()) == 1  # sample -103 of the source


def test_wyoming_wells_are_told_apart_by_their_number():
    bring_in("pyrolysis/usgs_mowry_cuttings.csv")
    assert Well.objects.count() == 45
    assert Well.objects.filter(name="1 Govt.").count() == 3
    well = Well.objects.get(uwi="4901320972")
    assert (well.name, well.operator, well.datum_kind) == ("Maggie State 1", "Davis Oil Co.", "KB")
    assert well.datum_elevation_m == pytest.approx(6784 * 0.3048)
    assert (well.latitude, well.longitude) == (42.7482, -107.846471)


def test_wyoming_depths_in_feet_with_thousands_marks():
    bring_in("pyrolysis/usgs_mowry_cuttings.csv")
    sample = Sample.objects.get(label="WRB-2018-1")
    assert (sample.top_reported, sample.base_reported, sample.depth_unit_reported) == ("1,620", "1,700", "ft")
    assert (sample.top_md_m, sample.base_md_m) == (1620 * 0.3048, 1700 * 0.3048)
    assert sample.formation == "Mowry"
    tops, bases = zip(*Sample.objects.values_list("top_md_m", "base_md_m"), strict=True)
    assert (round(min(tops) / 0.3048), round(max(bases) / 0.3048)) == (300, 3310)


# Eagle Ford: elements in percent (N to V) and ppm from W on
EAGLE_PERCENT = ["AL", "CA", "FE", "K", "MG", "P", "S", "SI", "TI"]


def test_texas_core_every_cell():
    path = "pyrolysis/usgs_eagleford_core_first31rows.csv"
    landed = bring_in(path, well="Gulf Coast 2")
    head = pd.read_csv(REAL / path, nrows=0).columns
    columns = {
        letters(3 + at): (code, 1.0)
        for at, code in enumerate(["TC", "TOC", "S1", "S2", "S3", "TMAX", "HI", "OI", "PI", "TS"])
    }
    columns |= {letters(13 + at): (code, PPM) for at, code in enumerate(EAGLE_PERCENT)}
    columns |= {letters(at): (head[at].split()[0].upper(), 1.0) for at in range(22, len(head))}
    stored = check_every_cell(path, landed, 2, columns)
    assert sum(row["qualifier"] == "<" for row in stored.values()) == 182
    counts = landed.upload.answer["counts"]
    assert (counts["qualified"], counts["blank"]) == (182, 63)
    table = by_analysis(landed).xs("pyrolysis", level="method")
    assert (table["TOC"].count(), table["TOC"].min(), table["TOC"].max()) == (29, 0.58, 4.70)
    assert (table["TMAX"].count(), table["TMAX"].min(), table["TMAX"].max()) == (29, 413, 430)
    assert hi_agreement(table) == (29, 19, 13)
    assert pi_counts(table) == (29, 0, 0)


def test_texas_core_depth_is_taken_in_feet_and_checked_in_metres():
    landed = bring_in("pyrolysis/usgs_eagleford_core_first31rows.csv", well="Gulf Coast 2")
    sample = Sample.objects.get(label="E180601-011")
    assert (sample.top_md_m, sample.top_reported, sample.depth_unit_reported) == (521.8 * 0.3048, "521.8", "ft")
    fields = {column["column"]: column["field"] for column in landed.upload.answer["tables"][0]["columns"]}
    assert (fields["B"], fields["C"]) == ("TOP", "DEPTH_CHECK")
    assert findings_of(landed.upload.answer, "warning") == []


def test_texas_core_says_that_s3_is_labelled_wrongly():
    landed = bring_in("pyrolysis/usgs_eagleford_core_first31rows.csv", well="Gulf Coast 2")
    notes = [finding for finding in findings_of(landed.upload.answer, "note") if finding["code"] == "unit_label"]
    assert [note["cell"] for note in notes] == ["H1"]


def test_alaska_asks_instead_of_guessing():
    landed = land(ProjectFactory(), (REAL / "pyrolysis/alaska_core_toc.csv").read_bytes(), "alaska.csv", well="Alcor 1")
    assert landed.report is None
    assert landed.upload.outcome == "waiting"
    asked = {finding["id"]: finding["options"] for finding in findings_of(landed.upload.answer, "question")}
    assert asked == {"unit:A": ["m", "ft"], "unit:B": ["fraction", "wt%"], "unit:C": ["fraction", "wt%"]}
    assert not Sample.objects.exists()


@pytest.mark.parametrize(("toc", "factor"), [("fraction", FRACTION), ("percent", 1.0)])
def test_alaska_every_cell_after_the_answers(toc, factor):
    path = "pyrolysis/alaska_core_toc.csv"
    landed = bring_in(path, well="Alcor 1", answers={"unit:A": "feet", "unit:B": toc, "unit:C": "fraction"})
    check_every_cell(path, landed, 2, {"B": ("TOC", factor), "C": ("CARB", FRACTION)})
    table = by_analysis(landed).xs("carbon", level="method")
    assert table["TOC"].count() == 95
    if toc == "fraction":
        assert (table["TOC"].min(), table["TOC"].max()) == (pytest.approx(0.18), pytest.approx(4.35))
    tops = [top / 0.3048 for top in Sample.objects.values_list("top_md_m", flat=True)]
    assert (round(min(tops), 1), round(max(tops), 1)) == (10575.0, 10659.4)


def test_alaska_elements_every_cell():
    path = "elements_xrd/XRF_Alcor1.csv"
    landed = bring_in(path, well="Alcor 1", answers={"unit:A": "ft", "unit:elements": "wt%"})
    symbols = ["NA", "MG", "AL", "SI", "P", "S", "K", "CA", "BA", "TI", "V", "CR", "MN", "FE"]
    check_every_cell(path, landed, 2, {letters(1 + at): (code, PPM) for at, code in enumerate(symbols)})


def test_alaska_minerals_every_cell_with_the_misspelt_header():
    path = "elements_xrd/XRD_Alcor1.csv"
    landed = bring_in(path, well="Alcor 1", answers={"unit:A": "ft"})
    minerals = ["QUARTZ", "ILLITE", "CALCITE", "PYRITE", "APATITE"]
    check_every_cell(path, landed, 2, {letters(1 + at): (code, 1.0) for at, code in enumerate(minerals)})
    assert [f["cell"] for f in landed.upload.answer["findings"] if f["code"] == "header_by_likeness"] == ["B1"]


def test_samples_of_one_core_meet_across_files():
    project = ProjectFactory()
    answers = {"unit:A": "ft", "unit:B": "fraction", "unit:C": "fraction"}
    land(project, (REAL / "pyrolysis/alaska_core_toc.csv").read_bytes(), "toc.csv", well="Alcor-1", answers=answers)
    second = land(
        project,
        (REAL / "elements_xrd/XRF_Alcor1.csv").read_bytes(),
        "xrf.csv",
        well="ALCOR 1",
        answers={"unit:A": "ft", "unit:elements": "wt%"},
    )
    counts = second.upload.answer["counts"]
    assert (counts["wells_new"], counts["samples_new"] + counts["samples_matched"]) == (0, 130)
    assert counts["samples_matched"] == 36  # depths that both files give to the millimetre


def test_answering_a_waiting_file_brings_it_in():
    first = land(ProjectFactory(), (REAL / "pyrolysis/alaska_core_toc.csv").read_bytes(), "alaska.csv", well="Alcor 1")
    upload = answer_questions(
        upload=first.upload, user=None, answers={"unit:A": "ft", "unit:B": "fraction", "unit:C": "fraction"}
    )
    assert carry(upload).report is not None
