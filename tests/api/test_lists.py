"""Lists: filters, pages, and what each row says."""

from datetime import timedelta
from urllib.parse import urlencode

import pytest
from django.utils import timezone

from labdata.models import Analysis, Result
from labdata.release.rows import long_table
from qc.models import Verdict
from tests.api.conftest import client_for
from tests.api.things import LISTS, one_of_everything
from tests.release.scene import release_of

pytestmark = [pytest.mark.both, pytest.mark.django_db]


def rows(client, route, **query):
    answer = client.get(f"/api/v1/{route}?{urlencode(query)}")
    assert answer.status_code == 200, answer.content
    return answer.json()["results"]


@pytest.fixture
def client(scene):
    return client_for(scene, "geochemist")


def test_results_are_the_long_rows_of_todays_data(scene, client):
    listed = {row["id"]: row for row in rows(client, "results", page_size=2000)}
    for expected in long_table(scene.project).to_pylist():
        row = listed.pop(expected["result"])
        assert {name: row[name] for name in expected if name != "result"} == {
            name: value for name, value in expected.items() if name != "result"
        }
    assert not listed


FILTERED = [
    ({"well": "Quill 1"}, 15), ({"well": "quill  1"}, 15), ({"analyte": "TMAX"}, 6), ({"analyte": "tmax"}, 6),
    ({"method": "carbon"}, 6), ({"formation": "upper shale"}, 20), ({"top_m__gte": 2010}, 20),
    ({"base_m__lte": 2015}, 20), ({"top_m__gte": 2010, "base_m__lte": 2015}, 10), ({"verdict": "undecided"}, 30),
    ({"state": "accepted"}, 0), ({"well": "Quill 2", "analyte": "TOC", "top_m__gte": 2020}, 1), ({"superseded": "true"}, 0),
]  # fmt: skip


def test_results_by_filter(client):
    for query, count in FILTERED:
        assert len(rows(client, "results", **query)) == count, query


def test_results_by_verdict(scene, client):
    held = scene.sets[0]
    rejected = scene.result(held.analyses.first(), "S2")
    scene.accept(held, {rejected.pk: "contamination"})
    assert [row["id"] for row in rows(client, "results", verdict="rejected")] == [rejected.pk]
    assert len(rows(client, "results", verdict="accepted")) == 14
    assert len(rows(client, "results", state="undecided")) == 15


def test_superseded_results_stay_readable(scene, client):
    old = Result.objects.first()
    Result.objects.filter(pk=old.pk).update(current=False)
    assert old.pk not in [row["id"] for row in rows(client, "results")]
    assert [row["id"] for row in rows(client, "results", superseded="true")] == [old.pk]
    assert client.get(f"/api/v1/results/{old.pk}").json()["value_reported"] == old.value_reported


def test_what_changed_since_tomorrow_is_nothing(signed):
    one_of_everything(signed, release_of(signed))
    client = client_for(signed, "geochemist")
    tomorrow = (timezone.now() + timedelta(days=1)).isoformat()
    yesterday = (timezone.now() - timedelta(days=1)).date().isoformat()
    for route in (route for route in LISTS if route != "rule-sets"):
        assert rows(client, route, changed_since=tomorrow) == [], route
        assert rows(client, route, changed_since=yesterday) == rows(client, route), route


def test_a_plus_that_became_a_blank_is_understood(client):
    answer = client.get("/api/v1/results?changed_since=2020-01-01T00:00:00+02:00")
    assert answer.status_code == 200


def test_every_list_can_be_cut_to_a_project(signed):
    one_of_everything(signed, release_of(signed))
    client = client_for(signed, "geochemist")
    for route in LISTS:
        listed = rows(client, route, project=signed.project.slug)
        assert listed, route
        assert {row.get("project", row.get("slug")) for row in listed} <= {signed.project.slug, None}


def test_the_row_of_a_list_and_the_thing_at_its_own_address_say_the_same(signed):
    one_of_everything(signed, release_of(signed))
    client = client_for(signed, "geochemist")
    for route in LISTS:
        for row in rows(client, route)[:3] if route != "audit" else []:
            alone = client.get(f"/api/v1/{route}/{row.get('id', row.get('slug'))}").json()
            assert {name: alone[name] for name in row} == row


def test_pages_are_stable_while_rows_are_added(scene, client):
    seen, url = [], "/api/v1/results?page_size=7"
    while url:
        page = client.get(url).json()
        seen += [row["id"] for row in page["results"]]
        url = page["next"]
        if len(seen) == 14:
            well, held = scene.well("Quill 9")
            scene.analysis(held, (scene.table(), 5), scene.sample(well, 10), "pyrolysis", {"S1": 1})
    assert seen == list(Result.objects.order_by("pk").values_list("pk", flat=True))


def test_pages_go_back(client):
    first = client.get("/api/v1/results?page_size=10").json()
    second = client.get(first["next"]).json()
    assert client.get(second["previous"]).json()["results"] == first["results"]
    assert (first["previous"], len(second["results"])) == (None, 10)


def test_analyses_know_their_set(scene, client):
    signed_set = scene.sets[0]
    scene.accept(signed_set)
    scene.sign(signed_set)
    assert {row["review_set"] for row in rows(client, "analyses", state="signed")} == {signed_set.pk}
    assert len(rows(client, "analyses", analyte="TOC")) == 6
    assert len(rows(client, "samples", method="carbon", well="Quill 1")) == 3
    assert Analysis.objects.count() == 12


def test_a_review_set_says_how_far_it_is(scene, client):
    held = scene.sets[0]
    scene.accept(held)
    sign_off = scene.sign(held)
    told = client.get(f"/api/v1/review-sets/{held.pk}").json()
    assert told["counts"] == {"results": 15, "accepted": 15, "rejected": 0, "held": 0, "undecided": 0}
    assert told["signature"]["id"] == sign_off.pk
    assert client.get(f"/api/v1/review-sets/{scene.sets[1].pk}").json()["signature"] is None
    assert [row["id"] for row in rows(client, "review-sets", state="signed")] == [held.pk]


def test_a_slash_at_the_end_does_no_harm(client):
    assert client.get("/api/v1/wells/").json() == client.get("/api/v1/wells").json()


def test_decisions_are_filtered_like_results(scene, client):
    scene.accept(scene.sets[0])
    assert len(rows(client, "decisions", analyte="TMAX", well="Quill 1", verdict="accepted")) == 3
    assert rows(client, "decisions", review_set=scene.sets[1].pk) == []
    assert {row["verdict"] for row in rows(client, "decisions")} == {Verdict.ACCEPTED}
