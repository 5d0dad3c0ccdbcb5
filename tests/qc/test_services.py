"""From stored analyses to flags, and the same flags every time."""

import json

import pytest
from django.db import transaction

from labdata.errors import InvalidInput, NotAllowed, NotFound
from labdata.jobs import run_here
from labdata.models import AuditEntry, Result, Role
from qc.models import Flag, QcRun, Verdict
from qc.rules import RULES
from qc.rules.rule import FAMILIES
from qc.services import flag_entry, prepare_qc, run_answer, start_run
from qc.tables import read
from tests.factories import MembershipFactory, ProjectFactory, UserFactory, WellFactory
from tests.qc.asking import worked_set
from tests.qc.storing import decide, dismiss, store

pytestmark = pytest.mark.django_db(transaction=True)

REPORT = [
    {"well": "Quill 1", "label": "S-1", "top_m": 2000.0, "base_m": 2010.0, "S2": "0.14", "TMAX": "358", "TOC": "1.20"},
    {"well": "Quill 1", "label": "S-2", "top_m": 2010.0, "base_m": 2020.0, "S2": "5.10", "TMAX": "441", "TOC": "1.50"},
    {"well": "Brill 7", "label": "B-1", "top_m": 1800.0, "base_m": 1790.0, "S2": "2.00", "TMAX": "431", "TOC": "0.90"},
]  # fmt: skip


def run(project, wells=None):
    job = run_here(start_run(project, wells, None))
    assert job.state == "succeeded", f"{job.error_message} {job.error_detail}"
    return QcRun.objects.get(pk=job.result["run"])


def plain(made):
    """The flags of a run without the numbers that the database gave them."""
    return [
        {name: value for name, value in flag_entry(flag).items() if name != "id"} for flag in made.flags.order_by("id")
    ]


def test_a_run_keeps_flags_with_their_cells_and_an_audit_entry():
    made = run(store(REPORT))
    flag = Flag.objects.get(rule="s2_floor_for_tmax")
    assert (flag.analyte, flag.severity, flag.value) == ("TMAX", "reject-candidate", 358.0)
    assert (flag.analysis.sample.label, flag.result.analyte.code) == ("S-1", "TMAX")
    assert [one["cell"] for one in flag.evidence["inputs"]] == ["I2", "G2"]
    assert flag.evidence["parameters"]["s2_min"]["source"].startswith("from memory of Peters 1986")
    assert flag.evidence["neighbours"][0]["sample"] == "S-2"
    assert AuditEntry.objects.filter(action="qc.run", object_id=str(made.pk)).exists()


def test_the_answer_is_that_of_the_outside_contract():
    answer = json.loads(json.dumps(run_answer(run(store(REPORT)))))
    assert answer["rule_set"] == {"name": "standard", "version": 1}
    assert answer["checked"] == {"analyses": 3, "results": 9}
    assert [rule["rule"] for rule in answer["rules"]] == [rule.id for rule in RULES]
    for rule in answer["rules"]:
        assert set(rule) == {"rule", "family", "pass", "fire", "not_applicable", "cannot_evaluate"}
        assert rule["family"] in FAMILIES
        assert rule["fire"] == sum(flag["rule"] == rule["rule"] for flag in answer["flags"])
    assert set(answer["flags"][0]) == {
        "id", "rule", "family", "severity", "well", "sample", "top_m", "base_m", "method", "replicate", "analyte", "value",
        "message", "evidence", "source",
    }  # fmt: skip
    assert [flag["well"] for flag in answer["flags"]] == sorted(flag["well"] for flag in answer["flags"])
    assert "result" not in json.dumps(
        [flag["evidence"]["inputs"] for flag in answer["flags"] if flag["evidence"]["inputs"]]
    )


def test_the_same_data_give_the_same_flags_whatever_the_order_of_arrival():
    first, second = store([*REPORT, *worked_set()]), ProjectFactory()
    WellFactory(project=second, name="Aside 1")
    store(list(reversed(worked_set())), project=second, number="R-1", lines=list(range(16, 4, -1)))
    store(REPORT, project=second, number="R-1", extend=True)
    assert plain(run(first)) == plain(run(second))


def test_two_runs_share_fingerprints_and_the_latest_counts():
    project = store(REPORT)
    before, after = run(project), run(project)
    assert sorted(before.flags.values_list("fingerprint")) == sorted(after.flags.values_list("fingerprint"))
    assert set(Flag.objects.in_force().values_list("run", flat=True)) == {after.pk}
    prints = list(after.flags.values_list("fingerprint", flat=True))
    assert len(set(prints)) == len(prints)


