"""Signing: by somebody else, over what was seen, with the password again; and how a signature loses its force."""

from datetime import timedelta

import pytest

from labdata import audit
from labdata.errors import Conflict, InvalidInput, NotAllowed, OpenResults, SelfSignOff, SigningLocked, WrongPassword
from labdata.models import AuditEntry, Result, Role, Sample
from qc.models import ReviewSetState, SignOff
from qc.review import seal
from qc.review.services import Choice, decide, reopen, sign_off
from qc.review.signing import MEANINGS, TRIES
from qc.review.standing import results_of, valid_signature
from tests.factories import PASSWORD, MembershipFactory
from tests.qc.review.wells import people, person, qc_run, small_set

pytestmark = [pytest.mark.django_db, pytest.mark.both]


def decided_set(samples: int = 1):
    """A set with one rejection and the rest accepted, its geochemist and its approver."""
    review_set = small_set(samples=samples)
    chemist, approver = people(review_set.project)
    ids = list(results_of(review_set).order_by("pk").values_list("pk", flat=True))
    choices = [Choice(ids[0], "rejected", "depth", "wrong bag"), *(Choice(pk, "accepted") for pk in ids[1:])]
    decide(user=chemist, review_set=review_set, choices=choices)
    review_set.refresh_from_db()
    return review_set, chemist, approver


def sign(review_set, user, password=PASSWORD, meaning="reviewed", **more):
    return sign_off(user=user, review_set=review_set, password=password, meaning=meaning, **more)


def test_a_signature_says_who_what_and_over_which_content():
    review_set, _, approver = decided_set()
    run = qc_run(review_set.well)
    record = sign(review_set, approver)
    review_set.refresh_from_db()
    assert review_set.state == ReviewSetState.SIGNED
    assert valid_signature(review_set) == record
    assert record.meaning == MEANINGS["reviewed"]
    assert record.counts == {"results": 4, "accepted": 3, "rejected": 1, "held": 0, "undecided": 0}
    assert record.qc_run == run
    assert seal.holds(record)
    assert AuditEntry.objects.order_by("-seq")[0].after["content_sha256"] == record.content_sha256
    audit.verify()


def test_who_decided_may_not_sign_even_with_the_role():
    review_set, chemist, _ = decided_set()
    MembershipFactory(project=review_set.project, user=chemist, role=Role.APPROVER)
    with pytest.raises(SelfSignOff, match="made 4 of the decisions"):
        sign(review_set, chemist)


@pytest.mark.parametrize("role", [r for r in Role if r != Role.APPROVER])
def test_other_roles_may_neither_sign_nor_re_open(role):
    review_set, _, approver = decided_set()
    someone = person(review_set.project, role)
    with pytest.raises(NotAllowed, match="may not sign"):
        sign(review_set, someone)
    sign(review_set, approver)
    with pytest.raises(NotAllowed, match="may not reopen"):
        reopen(user=someone, review_set=review_set, reason="why not")


def test_undecided_and_held_results_stop_a_signature_with_counts():
    review_set, chemist, approver = decided_set(samples=2)
    ids = list(results_of(review_set).values_list("pk", flat=True))
    choices = [Choice(ids[0], "held", "repeat_asked"), Choice(ids[1], "undecided"), Choice(ids[2], "undecided")]
    decide(user=chemist, review_set=review_set, choices=choices)
    with pytest.raises(OpenResults, match="2 undecided, 1 held of 8") as refusal:
        sign(review_set, approver)
    assert refusal.value.where["undecided"] == 2 and refusal.value.where["held"] == 1
    assert not SignOff.objects.exists()


def test_a_signature_needs_its_meaning():
    review_set, _, approver = decided_set()
    with pytest.raises(InvalidInput, match="states what it means"):
        sign(review_set, approver, meaning="  ")
    with pytest.raises(InvalidInput, match="has 301 characters"):
        sign(review_set, approver, meaning="m" * 301)
    assert (
        sign(review_set, approver, meaning="Approved for the basin model.").meaning == "Approved for the basin model."
    )


