"""The command prints the answer of the outside contract."""

import io
import json

import pytest
from django.core.management import call_command

from tests.qc.storing import store

pytestmark = pytest.mark.django_db(transaction=True)
REPORT = [
    {"well": "Quill 1", "label": "S-1", "top_m": 2000.0, "S2": "0.14", "TMAX": "358"},
    {"well": "Brill 7", "label": "B-1", "top_m": 1800.0, "S2": "0.11", "TMAX": "431"},
]


def call(*words):
    out, err = io.StringIO(), io.StringIO()
    call_command("qc", *words, stdout=out, stderr=err)
    return out.getvalue()


def test_qc_of_a_project_and_of_one_well():
    project = store(REPORT)
    everything = json.loads(call("--project", project.slug, "--json"))
    assert {flag["well"] for flag in everything["flags"]} == {"Quill 1", "Brill 7"}
    one = json.loads(call("--project", project.slug, "--well", "QUILL-1", "--json"))
    assert {flag["well"] for flag in one["flags"]} == {"Quill 1"}
    assert one["checked"]["analyses"] == 1


def test_qc_for_people_and_refusals():
    project = store(REPORT)
    assert "Tmax 358 °C was read from an S2 of 0.14 mg/g" in call("--project", project.slug)
    out = io.StringIO()
    with pytest.raises(SystemExit) as stop:
        call_command("qc", "--project", project.slug, "--well", "Nowhere 3", "--json", stdout=out, stderr=io.StringIO())
    assert stop.value.code == 1
    refusal = json.loads(out.getvalue())["error"]
    assert refusal["code"] == "not_found"
    assert "Brill 7" in refusal["remedy"]
