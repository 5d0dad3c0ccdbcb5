"""Surveys, tops, core analysis, core gamma and logs: every value of the real files, against a reading of its own.

Files, licences: tests/data/realdata/ATTRIBUTION.md.
"""

import csv
import io
import json
import re
from pathlib import Path

import numpy as np
import openpyxl
import pandas as pd
import pytest

from labdata.models import (
    Analysis,
    AuditEntry,
    CoreRun,
    FormationTop,
    LogCurve,
    Result,
    Sample,
    SurveyStation,
    Upload,
    Well,
)
from labdata.pages.sheet_extract import extract
from tests.factories import ProjectFactory
from tests.intake.landing import cells_of, findings_of, land
from tests.intake.test_real_files import check_every_cell

pytestmark = [pytest.mark.django_db, pytest.mark.both]
REAL = Path(__file__).resolve().parent.parent / "data" / "realdata"
FOOT = 0.3048


def bring_in(path, project=None, **options):
    landed = land(project or ProjectFactory(), (REAL / path).read_bytes(), Path(path).name, **options)
    assert landed.report is not None, json.dumps(landed.upload.answer["findings"], indent=1)
    return landed


def questions(path, **options):
    landed = land(ProjectFactory(), (REAL / path).read_bytes(), Path(path).name, **options)
    assert landed.report is None
    assert landed.upload.outcome == Upload.Outcome.WAITING, landed.upload.answer["findings"]
    return {finding["id"]: finding["options"] for finding in findings_of(landed.upload.answer, "question")}


def stations():
    return list(SurveyStation.objects.values_list("md_m", "inclination_deg", "azimuth_deg"))


def test_survey_with_units_in_brackets():
    path = "surveys/wellpathpy_deviation.csv"
    assert questions(path) == {"well": []}
    landed = bring_in(path, well="Quill 1")
    rows = list(csv.reader((REAL / path).open()))[1:]
    assert len(rows) == 79
    assert stations() == [tuple(float(cell) for cell in row[:3]) for row in rows]
    table = landed.upload.answer["tables"][0]
    assert (table["kind"], table["range"]) == ("survey", "A1:G80")
    assert table["unmapped"] == ["TVD[m]", "North[m]", "East[m]", "Dogleg [deg/30m]"]


def test_survey_with_lone_carriage_returns_asks_for_its_unit():
    path = "surveys/P-130_deviation_survey.csv"
    assert questions(path, well="P-130") == {"unit:A": ["m", "ft"]}
    bring_in(path, well="P-130", answers={"unit:A": "m"})
    lines = (REAL / path).read_bytes().decode().split("\r")
    rows = [tuple(float(cell) for cell in line.split(",")[:3]) for line in lines[1:] if line]
    assert len(rows) == 163
    assert stations() == rows


def test_survey_workbook_with_header_lines_and_a_units_row():
    path = "surveys/P-135_deviation_survey.xlsx"
    landed = bring_in(path)
    sheet = openpyxl.load_workbook(REAL / path).active
    rows = [tuple(float(cell) for cell in row[:3]) for row in sheet.iter_rows(min_row=10, values_only=True)]
    assert len(rows) == 19
    assert stations() == rows
    well = Well.objects.get()
    assert (well.name, well.uwi, well.datum_kind, well.datum_elevation_m) == ("E-38-A/11-E-5", "P-135", "KB", 123)
    assert (well.td_md_m, well.crs) == (946, "NAD 83")
    assert landed.upload.answer["counts"]["well_records"] == 19


def test_a_survey_that_is_held_is_not_replaced_unasked():
    project = ProjectFactory()
    bring_in("surveys/wellpathpy_deviation.csv", project, well="Quill 1")
    before = stations()
    other = b"MD (m),Inc (deg),Azi (deg)\n100,1,2\n200,3,4\n"
    waiting = land(project, other, "other.csv", well="Quill 1")
    (question,) = findings_of(waiting.upload.answer, "question")
    assert (question["id"], question["options"]) == ("replace:survey:Quill 1", ["replace", "keep"])
    assert stations() == before
    kept = land(project, other + b"\n", "other2.csv", well="Quill 1", answers={"replace:survey:Quill 1": "keep"})
    assert kept.report is not None
    assert stations() == before
    land(project, other + b"\n\n", "other3.csv", well="Quill 1", answers={"replace:survey:Quill 1": "replace"})
    assert stations() == [(100, 1, 2), (200, 3, 4)]
    assert AuditEntry.objects.filter(action="well.survey_replaced").count() == 1


