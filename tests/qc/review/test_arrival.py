"""What lands comes to the desk: sets, carried verdicts, and signatures that a changed value breaks."""

from types import SimpleNamespace

import pytest

from labdata.models import Analysis, Result
from qc.models import Decision, ReviewSet, ReviewSetState
from qc.review import seal
from qc.review.services import Choice, decide, sign_off, take_in
from qc.review.standing import results_of, standing, valid_signature, verdict_counts
from tests.factories import PASSWORD, ProjectFactory, SampleFactory
from tests.qc.review.wells import analyte, people, report, results, table, well

pytestmark = [pytest.mark.django_db, pytest.mark.both]
CODES = ["TOC", "S1", "S2", "TMAX"]
VALUES = {"TOC": 2.0, "S1": 0.4, "S2": 6.1, "TMAX": 436}


def landed(analyses, of, **more):
    """What the registry hands on."""
    given = {"unchanged": [], "changed": [], "withdrawn": [], "replaced_analyses": {}, "report": of, **more}
    wells = sorted({a.sample.well_id for a in analyses})
    return SimpleNamespace(analysis_ids=[a.pk for a in analyses], well_ids=wells, upload=None, **given)


def first_report(project, samples):
    for code in CODES:
        analyte(code)
    of = report(project)
    sheet, columns = table(of, CODES)
    made = [results(sample, sheet, columns, n, VALUES) for n, sample in enumerate(samples, start=2)]
    take_in(landed(made, of))
    return of, made


def later_version(of, made, changes=None, drop=()):
    """Version 2: the same rows, with some values of the first changed or dropped; superseded as the registry does."""
    new = report(of.project, version=2, supersedes=of)
    sheet, columns = table(new, CODES)
    unchanged, changed, withdrawn, replaced, fresh = [], [], [], {}, []
    Analysis.objects.filter(pk__in=[a.pk for a in made]).update(current=False)
    Result.objects.filter(analysis__in=made).update(current=False)
    for n, old in enumerate(made, start=2):
        values = {**VALUES, **(changes or {} if n == 2 else {})}
        values = {code: value for code, value in values.items() if not (n == 2 and code in drop)}
        again = results(old.sample, sheet, columns, n, values)
        replaced[again.pk] = old.pk
        fresh.append(again)
        now = dict(again.results.values_list("analyte__code", "pk"))
        for code, pk in old.results.values_list("analyte__code", "pk"):
            if code not in now:
                withdrawn.append(pk)
            else:
                (changed if values[code] != VALUES[code] else unchanged).append((pk, now[code]))
    take_in(landed(fresh, new, unchanged=unchanged, changed=changed, withdrawn=withdrawn, replaced_analyses=replaced))
    return fresh


@pytest.fixture
def bench():
    """A project with a well of two samples, reported, decided and signed."""
    project = ProjectFactory()
    home = well(project, "Ambry Ridge")
    of, made = first_report(project, [SampleFactory(well=home), SampleFactory(well=home)])
    chemist, approver = people(project)
    review_set = ReviewSet.objects.get()
    ids = list(results_of(review_set).order_by("pk").values_list("pk", flat=True))
    decide(
        user=chemist, review_set=review_set,
        choices=[Choice(ids[0], "rejected", "depth", "wrong bag"), *(Choice(pk, "accepted") for pk in ids[1:])],
    )  # fmt: skip
    sign_off(user=approver, review_set=review_set, password=PASSWORD, meaning="reviewed")
    return SimpleNamespace(project=project, well=home, report=of, analyses=made, review_set=review_set, chemist=chemist)


def test_new_analyses_join_the_open_set_of_their_well():
    project = ProjectFactory()
    one, two = well(project, "One"), well(project, "Two")
    first_report(project, [SampleFactory(well=one), SampleFactory(well=two), SampleFactory(well=one)])
    first_report(project, [SampleFactory(well=one)])
    counted = {s.well.name: (s.number, s.analyses.count()) for s in ReviewSet.objects.all()}
    assert counted == {"One": (1, 3), "Two": (1, 1)}


def test_a_further_set_is_opened_when_the_last_is_signed(bench):
    first_report(bench.project, [SampleFactory(well=bench.well)])
    assert list(ReviewSet.objects.values_list("number", "state")) == [(1, "signed"), (2, "open")]
    assert valid_signature(bench.review_set)


def test_a_version_that_repeats_every_value_carries_verdicts_and_keeps_the_signature(bench):
    signature = valid_signature(bench.review_set)
    later_version(bench.report, bench.analyses)
    assert valid_signature(bench.review_set) == signature
    assert seal.holds(signature)
    assert verdict_counts(bench.review_set) == {"results": 8, "accepted": 7, "rejected": 1, "held": 0, "undecided": 0}
    carried = Decision.objects.get(verdict="rejected", carried_from__isnull=False)
    assert (carried.decided_by, carried.decided_at) == (bench.chemist, carried.carried_from.decided_at)
    assert ReviewSet.objects.count() == 1


@pytest.mark.parametrize(("later", "left"), [
    ({"changes": {"TMAX": 441}}, {"results": 8, "accepted": 6, "rejected": 1, "held": 0, "undecided": 1}),
    ({"drop": ("S1",)}, {"results": 7, "accepted": 6, "rejected": 1, "held": 0, "undecided": 0}),
])  # fmt: skip
def test_a_changed_or_withdrawn_value_re_opens_the_signed_set(bench, later, left):
    signature = valid_signature(bench.review_set)
    later_version(bench.report, bench.analyses, **later)
    bench.review_set.refresh_from_db()
    assert bench.review_set.state == ReviewSetState.OPEN
    assert valid_signature(bench.review_set) is None
    assert signature.reopening.reopened_by is None
    assert "changed, added or withdrew signed values" in signature.reopening.reason
    assert verdict_counts(bench.review_set) == left


def test_only_the_changed_value_waits_for_a_new_decision(bench):
    fresh = later_version(bench.report, bench.analyses, changes={"TMAX": 441})
    decided = standing(results_of(bench.review_set))
    waiting = results_of(bench.review_set).exclude(pk__in=decided)
    assert [(r.analysis_id, r.analyte.code, r.value) for r in waiting] == [(fresh[0].pk, "TMAX", 441)]
