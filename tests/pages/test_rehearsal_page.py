"""The page of the rehearsal, and the preview on the page of a rule."""

import pytest

from labdata.models import Job
from qc.models import RuleSet
from tests.pages.test_project_pages import RULE, change

pytestmark = pytest.mark.django_db


def test_the_last_rehearsal_is_told(made, as_, at):
    text = as_("interpreter").get(at("rehearse")).content.decode()
    for said in (
        "89 %",
        "off by 8 to 30 %",
        "HI 250 → 520",
        "Not applicable: none of 20 candidates",
        "1 of 40 analyses",
    ):
        assert said in text
    assert "Rehearse now" not in text
    assert at("rehearse") in as_("interpreter").get(at("qc_runs")).content.decode()


def test_a_rehearsal_is_asked_for(made, as_, at):
    client = as_("analyst")
    assert "Rehearse now" in client.get(at("rehearse")).content.decode()
    answer = client.post(at("rehearse"), {"seed": "4"})
    job = Job.objects.get(kind="rehearse", state="queued")
    assert answer["Location"] == at("job", job.pk)
    assert job.params["seed"] == 4
    assert "under way" in client.get(at("rehearse")).content.decode()
    assert "This field is required" in client.post(at("rehearse"), {}).content.decode()
    assert as_("interpreter").post(at("rehearse"), {"seed": "4"}).status_code == 403


def test_without_one_the_page_says_so(made, as_, at):
    Job.objects.filter(kind="rehearse").delete()
    assert "Nothing rehearsed yet" in as_("geochemist").get(at("rehearse")).content.decode()


def test_thresholds_are_previewed_before_they_are_saved(made, as_, at):
    client = as_("geochemist")
    before = RuleSet.objects.count()
    answer = client.post(at("rule", RULE), {**change(s2_warn="90", reason=""), "preview": "1"})
    told = answer.context["preview"]
    assert told["appear"] > 0
    text = answer.content.decode()
    assert "What would change" in text
    assert f"{told['appear']} flag" in text
    assert RuleSet.objects.count() == before
    refused = client.post(at("rule", RULE), {**change(s2_warn="much"), "preview": "1"})
    assert "Enter a number" in refused.content.decode()
    assert as_("interpreter").post(at("rule", RULE), {**change(), "preview": "1"}).status_code == 403
