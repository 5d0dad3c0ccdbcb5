"""The door for many rows: ids, constraints and triggers hold as they do for model objects."""

import pytest
from django.db import IntegrityError, transaction

from labdata.intake.fields import catalogue
from labdata.intake.names import name_key, uwi_key
from labdata.models import Analyte, Method, Result, Sample
from labdata.registry import bulk
from labdata.registry.analyses import RESULT_COLUMNS
from labdata.registry.catalogue import seed
from tests.factories import ProjectFactory, SampleFactory
from tests.intake.landing import land

pytestmark = [pytest.mark.django_db, pytest.mark.both]


def one_result():
    landed = land(ProjectFactory(), "Sample,Depth (m),TOC (wt%)\nA,10,1.25\n", well="Quill 1")
    return Result.objects.get(analysis__report=landed.report)


def test_ids_go_on_after_bulk_rows():
    one_result()
    brought = Sample.objects.get()
    assert SampleFactory().pk > brought.pk
    assert bulk.take_ids(Sample, 2)[0] > max(Sample.objects.values_list("pk", flat=True))


@pytest.mark.parametrize("change", [
    {"value": None},  # neither number nor qualifier
    {"value": 1e301},
    {"qualifier": "?"},
    {},  # the same analyte of the same analysis again
])  # fmt: skip
def test_the_database_refuses_what_slips_through(change):
    held = one_result()
    row = {
        "id": bulk.take_ids(Result, 1)[0], "analysis_id": held.analysis_id, "analyte_id": held.analyte_id, "column_id": held.column_id,
        "value": 1.0, "qualifier": "", "value_reported": "1", "decimals": 0, "current": True, "supersedes_id": None,
    }  # fmt: skip
    if change:
        row["analyte_id"] = Analyte.objects.get(code="TIC").pk
    row |= change
    with pytest.raises(IntegrityError), transaction.atomic():
        bulk.insert(Result, RESULT_COLUMNS, [tuple(row[name] for name in RESULT_COLUMNS)])
    assert Result.objects.count() == 1


def test_a_stored_value_cannot_be_edited():
    held = one_result()
    with pytest.raises(IntegrityError), transaction.atomic():
        Result.objects.filter(pk=held.pk).update(value=9.0)


def test_seeding_again_changes_nothing_and_repairs_what_differs():
    before = list(Analyte.objects.order_by("pk").values())
    seed()
    assert list(Analyte.objects.order_by("pk").values()) == before
    Analyte.objects.filter(code="TOC").update(unit="furlong")
    seed()
    assert list(Analyte.objects.order_by("pk").values()) == before


def test_the_catalogue_is_whole():
    listed = catalogue()
    codes = set(listed["analytes"])
    assert set(Analyte.objects.values_list("code", flat=True)) == codes
    assert set(Method.objects.values_list("code", flat=True)) == set(listed["methods"])
    for code, analyte in listed["analytes"].items():
        assert set(analyte.get("inputs", [])) <= codes - {code}
        assert analyte.get("low", 0) < analyte.get("high", 1e9)
    assert all(
        analyte["order"] > 0 for analyte in listed["analytes"].values()
    )  # a group may share one: the code decides


@pytest.mark.parametrize(
    ("one", "other"),
    [
        ("Quill-1", "QUILL  #01"),
        ("Kyogle 1", "kyogle No 1".replace("No ", "")),
        ("7121/8-1", "7121 8 1"),
        ("P-135", "P135"),
        ("Brønn 2", "brønn-2"),
    ],
)
def test_spellings_of_a_well_meet(one, other):
    assert name_key(one) == name_key(other)


def test_well_numbers_that_differ_do_not_meet():
    assert len({name_key(name) for name in ("Quill 1", "Quill 11", "Quill 1A", "Quill 10", "1 Quill")}) == 5


def test_api_numbers_of_ten_twelve_and_fourteen_digits_meet():
    assert uwi_key("49-013-20972") == uwi_key("4901320972") == uwi_key("49013209720000")
    assert uwi_key("49013209720100") != uwi_key("4901320972")
