"""Long rows and wide rows say what the database holds."""

import pyarrow as pa
import pytest

from labdata.models import Analysis, Result, SurveyStation
from labdata.release.columns import IDENTITY, LONG, cell_address, column_letters
from labdata.release.rows import long_table
from labdata.release.selection import as_ranges
from labdata.release.shapes import long, usable, wide, with_rejected
from qc.models import Flag, QcRun, QcRunWell, RuleSet, Severity
from qc.review.services import Choice, decide
from tests.release.scene import bare_scene, signed_scene, small_scene

pytestmark = [pytest.mark.both, pytest.mark.django_db]
CONTRACT = (
    "project, well, uwi, sample, kind, formation, top_m, base_m, tvd_top_m, tvd_base_m, depth_reported, "
    "depth_unit_reported, lab, report, report_version, method, replicate, analyte, value, qualifier, unit, "
    "value_reported, unit_reported, verdict, reason, decided_by, decided_at, signed_by, signed_at, flags, file_sha256, "
    "sheet, cell"
)


def row_of(project, analysis, code):
    [row] = [
        row for row in long_table(project).to_pylist() if row["analysis"] == analysis.pk and row["analyte"] == code
    ]
    return row


def test_the_long_columns_are_those_of_the_contract():
    assert ", ".join(LONG.names) == CONTRACT


@pytest.mark.parametrize(("number", "letters"), [(1, "A"), (26, "Z"), (27, "AA"), (52, "AZ"), (703, "AAA")])
def test_column_letters(number, letters):
    assert column_letters(number) == letters


@pytest.mark.parametrize(("orientation", "cell"), [("rows", "F17"), ("columns", "Q6")])
def test_a_cell_is_named_by_the_orientation_of_its_table(orientation, cell):
    assert cell_address(6, 17, orientation) == cell


def test_every_current_result_is_a_row_with_what_the_models_say():
    scene = small_scene()
    table = long_table(scene.project)
    assert table.num_rows == Result.objects.count()
    for row in table.to_pylist():
        result = Result.objects.get(pk=row["result"])
        analysis, sample = result.analysis, result.analysis.sample
        assert (row["project"], row["well"], row["uwi"]) == (scene.project.slug, sample.well.name, sample.well.uwi)
        assert (row["sample"], row["kind"], row["formation"]) == (sample.label, sample.kind, sample.formation)
        assert (row["top_m"], row["base_m"]) == (sample.top_md_m, sample.base_md_m)
        assert row["depth_reported"] == f"{sample.top_reported} - {sample.base_reported}"
        assert (row["lab"], row["report"]) == (analysis.laboratory.name, analysis.report.number)
        assert (row["method"], row["replicate"]) == (analysis.method.code, analysis.replicate)
        assert (row["analyte"], row["unit"]) == (result.analyte.code, result.analyte.unit)
        assert (row["value"], row["qualifier"]) == (result.value, result.qualifier)
        assert row["value_reported"] == result.value_reported
        assert row["unit_reported"] == result.column.unit_reported
        assert row["file_sha256"] == analysis.report.source_file.sha256
        assert row["cell"] == cell_address(result.column.line, analysis.line, "rows")
        assert (row["verdict"], row["signed_by"], row["signed_at"]) == ("undecided", "", None)


def test_samples_along_the_columns_turn_the_address():
    scene = bare_scene()
    well, held = scene.well("Quill 3")
    analysis = scene.analysis(held, (scene.table("columns"), 17), scene.sample(well, 2000), "pyrolysis", {"S2": 4})
    row = row_of(scene.project, analysis, "S2")
    assert row["cell"] == cell_address(scene.result(analysis, "S2").column.line, 17, "columns") == "Q6"


def test_superseded_results_are_not_working_data():
    scene = small_scene()
    first = Analysis.objects.order_by("pk").first()
    first.results.update(current=False)
    Analysis.objects.filter(pk=first.pk).update(current=False)
    assert first.pk not in long_table(scene.project)["analysis"].to_pylist()


def test_another_project_stays_out():
    scene, other = small_scene(), small_scene()
    assert set(long_table(scene.project)["project"].to_pylist()) == {scene.project.slug}
    assert long_table(other.project).num_rows == long_table(scene.project).num_rows


def test_a_reference_material_is_a_row_without_a_well():
    scene = small_scene()
    some = Analysis.objects.order_by("pk").first()
    control = Analysis.objects.create(
        project=scene.project, method=some.method, report=some.report, table=some.table, line=90, role="reference",
        lab_number="STD 7",
    )  # fmt: skip
    column = some.results.first().column
    Result.objects.create(
        analysis=control, analyte=some.results.first().analyte, column=column, value=1.0, value_reported="1.0"
    )
    row = row_of(scene.project, control, some.results.first().analyte.code)
    assert (row["well"], row["sample"], row["kind"], row["top_m"]) == ("", "STD 7", "reference", None)


