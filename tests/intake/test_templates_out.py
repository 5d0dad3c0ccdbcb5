"""Our own empty workbooks come back in, filled in, with no question asked."""

import io
import json

import pytest
from django.core.management import call_command
from openpyxl import load_workbook

from labdata.errors import NotFound
from labdata.intake import templates_out
from labdata.intake.fields import field_types
from labdata.intake.templates_out import HEAD_ROW, analytes, build, methods
from tests.factories import ProjectFactory
from tests.intake.landing import entry

CODES = [code for code, _ in methods()]
IDENTITY = ["WELL", "SAMPLE", "TOP", "BASE", "KIND", "FORMATION", "REPLICATE", "LAB_NO"]


def filled(method, values=lambda code, row: None, unit_of=lambda code: None):
    """The template with two rows of plain numbers, or of what ``values`` says."""
    book = load_workbook(io.BytesIO(build(method)))
    sheet = book["Results"]
    for row, text in enumerate(["North Lab", "NL-17", None, "2026-03-01"], start=2):
        sheet.cell(row, 2, text)
    for at in range(2):
        row = HEAD_ROW + 2 + at
        for column, value in enumerate(
            ["Quill 1", f"S-{at}", 2000 + at, 2000.5 + at, "core plug", "Shale", 1, f"L{at}"], 1
        ):
            sheet.cell(row, column, value)
        for column, code in enumerate(analytes(method), start=9):
            plain = 420 + at if code == "TMAX" else 2.65 if code in {"RHOG", "RHOB"} else 0.5 + at / 10
            sheet.cell(row, column, values(code, at) or plain)
            sheet.cell(HEAD_ROW + 1, column, unit_of(code) or sheet.cell(HEAD_ROW + 1, column).value)
    out = io.BytesIO()
    book.save(out)
    return out.getvalue()


@pytest.mark.django_db
@pytest.mark.parametrize("method", CODES)
def test_a_filled_template_comes_back_with_no_question(method):
    answer = entry(ProjectFactory(), filled(method), name="from the lab.xlsx", well="")
    assert answer["outcome"] == "imported", answer["findings"]
    (table,) = answer["tables"]
    read = {one["field"]: one["unit"] for one in table["columns"]}
    assert list(read) == [*IDENTITY, *analytes(method), "REMARK"]
    assert {code: read[code] for code in analytes(method)} == {
        code: field_types()[code].unit for code in analytes(method)
    }
    assert (read["TOP"], read["BASE"], table["kind"], table["unmapped"]) == ("m", "m", method, [])
    assert min(one["confidence"] for one in table["columns"]) >= 0.7
    counts = answer["counts"]
    assert (counts["analyses"], counts["samples_new"]) == (2, 2)
    assert counts["results"] == 2 * len(analytes(method))


@pytest.mark.django_db
def test_chosen_units_limits_and_the_report_s_number_are_read():
    def limits(code, row):
        return "<0.05" if code == "TS" and row else None

    content = filled("carbon", limits, lambda code: "mg/g" if code == "TOC" else None)
    answer = entry(ProjectFactory(), content, name="from the lab.xlsx", well="")
    units = {one["field"]: one["unit"] for one in answer["tables"][0]["columns"]}
    assert (units["TOC"], answer["counts"]["qualified"], answer["report"]) == ("mg/g", 1, "NL-17")
    assert answer["outcome"] == "imported"


@pytest.mark.parametrize("method", CODES)
def test_kinds_and_units_are_chosen_from_lists(method):
    sheet = load_workbook(io.BytesIO(build(method)))["Results"]
    rules = {str(rule.sqref): rule.formula1 for rule in sheet.data_validations.dataValidation}
    assert all(len(options) < 256 for options in rules.values())  # the most that a spreadsheet takes
    assert "core plug" in rules[f"E{HEAD_ROW + 2}:E2000"]
    assert rules[f"C{HEAD_ROW + 1}"] == '"m,ft"'
    assert len(rules) == 3 + len(analytes(method))
    assert f"I{HEAD_ROW + 1}" in rules


@pytest.mark.django_db
def test_an_empty_template_is_not_taken_for_results():
    answer = entry(ProjectFactory(), build("carbon"), name="empty.xlsx", well="")
    assert (answer["outcome"], answer["findings"][0]["code"]) == ("refused", "no_rows")


def test_the_command_writes_one(tmp_path, capsys):
    call_command("template", "core", "--out", str(tmp_path / "core.xlsx"), "--json")
    assert json.loads(capsys.readouterr().out)["bytes"] == (tmp_path / "core.xlsx").stat().st_size
    with pytest.raises(SystemExit):
        call_command("template", "alchemy", "--out", str(tmp_path / "x.xlsx"), "--json")
    assert "pyrolysis" in json.loads(capsys.readouterr().out)["error"]["remedy"]


def test_an_unknown_method_is_named():
    with pytest.raises(NotFound, match="alchemy"):
        templates_out.build("alchemy")
