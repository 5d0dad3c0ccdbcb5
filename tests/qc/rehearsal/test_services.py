"""The rehearsal of a project: a job whose result is the answer, and nothing else in the database changes."""

import io
import json

import pytest
from django.core.management import call_command
from django.db import connection

from labdata.errors import NotAllowed
from labdata.jobs import run_here
from labdata.models import Job, JobState, Result
from qc.models import Decision, Flag, QcRun, Verdict
from qc.rehearsal import run as rehearsal
from qc.rehearsal import services
from qc.rehearsal.faults import KINDS
from qc.rehearsal.services import accepted_faults, drawn_wells, last_rehearsal, start_rehearsal, waiting_rehearsal
from tests.factories import MembershipFactory, ProjectFactory
from tests.qc.rehearsal.wells import records
from tests.qc.storing import decide, store

pytestmark = pytest.mark.django_db(transaction=True)
QUICK = ("index_digits",)
NAMES = ("Quill 1", "Brill 7")
JOB_TABLES = {"labdata_job", "labdata_jobevent"}


@pytest.fixture(autouse=True)
def quick(monkeypatch):
    monkeypatch.setattr(rehearsal, "KINDS", tuple(kind for kind in KINDS if kind.id in QUICK))


@pytest.fixture
def project():
    listed = [{**record, "well": NAMES[record["well"]]} for record in records(per_unit=6)]
    return store(listed, wells={name: {"td_md_m": 2405.0} for name in NAMES})


def counts() -> dict[str, int]:
    """Rows of every table but those of jobs."""
    found = {}
    with connection.cursor() as cursor:
        for table in sorted(set(connection.introspection.table_names()) - JOB_TABLES):
            cursor.execute(f'SELECT COUNT(*) FROM "{table}"')
            found[table] = cursor.fetchone()[0]
    return found


def call(*words):
    out = io.StringIO()
    call_command("rehearse", *words, stdout=out, stderr=io.StringIO())
    return out.getvalue()


def test_the_command_prints_one_json_object_and_writes_nothing_but_its_job(project):
    before, values = counts(), list(Result.objects.order_by("pk").values_list("pk", "value", "value_reported"))
    told = json.loads(call("--project", project.slug, "--seed", "2", "--json"))
    assert told.keys() == {"project", "rule_set", "wells", "seed", "kinds", "false_alarms"}
    assert (told["project"], told["seed"], told["wells"]) == (project.slug, 2, {"rehearsed": 2, "with_analyses": 2})
    assert {entry["kind"] for entry in told["kinds"]} == set(QUICK)
    strong = next(one for one in told["kinds"] if (one["kind"], one["strength"]) == ("index_digits", "strong"))
    assert strong["caught"] == strong["injected"] > 0
    assert strong["rules"]["index_recalc"] == strong["caught"]
    after = counts()
    made_by_rules = {table for table in after if after[table] != before[table]}
    assert made_by_rules <= {"qc_ruleset"}
    assert list(Result.objects.order_by("pk").values_list("pk", "value", "value_reported")) == values
    assert not Flag.objects.exists()
    assert not QcRun.objects.exists()
    assert last_rehearsal(project).result == told


def test_the_command_for_people_and_its_refusals(project):
    text = call("--project", project.slug)
    assert "index_digits" in text
    assert "False alarms" in text
    for words, status in [(("--project", "nowhere"), 1), (("--project", project.slug, "--repeats", "0"), 2)]:
        with pytest.raises((SystemExit, Exception)) as stop:
            call(*words)
        assert getattr(stop.value, "code", None) == status or getattr(stop.value, "returncode", None) == status
    with pytest.raises(SystemExit):
        call("--project", ProjectFactory().slug)


def test_asking_needs_the_right_and_asks_once(project):
    interpreter = MembershipFactory(project=project, role="interpreter").user
    with pytest.raises(NotAllowed):
        start_rehearsal(project, interpreter)
    analyst = MembershipFactory(project=project, role="analyst").user
    job = start_rehearsal(project, analyst)
    assert start_rehearsal(project, analyst) == job
    assert waiting_rehearsal(project) == job
    assert run_here(job).state == JobState.SUCCEEDED
    assert waiting_rehearsal(project) is None
    assert Job.objects.filter(kind="rehearse").count() == 1


def test_accepted_faults_are_those_of_standing_decisions(project):
    first, second, third = Result.objects.filter(analyte__code="S2").order_by("pk")[:3]
    decide(first, Verdict.REJECTED)
    decide(second, Verdict.ACCEPTED)
    decide(third, Verdict.REJECTED)
    decide(third, Verdict.ACCEPTED)
    wells, _ = drawn_wells(project, seed=1)
    assert accepted_faults(wells) == {first.analysis.sample_id}
    assert Decision.objects.count() == 4


def test_a_large_project_is_rehearsed_on_a_draw_of_its_wells(project, monkeypatch):
    monkeypatch.setattr(services, "ANALYSES_MAX", 1)
    chosen, known = drawn_wells(project, seed=1, analyses_max=1)
    assert (len(chosen), known) == (1, 2)
    assert drawn_wells(project, seed=1, analyses_max=1)[0] == chosen
    assert len(drawn_wells(project, seed=1)[0]) == 2