def test_verdict_reason_and_who_decided_stand_in_the_row():
    scene = small_scene()
    held = scene.sets[0]
    analysis = held.analyses.filter(method__code="pyrolysis").first()
    result = scene.result(analysis, "S1")
    geochemist = scene.person("geochemist")
    decide(user=geochemist, review_set=held, choices=[Choice(result.pk, "accepted")])
    decide(user=geochemist, review_set=held, choices=[Choice(result.pk, "rejected", "other", "torn bag")])
    row = row_of(scene.project, analysis, "S1")
    assert (row["verdict"], row["reason"], row["decided_by"]) == ("rejected", "other: torn bag", geochemist.username)
    assert row["decided_at"] == result.decisions.order_by("-pk").first().decided_at


def flag(scene, run, **about):
    Flag.objects.create(
        run=run, family="validity", severity=Severity.WARN, message="look", source="made up", fingerprint="f", **about
    )


def test_flags_of_the_latest_run_are_named_once_each():
    scene = small_scene()
    held = scene.sets[0]
    analysis = held.analyses.filter(method__code="pyrolysis").first()
    rules, _ = RuleSet.objects.get_or_create(name="standard", version=1, project=None, defaults={"thresholds": {}})
    old, new = (QcRun.objects.create(project=scene.project, rule_set=rules) for _ in range(2))
    for run in (old, new):
        QcRunWell.objects.create(run=run, well=held.well)
    tmax = scene.result(analysis, "TMAX")
    about = {"well": held.well, "analysis": analysis}
    flag(scene, old, rule="long_gone", result=tmax, **about)
    flag(scene, new, rule="tmax_range", result=tmax, **about)
    flag(scene, new, rule="tmax_range", analyte="TMAX", **about)
    flag(scene, new, rule="sample_sequence", **about)
    flag(scene, new, rule="of_the_well", well=held.well)
    assert row_of(scene.project, analysis, "TMAX")["flags"] == "sample_sequence,tmax_range"
    assert row_of(scene.project, analysis, "S1")["flags"] == "sample_sequence"


def test_true_vertical_depth_where_there_is_a_survey():
    scene = small_scene()
    well = scene.sets[0].well
    for md, inclination in ((0, 60), (4000, 60)):
        SurveyStation.objects.create(well=well, md_m=md, inclination_deg=inclination, azimuth_deg=90)
    for row in long_table(scene.project).to_pylist():
        expected = row["top_m"] / 2 if row["well"] == well.name else None
        assert row["tvd_top_m"] == (expected if expected is None else pytest.approx(expected))


def test_an_index_goes_with_toc_measured_apart_on_the_same_sample():
    scene = small_scene()
    held = scene.sets[0]
    sample = held.analyses.first().sample
    toc = Result.objects.get(analysis__sample=sample, analyte__code="TOC")
    scene.accept(held, {toc.pk: "measurement"})
    lost = [row for row in long_table(scene.project).to_pylist() if row["lost_inputs"]]
    assert [(row["sample"], row["analyte"], row["lost_inputs"]) for row in lost] == [(sample.label, "HI", "TOC")]


def test_the_usable_view_leaves_out_rejected_undecided_and_orphaned_values():
    scene = signed_scene()
    table = long_table(scene.project)
    rows = usable(table).to_pylist()
    assert len(rows) == 28
    assert not [
        row for row in rows if row["well"] == "Quill 1" and row["sample"] == "S-0" and row["analyte"] in {"S2", "HI"}
    ]
    more = with_rejected(table).to_pylist()
    assert [row["analyte"] for row in more if row["verdict"] == "rejected"] == ["S2"]
    assert len(more) == 29


def test_a_wide_row_is_an_analysis_and_a_column_an_analyte():
    scene = signed_scene()
    table = usable(long_table(scene.project))
    broad = wide(table)
    assert broad.column_names == [*IDENTITY, "analysis", "TOC", "S1", "S1_qualifier", "S2", "TMAX", "HI"]
    assert broad.num_rows == 12
    by_analysis = {row["analysis"]: row for row in broad.to_pylist()}
    for row in table.to_pylist():
        cell = by_analysis[row["analysis"]]
        assert cell[row["analyte"]] == row["value"]
        assert cell.get(f"{row['analyte']}_qualifier", "") == row["qualifier"]
    held = sum(row[code] is not None for row in broad.to_pylist() for code in ("TOC", "S1", "S2", "TMAX", "HI"))
    assert held == table.num_rows


def test_wide_working_data_say_which_values_are_not_accepted():
    scene = small_scene()
    row = wide(long_table(scene.project)).to_pylist()[0]
    assert {row[name] for name in row if name.endswith("_verdict")} <= {"undecided", ""}
    assert "TOC_verdict" in row


def test_no_rows_is_a_table_too():
    scene = bare_scene()
    table = long_table(scene.project)
    assert (table.num_rows, long(table).schema.names) == (0, LONG.names)
    assert isinstance(wide(table), pa.Table)


@pytest.mark.parametrize(("ids", "ranges"), [
    ([], []), ([4], [(4, 4)]), ([1, 2, 3, 7, 8, 10], [(1, 3), (7, 8), (10, 10)]),
])  # fmt: skip
def test_ids_as_ranges(ids, ranges):
    assert as_ranges(ids) == ranges