def test_a_set_that_changed_since_it_was_read_is_not_signed():
    review_set, chemist, approver = decided_set()
    seen = review_set.version
    decide(user=chemist, review_set=review_set, choices=[Choice(results_of(review_set).first().pk, "accepted")])
    with pytest.raises(Conflict, match=f"{chemist} accepted 1 result"):
        sign(review_set, approver, expected_version=seen)


def test_signed_twice_and_empty_sets_are_refused():
    review_set, _, approver = decided_set()
    sign(review_set, approver)
    with pytest.raises(Conflict, match="was signed by"):
        sign(review_set, approver)
    with pytest.raises(Conflict, match="holds no results"):
        sign(small_set(review_set.project, samples=0), approver)


def test_five_wrong_passwords_lock_signing_for_that_person(monkeypatch):
    review_set, _, approver = decided_set()
    for left in range(TRIES - 1, -1, -1):
        with pytest.raises(WrongPassword, match=f"{left} more tries are left"):
            sign(review_set, approver, password="not it at all")
    with pytest.raises(SigningLocked, match="5 wrong passwords"):
        sign(review_set, approver)
    assert AuditEntry.objects.filter(action="review.wrong_password", actor=approver).count() == TRIES
    other = person(review_set.project, Role.APPROVER)
    monkeypatch.setattr("qc.review.signing.TRIES_WITHIN", timedelta(0))
    sign(review_set, approver)
    reopen(user=other, review_set=review_set, reason="another look")


def test_another_approver_is_not_locked():
    review_set, _, approver = decided_set()
    other = person(review_set.project, Role.APPROVER)
    for _ in range(TRIES):
        with pytest.raises(WrongPassword):
            sign(review_set, approver, password="not it at all")
    sign(review_set, other)


def test_re_opening_takes_the_force_and_keeps_the_record():
    review_set, _, approver = decided_set()
    record = sign(review_set, approver)
    with pytest.raises(InvalidInput, match="without a reason"):
        reopen(user=approver, review_set=review_set, reason="")
    reopen(user=approver, review_set=review_set, reason="A duplicate came in.")
    review_set.refresh_from_db()
    assert review_set.state == ReviewSetState.OPEN
    assert valid_signature(review_set) is None
    assert SignOff.objects.get() == record
    with pytest.raises(Conflict, match="is not signed"):
        reopen(user=approver, review_set=review_set, reason="again")
    sign(review_set, approver)
    assert SignOff.objects.count() == 2


def changed_value(results):
    """A superseding value, as a later report version brings it."""
    old = results.get(analyte__code="S2")
    Result.objects.filter(pk=old.pk).update(current=False)


def moved_sample(results):
    Sample.objects.filter(pk=results.first().analysis.sample_id).update(top_md_m=1999.5)


def changed_verdict(results):
    first = results.first()
    review_set = first.analysis.review_item.review_set
    signature = valid_signature(review_set)
    reopen(user=signature.signed_by, review_set=review_set, reason="test")
    user = person(review_set.project, Role.GEOCHEMIST)
    decide(user=user, review_set=review_set, choices=[Choice(first.pk, "held", "geology")])


def changed_reason(results):
    first = results.order_by("pk").first()
    review_set = first.analysis.review_item.review_set
    reopen(user=valid_signature(review_set).signed_by, review_set=review_set, reason="test")
    user = person(review_set.project, Role.GEOCHEMIST)
    decide(user=user, review_set=review_set, choices=[Choice(first.pk, "rejected", "depth", "another bag")])


def renamed_sample(results):
    Sample.objects.filter(pk=results.first().analysis.sample_id).update(label="B-1")


@pytest.mark.parametrize("change", [changed_value, moved_sample, changed_verdict, changed_reason, renamed_sample])
def test_any_change_of_what_was_signed_breaks_the_seal(change):
    review_set, _, approver = decided_set()
    record = sign(review_set, approver)
    assert seal.holds(record)
    change(results_of(review_set))
    assert not seal.holds(record)


def test_the_seal_does_not_depend_on_the_order_of_storage():
    review_set, *_ = decided_set(samples=3)
    lines = seal.content_lines(review_set)
    assert lines == sorted(lines) and len(set(lines)) == 12
