"""Panels and controls from stored analyses, and the flags that a failing control lays on what it brackets."""

import pytest

from labdata.jobs import run_here
from labdata.models import Analysis, Analyte, Laboratory, Method, ReferenceMaterial, Result, SourceColumn, SourceTable
from qc.models import QcRun
from qc.services import start_run
from qc.tables import read
from tests.qc.storing import store

pytestmark = pytest.mark.django_db(transaction=True)


def add_control(project, line, value, *, material=None, role="reference", analyte="TOC"):
    """A control row in the one table of the project."""
    table = SourceTable.objects.get(report__project=project)
    code = Analyte.objects.get(code=analyte, project=None)
    laboratory, _ = Laboratory.objects.get_or_create(project=project, name="Ninefold")
    made = Analysis.objects.create(
        project=project, reference_material=material, method=Method.objects.get(code=table.kind), report=table.report,
        table=table, line=line, role=role, laboratory=laboratory,
    )  # fmt: skip
    column = SourceColumn.objects.get(table=table, field=analyte)
    return Result.objects.create(
        analysis=made, analyte=code, column=column, value=value, value_reported=str(value), decimals=2
    )


def flags(project, rule):
    job = run_here(start_run(project, None, None))
    assert job.state == "succeeded", f"{job.error_message} {job.error_detail}"
    return list(QcRun.objects.get(pk=job.result["run"]).flags.filter(rule=rule))


def test_elements_are_read_as_a_table_of_their_own_and_flagged_in_their_cells():
    project = store(
        [{"label": "E-1", "top_m": 2000.0, "P2O5": "2.5", "CAO": "2.9"}, {"label": "E-2", "top_m": 2010.0, "CAO": "9.0"}],
        method="elements",
    )  # fmt: skip
    table = read([project.wells.get()])
    assert list(table.panels) == ["elements"]
    assert list(table.panel("elements", "CAO", "P2O5")["CAO"]) == [2.9, 9.0]
    flag = flags(project, "apatite_ca_floor")[0]
    assert (flag.analyte, flag.value, flag.result.analyte.code) == ("CAO", 2.9, "CAO")
    assert {one["analyte"]: one["text"] for one in flag.evidence["inputs"]} == {"P2O5": "2.5", "CAO": "2.9"}
    assert flag.evidence["inputs"][0]["unit"] == "wt%"


def test_a_failing_reference_flags_the_results_that_it_brackets():
    rock = [{"label": f"C-{n}", "top_m": 2000.0 + n, "TOC": "1.20"} for n in range(4)]
    project = store(rock, method="carbon", lines=[3, 4, 6, 7])
    material = ReferenceMaterial.objects.create(
        project=project, name="shale 7", lot="A", certificate={"TOC": [3.28, 0.14]}
    )
    add_control(project, 2, 3.90, material=material)
    add_control(project, 5, 3.30, material=material)
    add_control(project, 8, 0.0, role="blank")
    table = read([project.wells.get()])
    assert list(table.controls["value"]) == [0.0, 3.90, 3.30]
    flag = flags(project, "crm_recovery")[0]
    assert flag.severity == "warn"
    assert [name.split()[0] for name in flag.evidence["samples"]] == ["C-0", "C-1"]
    assert flag.evidence["control"]["material"] == "shale 7"
    assert flag.well == project.wells.get()