def test_wells_are_checked_apart_when_asked():
    project = store(REPORT)
    well = project.wells.get(name="Brill 7")
    made = run(project, [well])
    assert {flag.rule for flag in made.flags.all()} == {"datum_missing_or_mixed", "depth_interval_order"}
    assert {flag.well for flag in made.flags.all()} == {well}
    assert made.analyses_checked == 1
    with pytest.raises(InvalidInput, match="No wells"):
        start_run(ProjectFactory(), [well], None)


def test_a_well_that_changed_while_it_was_read_is_checked_again():
    project = store(REPORT)
    job = start_run(project, None, None)
    commit = prepare_qc(_Silent(job))
    store([{**REPORT[2], "label": "B-2"}], project=project, number="R-2")
    with transaction.atomic():
        answer = commit()
    assert answer["again"] == [project.wells.get(name="Brill 7").pk]
    assert set(QcRun.objects.get(pk=answer["run"]).flags.values_list("well__name", flat=True)) == {"Quill 1"}


def test_fits_leave_out_rejected_values():
    project = store(worked_set())
    assert run(project).flags.filter(rule="s2_toc_outlier").count() == 1
    odd = Result.objects.get(analyte__code="S2", value=9.10)
    decide(odd, Verdict.REJECTED)
    made = run(project)
    assert not made.flags.filter(rule="s2_toc_outlier").exists()
    assert "rejected" in made.flags.get(rule="s2_toc_fit").evidence["excluded"][0]
    decide(odd, Verdict.ACCEPTED)  # the latest decision stands
    assert run(project).flags.filter(rule="s2_toc_outlier").count() == 1


def test_a_dismissed_stain_is_drawn_through_again():
    project = store([*worked_set(), {**worked_set()[5], "label": "stained", "S1": "4.00", "TMAX": "426"}])
    made = run(project)
    fit = made.flags.get(rule="s2_toc_fit")
    assert "stained" in fit.evidence["excluded"][0]
    for flag in made.flags.filter(family="contamination"):
        dismiss(flag)
    assert run(project).flags.get(rule="s2_toc_fit").evidence["fit"]["n"] == 13


def test_carbon_and_reflectance_of_the_same_sample_join():
    sample = {"label": "S-1", "top_m": 2000.0, "base_m": 2010.0}
    project = store([{**sample, "S2": "6.00", "TMAX": "450", "S1": "0.10"}])
    store([{**sample, "TOC": "2.00"}], project=project, number="R-2", method="carbon")
    store([{**sample, "RO": "0.45", "RO_N": "25"}], project=project, number="R-3", method="reflectance")
    made = run(project)
    flag = made.flags.get(rule="ro_tmax_disagreement")
    assert flag.analysis.method.code == "reflectance"
    assert flag.result.value == 0.45
    assert {one["file"] for one in flag.evidence["inputs"]} == {"R-1.csv", "R-2.csv", "R-3.csv"}


def test_the_formation_comes_from_the_tops_where_it_is_not_stated():
    project = store([{"label": "S-1", "top_m": 2000.0, "TOC": "1.0"}, {"label": "S-2", "top_m": 2100.0, "TOC": "1.0"}])
    well = project.wells.get()
    well.tops.create(name="Ashgrove Shale", top_md_m=2050.0)
    assert list(read([well]).rows["unit"]) == ["", "Ashgrove Shale"]


def test_reference_materials_and_superseded_analyses_are_not_checked():
    project = store(REPORT)
    well = project.wells.get(name="Quill 1")
    analysis = well.samples.get(label="S-1").analyses.get()
    analysis.current = False
    analysis.save()
    assert list(read([well]).rows["label"]) == ["S-2"]


def test_only_those_who_may_start_a_run():
    project = store(REPORT)
    member = MembershipFactory(project=project, role=Role.INTERPRETER)
    with pytest.raises(NotAllowed):
        start_run(project, None, member.user)
    with pytest.raises(NotFound):
        start_run(project, None, UserFactory())
    analyst = MembershipFactory(project=project, role=Role.ANALYST)
    assert run_here(start_run(project, None, analyst.user)).state == "succeeded"


def test_evidence_stays_small():
    made = run(store([*REPORT, *worked_set()]))
    assert max(len(json.dumps(flag.evidence)) for flag in made.flags.all()) < 5000


class _Silent:
    """A job's context that nobody looks at."""

    def __init__(self, job):
        self.job = job

    def tick(self, done=None, total=None, note=""):
        pass
