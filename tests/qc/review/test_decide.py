"""Deciding: who may, on what, with which reason, and what happens when two people work at once."""

from uuid import uuid4

import pytest
from django.db import IntegrityError, connection, transaction

from labdata.errors import Conflict, InvalidInput, NotAllowed, NotFound
from labdata.models import AuditEntry, Result, Role
from qc.models import Decision, FlagAnswer
from qc.review.deciding import last_batch
from qc.review.services import (
    Choice,
    accept_unflagged,
    answer_flag,
    answer_flags,
    decide,
    reopen,
    sign_off,
    undo,
)
from qc.review.standing import results_of, standing, verdict_counts
from tests.factories import PASSWORD, UserFactory
from tests.qc.review.wells import flag, people, person, small_set

pytestmark = [pytest.mark.django_db, pytest.mark.both]


def of(review_set, code: str, label: str = "A-1") -> Result:
    return results_of(review_set).get(analyte__code=code, analysis__sample__label=label)


def accept_all(review_set, user):
    return decide(user=user, review_set=review_set, choices=[Choice(r.pk, "accepted") for r in results_of(review_set)])


def test_the_latest_decision_stands_and_the_earlier_one_stays():
    review_set = small_set()
    chemist, _ = people(review_set.project)
    tmax = of(review_set, "TMAX")
    decide(user=chemist, review_set=review_set, choices=[Choice(tmax.pk, "accepted")])
    decide(user=chemist, review_set=review_set, choices=[Choice(tmax.pk, "rejected", "low_signal")])
    stands = standing(results_of(review_set))
    assert (stands[tmax.pk].verdict, stands[tmax.pk].reason) == ("rejected", "low_signal")
    assert stands[tmax.pk].decided_by == chemist.username
    assert Decision.objects.filter(result=tmax).count() == 2
    assert verdict_counts(review_set) == {"results": 12, "accepted": 0, "rejected": 1, "held": 0, "undecided": 11}


def test_a_decision_leaves_one_audit_record_that_says_what():
    review_set = small_set()
    chemist, _ = people(review_set.project)
    tmax = of(review_set, "TMAX")
    batch = decide(
        user=chemist, review_set=review_set, choices=[Choice(tmax.pk, "rejected", "other", "flat-topped peak")]
    )
    entry = AuditEntry.objects.get()
    assert (entry.action, entry.actor_name) == ("review.decided", chemist.username)
    assert entry.after["what"] == "rejected 1 result (TMAX of A-1 2010.00 m)"
    assert entry.after["batch"] == str(batch)
    assert entry.reason == "other (say which): flat-topped peak"


@pytest.mark.parametrize("role", [r for r in Role if r != Role.GEOCHEMIST])
def test_other_roles_may_not_decide(role):
    review_set = small_set(samples=1)
    someone = person(review_set.project, role)
    with pytest.raises(NotAllowed, match="may not decide"):
        accept_all(review_set, someone)
    assert not Decision.objects.exists()


def test_for_a_stranger_the_project_does_not_exist():
    review_set = small_set(samples=1)
    with pytest.raises(NotFound, match="There is no project"):
        accept_all(review_set, UserFactory())


@pytest.mark.parametrize(("verdict", "reason", "text", "says"), [
    ("rejected", "", "", "not rejected without a reason"),
    ("held", "", "", "not held without a reason"),
    ("rejected", "", "words alone", "not rejected without a reason"),
    ("rejected", "other", "  ", "needs words"),
    ("rejected", "because", "", "is no reason code"),
    ("good", "", "", "is no verdict"),
])  # fmt: skip
def test_a_verdict_without_its_reason_is_refused(verdict, reason, text, says):
    review_set = small_set(samples=1)
    chemist, _ = people(review_set.project)
    choices = [Choice(of(review_set, "TOC").pk, "accepted"), Choice(of(review_set, "TMAX").pk, verdict, reason, text)]
    with pytest.raises(InvalidInput, match=says):
        decide(user=chemist, review_set=review_set, choices=choices)
    assert not Decision.objects.exists()