ALCOR_TOPS = "tops/Tops_Alcor14.csv"


def test_tops_by_true_depth_ask_for_unit_and_path():
    assert questions(ALCOR_TOPS, well="Alcor 1") == {"unit:B": ["m", "ft"], "vertical:Alcor 1": ["vertical well"]}


def test_tops_by_true_depth_of_a_vertical_well():
    bring_in(ALCOR_TOPS, well="Alcor 1", answers={"unit:B": "ft", "vertical:Alcor 1": "vertical well"})
    table = pd.read_csv(REAL / ALCOR_TOPS)
    found = dict(FormationTop.objects.values_list("name", "top_md_m"))
    assert found == {name: pytest.approx(tvd * FOOT) for name, tvd in zip(table["Top"], table["TVD"], strict=True)}


def test_tops_by_true_depth_are_placed_along_the_survey():
    project = ProjectFactory()
    survey = b"MD (ft),Inc (deg),Azi (deg)\n0,0,0\n5000,0,0\n6000,30,45\n20000,30,45\n"
    land(project, survey, "survey.csv", well="Alcor 1")
    bring_in(ALCOR_TOPS, project, well="Alcor 1", answers={"unit:B": "ft"})
    build = 1000 * np.sin(np.radians(30)) / np.radians(30)  # vertical part of an arc of 1000 ft from 0 to 30 degrees
    for name, tvd in pd.read_csv(REAL / ALCOR_TOPS)[["Top", "TVD"]].itertuples(index=False):
        measured = 6000 + (tvd - 5000 - build) / np.cos(np.radians(30))
        assert FormationTop.objects.get(name=name).top_md_m == pytest.approx(measured * FOOT, abs=1e-3)


TOPS = ["4900521053", "4900527774", "UWI_4900523595", "UWI_4900523535"]


@pytest.mark.parametrize("name", TOPS)
def test_tops_and_porosity_text_in_both_dialects(name):
    path = f"tops/{name}.tops"
    landed = bring_in(path)
    text = (REAL / path).read_text()
    tops, porosity = re.split(r"[#%] Porosity\n", text.split("Formations\n")[1])
    expected = {}
    for line in tops.splitlines():
        top, depth = re.split(r"[\t,](?=[-\d.]+$)", line)
        if depth != "-999.25":
            expected[top] = pytest.approx(float(depth) * FOOT)
    assert dict(FormationTop.objects.values_list("name", "top_md_m")) == expected
    first = text[: text.index("Porosity\n")].count("\n") + 2
    lines = [re.split(r"[\t,]", line) for line in porosity.splitlines()]
    stored = {address: row for (_, address), row in cells_of(landed.report).items()}
    assert set(stored) == {f"B{first + at}" for at in range(len(lines))}
    for at, (depth, value) in enumerate(lines):
        row = stored[f"B{first + at}"]
        sample = Sample.objects.get(pk=row["analysis__sample_id"])
        assert (row["analyte__code"], row["value"], row["value_reported"]) == ("PHI", float(value), value)
        assert (sample.top_md_m, sample.top_reported) == (pytest.approx(float(depth) * FOOT), depth)
    well = Well.objects.get()
    ground, total = (float(re.search(rf"{what}: ([\d.]+) FT", text)[1]) * FOOT for what in ("GL", "TD"))
    assert well.uwi == name.removeprefix("UWI_")
    assert (well.ground_elevation_m, well.td_md_m) == (pytest.approx(ground), pytest.approx(total))


def test_a_missing_top_is_said():
    landed = bring_in("tops/4900527774.tops")
    notes = [f for f in findings_of(landed.upload.answer, "note") if f["code"] == "null_code"]
    assert [note["cell"] for note in notes] == ["B7", "B10"]
    assert FormationTop.objects.count() == 5


