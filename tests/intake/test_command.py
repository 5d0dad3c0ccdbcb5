"""``manage.py intake`` as it is called from outside: one JSON object, exit status, nothing written by a dry run."""

import json

import pytest
from django.core.management import CommandError, call_command

from labdata.models import Project, Report, Upload, Well

pytestmark = pytest.mark.django_db(transaction=True)
TABLE = "Sample,Depth (m),TOC (wt%),S2 (mg/g)\nA,10,1.25,<0.05\nB,11,,3\n"
COUNTS = {
    "wells_new": 1,
    "samples_new": 2,
    "samples_matched": 0,
    "analyses": 2,
    "results": 3,
    "qualified": 1,
    "blank": 1,
}


def run(capsys, *arguments):
    """(exit status, answer) of the command."""
    status = 0
    try:
        call_command("intake", *map(str, arguments), "--json")
    except SystemExit as ended:
        status = ended.code
    return status, json.loads(capsys.readouterr().out)


@pytest.fixture
def table(tmp_path):
    path = tmp_path / "KG-9.csv"
    path.write_text(TABLE)
    return path


def test_a_file_in_through_the_job_and_held_the_second_time(table, capsys):
    arguments = (table, "--project", "basin", "--create-project", "--create-wells", "--well", "Quill 1", "--lab", "Own")
    status, answer = run(capsys, *arguments)
    (file,) = answer["files"]
    assert (status, file["outcome"], file["report"]) == (0, "imported", "KG-9")
    assert {key: file["counts"][key] for key in COUNTS} == COUNTS
    assert set(file) == {"file", "sha256", "outcome", "upload", "report", "seconds", "tables", "counts", "findings"}
    assert Report.objects.get().laboratory.name == "Own"
    status, again = run(capsys, *arguments)
    assert (status, again["files"][0]["outcome"], Report.objects.count()) == (0, "already_held", 1)


def test_a_dry_run_answers_the_same_and_writes_nothing(table, capsys):
    Project.objects.create(slug="basin", name="Basin")
    arguments = (table, "--project", "basin", "--create-wells", "--well", "Quill 1")
    _, dry = run(capsys, *arguments, "--dry-run")
    assert not Upload.objects.exists() and not Well.objects.exists()
    _, wet = run(capsys, *arguments)
    for answer in (dry, wet):
        answer["files"][0].update(upload=None, seconds=0)
    assert dry == wet


def test_answers_come_from_a_file(tmp_path, capsys):
    path, answers = tmp_path / "x.csv", tmp_path / "answers.json"
    path.write_text("Depth,TOC\n100,0.01\n")
    answers.write_text('{"unit:A": "feet", "unit:B": "fraction"}')
    arguments = (path, "--project", "basin", "--create-project", "--create-wells", "--well", "Quill 1")
    status, waiting = run(capsys, *arguments)
    assert (status, waiting["files"][0]["outcome"]) == (1, "waiting")
    status, done = run(capsys, *arguments, "--answers", answers)
    assert (status, done["files"][0]["outcome"]) == (0, "imported")


def test_a_project_that_does_not_exist_is_refused(table, capsys):
    status, answer = run(capsys, table, "--project", "nowhere")
    assert (status, answer["error"]["code"]) == (1, "not_found")


def test_a_wrong_file_name_is_said_before_any_file_is_taken_in(table, capsys):
    arguments = (table, table.with_name("gone.csv"), "--project", "basin", "--create-project", "--well", "Quill 1")
    with pytest.raises(CommandError, match=r"gone\.csv» cannot be opened") as wrong:
        run(capsys, *arguments)
    assert wrong.value.returncode == 2
    assert not Upload.objects.exists()