def test_an_empty_batch_and_a_result_named_twice_are_refused():
    review_set = small_set(samples=1)
    chemist, _ = people(review_set.project)
    toc = of(review_set, "TOC").pk
    with pytest.raises(InvalidInput, match="No result was chosen"):
        decide(user=chemist, review_set=review_set, choices=[])
    with pytest.raises(InvalidInput, match="more than once"):
        decide(user=chemist, review_set=review_set, choices=[Choice(toc, "accepted"), Choice(toc, "held", "depth")])


def test_results_of_another_set_and_superseded_ones_are_refused():
    review_set = small_set(samples=1)
    chemist, _ = people(review_set.project)
    other = small_set(review_set.project, samples=1)
    stranger = of(other, "TOC")
    with pytest.raises(InvalidInput, match="1 of the 1 chosen results are not current results"):
        decide(user=chemist, review_set=review_set, choices=[Choice(stranger.pk, "accepted")])
    old = of(review_set, "TMAX")
    Result.objects.filter(pk=old.pk).update(current=False)
    with pytest.raises(InvalidInput, match="later report version"):
        decide(user=chemist, review_set=review_set, choices=[Choice(old.pk, "accepted")])


def test_a_set_that_changed_meanwhile_names_who_decided_what():
    review_set = small_set()
    chemist, _ = people(review_set.project)
    colleague = person(review_set.project, Role.GEOCHEMIST, "Odalys")
    seen = review_set.version
    decide(user=colleague, review_set=review_set, choices=[Choice(of(review_set, "TMAX").pk, "held", "repeat_asked")])
    with pytest.raises(Conflict, match=r"Odalys held 1 result \(TMAX of A-1"):
        decide(
            user=chemist,
            review_set=review_set,
            choices=[Choice(of(review_set, "TMAX").pk, "accepted")],
            expected_version=seen,
        )
    review_set.refresh_from_db()
    decide(
        user=chemist,
        review_set=review_set,
        choices=[Choice(of(review_set, "TMAX").pk, "accepted")],
        expected_version=review_set.version,
    )


def test_a_signed_set_refuses_decisions_until_it_is_re_opened():
    review_set = small_set(samples=1)
    chemist, approver = people(review_set.project)
    accept_all(review_set, chemist)
    sign_off(user=approver, review_set=review_set, password=PASSWORD, meaning="reviewed")
    with pytest.raises(Conflict, match=r"was signed by .* An approver can re-open"):
        accept_all(review_set, chemist)
    reopen(user=approver, review_set=review_set, reason="A late duplicate disagrees.")
    accept_all(review_set, chemist)


def test_undo_puts_back_what_stood_before():
    review_set = small_set(samples=1)
    chemist, _ = people(review_set.project)
    tmax, toc = of(review_set, "TMAX"), of(review_set, "TOC")
    first = decide(user=chemist, review_set=review_set, choices=[Choice(tmax.pk, "held", "repeat_asked", "ask again")])
    batch = decide(
        user=chemist, review_set=review_set, choices=[Choice(tmax.pk, "accepted"), Choice(toc.pk, "accepted")]
    )
    assert last_batch(chemist, review_set) == batch
    undo(user=chemist, review_set=review_set, batch=batch)
    stands = standing(results_of(review_set))
    assert (stands[tmax.pk].verdict, stands[tmax.pk].reason, stands[tmax.pk].text) == (
        "held", "repeat_asked", "ask again",
    )  # fmt: skip
    assert stands[toc.pk].verdict == "undecided"
    assert last_batch(chemist, review_set) == first


def test_undo_is_refused_for_others_twice_and_after_a_later_decision():
    review_set = small_set(samples=1)
    chemist, _ = people(review_set.project)
    colleague = person(review_set.project, Role.GEOCHEMIST)
    batch = accept_all(review_set, chemist)
    with pytest.raises(NotFound, match="has no batch"):
        undo(user=chemist, review_set=review_set, batch=uuid4())
    with pytest.raises(NotAllowed, match="Only who decided"):
        undo(user=colleague, review_set=review_set, batch=batch)
    decide(user=colleague, review_set=review_set, choices=[Choice(of(review_set, "TOC").pk, "held", "depth")])
    with pytest.raises(Conflict, match="1 of the 4 results were decided on again"):
        undo(user=chemist, review_set=review_set, batch=batch)