def test_porosity_as_fraction_is_asked():
    text = "# UNITS: M\n# Formations\nCody,812.5\n# Porosity\n810.0,0.184\n812.0,0.15\n"
    waiting = land(ProjectFactory(), text, "UWI_4900500001.tops")
    assert [f["id"] for f in findings_of(waiting.upload.answer, "question")] == ["unit:porosity"]
    landed = land(ProjectFactory(), text, "UWI_4900500001.tops", answers={"unit:porosity": "fraction"})
    assert list(Result.objects.filter(analysis__report=landed.report).values_list("value", flat=True)) == [18.4, 15]
    assert FormationTop.objects.get().top_md_m == 812.5


CORE = "core_analysis/7121_8-1__ROCK_AND_CORE__CORE_CONV_RAW_1.SPWLA"
CORE_FIELDS = ["KAIR", "KLINK", "KVERT", "KLINK_V", "PHI", "PHI_V", "PHI_SUM", "SO", "SW", "RHOG"]


def core_records():
    """(line of the values, depth, sample number, values) of every record 40, by counting lines alone."""
    lines = (REAL / CORE).read_text().split("\n")
    found, depth = [], None
    for at, line in enumerate(lines):
        if re.match(r"30 +1 *$", line):
            depth = lines[at + 1].split()
        if re.match(r"40 +1 +10 *$", line):
            found.append((at + 2, depth[0], depth[2], lines[at + 1].split()))
    return found


def test_core_interchange_text_every_value():
    landed = bring_in(CORE)
    expected = {}
    for line, depth, label, numbers in core_records():
        for at, text in enumerate(numbers):
            if float(text) != -1002:
                expected["ABCDEFGHIJ"[at] + str(line)] = (CORE_FIELDS[at], text, depth, label)
    stored = {address: row for (_, address), row in cells_of(landed.report).items()}
    assert set(stored) == set(expected)
    depths = dict(Sample.objects.values_list("pk", "top_reported"))
    labels = dict(Sample.objects.values_list("pk", "label"))
    for address, row in stored.items():
        code, text, depth, label = expected[address]
        assert (row["analyte__code"], row["value"], row["value_reported"]) == (code, float(text), text)
        assert (depths[row["analysis__sample_id"]], labels[row["analysis__sample_id"]]) == (depth, label)


def test_core_interchange_text_two_passes_and_what_stands_beside():
    landed = bring_in(CORE)
    tops = sorted(Sample.objects.values_list("top_md_m", flat=True))
    assert (len(tops), tops[0], tops[-1]) == (328, 1918.05, 1983.70)
    assert set(Sample.objects.values_list("kind", flat=True)) == {"plug"}
    first_pass = Result.objects.filter(
        analyte__code__in=["PHI_V", "SO"]
    )  # as the file names its sixth and eighth value
    assert first_pass.count() == 128
    density = Result.objects.filter(analyte__code="RHOG").values_list("value", flat=True)
    assert (len(density), round(min(density), 3), round(max(density), 3)) == (263, 2.425, 3.268)
    run = CoreRun.objects.get()
    assert (run.number, run.top_md_m, run.base_md_m) == (1, 1918.0, 1983.72)
    assert (Well.objects.get().name, str(landed.report.laboratory), str(landed.report.reported_on)) == (
        "7121/8-1",
        "Weatherford Labs",
        "2009-02-18",
    )
    assert Analysis.objects.exclude(remark="").count() == 264
    assert "depth_unit_told" in {f["code"] for f in findings_of(landed.upload.answer, "note")}


def test_a_result_of_core_text_shows_its_line():
    bring_in(CORE)
    result = Result.objects.filter(analyte__code="SO").order_by("analysis__line").first()
    shown = extract(result)
    line = next(line for line in shown.lines if line.number == result.analysis.line)
    assert "14.78718" in [cell.text for cell in line.cells]


def test_core_gamma_every_cell():
    path = "core_analysis/CoreGR_Alcor1.csv"
    landed = bring_in(path, well="Alcor 1", answers={"unit:A": "ft"})
    columns = {"B": ("GR", 1.0), "C": ("TH", 1.0), "D": ("U", 1.0), "E": ("K", 10_000.0)}
    check_every_cell(path, landed, 2, columns)
    assert set(Analysis.objects.values_list("method__code", flat=True)) == {"gamma"}
    assert landed.upload.answer["tables"][0]["kind"] == "gamma"
    assert Analysis.objects.count() == 175


def log_columns(content, wrapped):
    """{mnemonic: array} of a LAS text by splitting its lines; the null value of the header as NaN."""
    text = content.decode("utf-8").replace("\r\n", "\n")
    null = float(re.search(r"NULL\s*\.\s*(-[\d.]+)", text)[1])
    block = re.search(r"~C[^\n]*\n(.*?)\n~", text, re.S)[1]
    names = [
        re.match(r"\s*(\S+?)\s*\.", line)[1]
        for line in block.split("\n")
        if line.strip() and not line.lstrip().startswith("#")
    ]
    data = text[re.search(r"^~A.*$", text, re.M).end() :]
    numbers = np.array(data.split(), dtype=float) if wrapped else np.loadtxt(io.StringIO(data)).ravel()
    numbers[numbers == null] = np.nan
    return {name: numbers.reshape(-1, len(names))[:, at] for at, name in enumerate(names)}


LOGS = {
    "las/6038187_v1.2.las": (["GAMN"], ("Scorpio E1", "6038-187"), False),
    "las/ALMA_3_first600rows.las": (["GR"], ("EXXONMOBIL ET AL ALMA 3", "303N764340060300"), False),
    "las/P-135_first700steps.LAS": (["GR", "POTA", "THOR", "URAN"], ("Eastrock Lauren #1", "435655"), True),
}


@pytest.mark.parametrize("path", LOGS)
def test_log_every_gamma_reading(path):
    names, well, wrapped = LOGS[path]
    landed = bring_in(path)
    expected = log_columns((REAL / path).read_bytes(), wrapped)
    curves = {curve.mnemonic: curve for curve in LogCurve.objects.all()}
    assert sorted(curves) == sorted(names)
    for name, curve in curves.items():
        depths, values = curve.arrays()
        np.testing.assert_array_equal(depths, next(iter(expected.values())))
        np.testing.assert_array_equal(values, expected[name])
        assert (curve.count, curve.top_md_m, curve.base_md_m) == (len(depths), depths[0], depths[-1])
        assert (curve.report, curve.depth_unit_reported) == (landed.report, "m")
    assert (Well.objects.get().name, Well.objects.get().uwi) == well
    assert landed.upload.answer["counts"]["curves"] == len(names)


def test_what_a_log_header_says_of_its_well():
    bring_in("las/P-135_first700steps.LAS")
    well = Well.objects.get()
    assert (well.datum_kind, well.datum_elevation_m, well.ground_elevation_m, well.operator) == (
        "KB",
        123,
        119,
        "Eastrock Resources LTD.",
    )
    assert well.latitude == pytest.approx(45 + 39 / 60 + 26.518 / 3600)  # the degree sign of the file is corrupted
    assert well.longitude == pytest.approx(-(64 + 0 / 60 + 51.347 / 3600))
    bring_in("las/ALMA_3_first600rows.las")
    alma = Well.objects.get(uwi="303N764340060300")
    assert (alma.datum_kind, alma.datum_elevation_m, alma.field) == ("RT", 56.700001, "ALMA")


def test_a_log_of_a_held_well_completes_it_and_overwrites_nothing():
    project = ProjectFactory()
    held = Well.objects.create(
        project=project, name="P-135", name_key="p 135", operator="Ridge", datum_kind="KB", datum_elevation_m=120
    )
    landed = bring_in("las/P-135_first700steps.LAS", project, well="P-135", create_wells=False)
    held.refresh_from_db()
    assert (held.operator, held.datum_elevation_m, held.field, held.uwi) == ("Ridge", 120, "Lauren", "")
    assert set(LogCurve.objects.values_list("well", flat=True)) == {held.pk}
    codes = [finding["code"] for finding in landed.upload.answer["findings"]]
    assert codes.count("well_differs") == 2
    assert "well_named_otherwise" in codes
    assert AuditEntry.objects.filter(action="well.completed").count() == 1


def test_a_log_of_an_unknown_well_is_refused():
    landed = land(ProjectFactory(), (REAL / "las/6038187_v1.2.las").read_bytes(), "a.las", create_wells=False)
    assert [f["code"] for f in findings_of(landed.upload.answer, "error")] == ["unknown_well"]


def test_negative_gamma_is_pointed_out():
    landed = bring_in("las/6038187_v1.2.las")
    (warning,) = findings_of(landed.upload.answer, "warning")
    assert (warning["code"], warning["message"].split(" are ")[0]) == ("negative_gamma", "200 readings of GAMN")