def test_accept_everything_unflagged_leaves_flagged_and_decided_results_alone():
    review_set = small_set()
    chemist, _ = people(review_set.project)
    tmax, toc, s2 = of(review_set, "TMAX"), of(review_set, "TOC"), of(review_set, "S2", "A-2")
    flag(tmax)
    flag(toc, "context", severity="info")
    flag(s2, "copied_row", analysis=s2.analysis, result=None, analyte="")
    decide(user=chemist, review_set=review_set, choices=[Choice(of(review_set, "S1").pk, "held", "depth")])
    accept_unflagged(user=chemist, review_set=review_set)
    left = {pk for pk, s in standing(results_of(review_set)).items() if s.verdict == "accepted"}
    assert toc.pk in left and tmax.pk not in left
    assert not left & set(s2.analysis.results.values_list("pk", flat=True))
    assert verdict_counts(review_set) == {"results": 12, "accepted": 6, "rejected": 0, "held": 1, "undecided": 5}
    with pytest.raises(InvalidInput, match="no undecided result without a flag"):
        accept_unflagged(user=chemist, review_set=review_set)


def test_a_dismissed_flag_no_longer_holds_a_result_back():
    review_set = small_set(samples=1)
    chemist, _ = people(review_set.project)
    raised = flag(of(review_set, "TMAX"))
    answer_flag(
        user=chemist, review_set=review_set, fingerprint=raised.fingerprint, rule=raised.rule, answer="dismissed",
        reason="known plateau of this kerogen",
    )  # fmt: skip
    accept_unflagged(user=chemist, review_set=review_set)
    assert verdict_counts(review_set)["accepted"] == 4


def test_agreeing_with_a_flag_rejects_what_it_says_in_one_gesture():
    review_set = small_set(samples=1)
    chemist, _ = people(review_set.project)
    tmax = of(review_set, "TMAX")
    raised = flag(tmax)
    answer_flags(
        user=chemist, review_set=review_set, flags=[(raised.rule, raised.fingerprint)], answer="agreed",
        reason="stained cuttings", choices=[Choice(tmax.pk, "rejected", "contamination")],
    )  # fmt: skip
    assert FlagAnswer.objects.get().answer == "agreed"
    assert standing(results_of(review_set))[tmax.pk].verdict == "rejected"
    assert AuditEntry.objects.get().after["what"].startswith("agreed 1 flag of tmax_range; rejected 1 result")


@pytest.mark.parametrize(("change", "says"), [
    ({"answer": "perhaps"}, "is no answer"),
    ({"reason": " "}, "without a reason"),
    ({"fingerprint": "gone"}, "raises no such flag: tmax_range"),
])  # fmt: skip
def test_an_answer_to_no_flag_or_without_words_is_refused(change, says):
    review_set = small_set(samples=1)
    chemist, _ = people(review_set.project)
    raised = flag(of(review_set, "TMAX"))
    asked = {"fingerprint": raised.fingerprint, "rule": raised.rule, "answer": "dismissed", "reason": "plateau"}
    with pytest.raises(InvalidInput, match=says):
        answer_flag(user=chemist, review_set=review_set, **{**asked, **change})
    assert not FlagAnswer.objects.exists()


@pytest.mark.parametrize("statement", [
    "UPDATE qc_decision SET verdict = 'accepted'", "DELETE FROM qc_decision", "DELETE FROM qc_flaganswer",
])  # fmt: skip
def test_the_database_keeps_decisions_and_answers(statement):
    review_set = small_set(samples=1)
    chemist, _ = people(review_set.project)
    tmax = of(review_set, "TMAX")
    raised = flag(tmax)
    answer_flags(
        user=chemist, review_set=review_set, flags=[(raised.rule, raised.fingerprint)], answer="agreed", reason="yes",
        choices=[Choice(tmax.pk, "rejected", "measurement")],
    )  # fmt: skip
    with pytest.raises(IntegrityError), transaction.atomic(), connection.cursor() as cursor:
        cursor.execute(statement)
