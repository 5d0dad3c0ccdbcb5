"""Threads on results and flags: who may write, what is kept, and what leaves as a question to the laboratory."""

import json

import pytest
from django.db import DatabaseError, connection, transaction
from django.urls import get_resolver, reverse

from labdata.access import GRANTS
from labdata.errors import Conflict, InvalidInput, NotAllowed, NotFound
from labdata.models import AuditEntry, Role
from labdata.pages.history import history
from qc.models import Note, QcRun
from qc.review import notes
from qc.review.data import review_data
from qc.review.services import Choice, decide, sign_off
from qc.review.standing import results_of
from tests.factories import PASSWORD, UserFactory
from tests.qc.review.wells import flag, people, person, qc_run, small_set

pytestmark = pytest.mark.django_db
WRITERS = {role for role in Role if GRANTS[role] & notes.MAY_WRITE}


@pytest.fixture
def desk():
    """A set of two samples, a flag on Tmax of A-2, and Maren who reviews it."""
    review_set = small_set(samples=2)
    tmax = results_of(review_set).get(analyte__code="TMAX", analysis__sample__label="A-2")
    maren = person(review_set.project, Role.GEOCHEMIST, "maren", first_name="Maren", last_name="Holt")
    return review_set, tmax, flag(tmax), maren


def mark(of):
    return (of.rule, of.fingerprint)


def test_a_note_is_kept_with_its_audit_record(desk):
    review_set, tmax, _, maren = desk
    made = notes.write(user=maren, review_set=review_set, text=" looks flat ", result_id=tmax.pk)
    assert (made.text, made.kind, made.result, made.written_by) == ("looks flat", "note", tmax, maren)
    entry = AuditEntry.objects.order_by("-seq")[0]
    assert (entry.action, entry.actor, entry.after["text"]) == ("review.noted", maren, "looks flat")
    assert entry.after["what"] == "wrote a note on TMAX of A-2 2020.00 m"
    assert "Maren Holt noted: «looks flat»" in [event.text for event in history(tmax)]


def test_what_is_said_on_a_flag_shows_on_its_result_and_outlives_the_run(desk):
    review_set, tmax, raised, maren = desk
    notes.write(user=maren, review_set=review_set, text="see the log", flag=mark(raised))
    assert [note.text for note in notes.of_result(tmax)] == ["see the log"]
    again = QcRun.objects.create(project=review_set.project, rule_set=qc_run(review_set.well).rule_set)
    again.wells.add(review_set.well)
    flag(tmax, run=again)
    data = review_data(review_set, maren)
    assert [(note["rule"], note["mark"]) for note in data["notes"]] == [
        (data["flags"][0]["rule"], data["flags"][0]["mark"])
    ]


@pytest.mark.both
@pytest.mark.parametrize("statement", ["UPDATE qc_note SET text = 'x'", "DELETE FROM qc_note"])
def test_the_database_keeps_notes_as_they_are(desk, statement):
    review_set, tmax, _, maren = desk
    notes.write(user=maren, review_set=review_set, text="kept", result_id=tmax.pk)
    with pytest.raises(DatabaseError, match="append-only"), transaction.atomic(), connection.cursor() as cursor:
        cursor.execute(statement)
    assert Note.objects.get().text == "kept"


@pytest.mark.parametrize(("change", "refusal", "says"), [
    ({"text": "  "}, InvalidInput, "says something"),
    ({"text": "x" * 4001}, InvalidInput, "4001 characters"),
    ({"kind": "shout"}, InvalidInput, "no kind of note"),
    ({"result_id": 10**9}, NotFound, "no result"),
    ({"result_id": None}, NotFound, "no result"),
    ({"flag": ("tmax_range", "gone")}, NotFound, "no such flag"),
    ({"kind": "answer", "answers": 10**9}, NotFound, "no question"),
])  # fmt: skip
def test_what_makes_no_note_is_refused(desk, change, refusal, says):
    review_set, tmax, _, maren = desk
    with pytest.raises(refusal, match=says):
        notes.write(**{"user": maren, "review_set": review_set, "text": "a", "result_id": tmax.pk, **change})
    assert not Note.objects.exists()


def test_a_result_of_another_set_is_not_there(desk):
    review_set, _, raised, maren = desk
    other = small_set(review_set.project)
    with pytest.raises(NotFound):
        notes.write(user=maren, review_set=review_set, text="a", result_id=results_of(other).first().pk)
    with pytest.raises(NotFound):
        notes.write(user=maren, review_set=other, text="a", flag=mark(raised))


def test_a_question_leaves_with_everything_the_laboratory_needs(desk):
    review_set, tmax, raised, maren = desk
    asked = notes.write(user=maren, review_set=review_set, kind="question", text="Was S2 bimodal?", flag=mark(raised))
    text = notes.letter(review_set, notes.open_questions(review_set))
    for part in (
        f"well {review_set.well.name}", f"[question {asked.pk}] asked by Maren Holt", "Sample: A-2",
        "Depth: 2020.00 – 2030.00 m", "Value of: TMAX", "«432» degC, read as 432 degC", "Cell: Data!G3",
        "The check says: TMAX looks odd (rule tmax_range)", "Question: Was S2 bimodal?",
        f"Report: {tmax.analysis.report}, file {tmax.analysis.report.source_file.name}",
    ):  # fmt: skip
        assert part in text, part


def test_a_question_on_a_whole_interval_lists_its_cells(desk):
    review_set, tmax, _, maren = desk
    evidence = {"interval_m": [2600, 2700.5], "inputs": [
        {"sample": "A-2", "analyte": "S1", "text": "4.1", "unit": "mg/g", "sheet": "Data", "cell": "E3"}]}  # fmt: skip
    wide = flag(tmax, "oil_based_fluid_interval", result=None, analysis=None, evidence=evidence, message="S1 jumps")
    notes.write(user=maren, review_set=review_set, kind="question", text="Washed how?", flag=mark(wide))
    text = notes.letter(review_set, notes.open_questions(review_set))
    assert "Depth: 2600 – 2700.5 m" in text and "A-2 S1 «4.1» mg/g cell Data!E3" in text and "S1 jumps" in text


def test_an_answer_closes_its_question_once(desk):
    review_set, tmax, _, maren = desk
    asked = notes.write(user=maren, review_set=review_set, kind="question", text="Sure?", result_id=tmax.pk)
    assert notes.told(review_set)[0]["open"]
    given = notes.write(user=maren, review_set=review_set, kind="answer", text="A slip.", answers=asked.pk)
    assert (given.result, given.answers) == (tmax, asked)
    assert not notes.open_questions(review_set).exists() and not notes.told(review_set)[0]["open"]
    assert "No question is open." in notes.letter(review_set, notes.open_questions(review_set))
    with pytest.raises(Conflict, match="answered already"):
        notes.write(user=maren, review_set=review_set, kind="answer", text="Again.", answers=asked.pk)


def test_a_signed_set_may_be_talked_about_and_stays_signed(desk):
    review_set, tmax, _, maren = desk
    ids = results_of(review_set).values_list("pk", flat=True)
    decide(user=maren, review_set=review_set, choices=[Choice(pk, "accepted") for pk in ids])
    _, approver = people(review_set.project)
    sign_off(user=approver, review_set=review_set, password=PASSWORD, meaning="reviewed")
    notes.write(user=approver, review_set=review_set, text="fine", result_id=tmax.pk)
    assert review_data(review_set, approver)["signature"]["holds"]


@pytest.mark.parametrize("role", list(Role))
def test_who_may_write_and_who_reads(desk, client, role):
    review_set, tmax, raised, _ = desk
    user = person(review_set.project, role)
    asked = notes.write(user=desk[3], review_set=review_set, kind="question", text="Sure?", flag=mark(raised))
    if role not in WRITERS:
        with pytest.raises(NotAllowed, match="may not write notes"):
            notes.write(user=user, review_set=review_set, text="a", result_id=tmax.pk)
    client.force_login(user)
    place = [review_set.project.slug, review_set.pk]
    body = json.dumps({"flags": [mark(raised)], "kind": "note", "text": "a"})
    posted = client.post(reverse("review_note", args=place), body, content_type="application/json")
    assert posted.status_code == (200 if role in WRITERS else 403)
    form = client.post(reverse("review_result_note", args=[*place, tmax.pk]), {"text": "b", "kind": "note"})
    assert form.status_code == (302 if role in WRITERS else 403)
    assert "Sure?" in client.get(reverse("review_question", args=[*place, asked.pk])).content.decode()
    assert "Sure?" in client.get(reverse("review_questions", args=place)).content.decode()
    page = client.get(reverse("result", args=[place[0], tmax.pk])).content.decode()
    assert "Sure?" in page and ("Your note or question" in page) == (role in WRITERS)
    assert review_data(review_set, user)["may_note"] == (role in WRITERS)


def test_the_rights_are_those_of_who_decides_uploads_or_signs():
    assert {Role.GEOCHEMIST, Role.APPROVER, Role.ANALYST, Role.COORDINATOR} == WRITERS


def test_a_stranger_finds_nothing_and_nobody_is_asked_to_sign_in(desk, client):
    review_set, tmax, _, maren = desk
    asked = notes.write(user=maren, review_set=review_set, kind="question", text="Sure?", result_id=tmax.pk)
    place = [review_set.project.slug, review_set.pk]
    walk = [
        ("post", "review_note", place), ("post", "review_result_note", [*place, tmax.pk]),
        ("get", "review_question", [*place, asked.pk]), ("get", "review_questions", place),
    ]  # fmt: skip
    for method, name, args in walk:
        assert getattr(client, method)(reverse(name, args=args)).status_code == 302, name
    client.force_login(UserFactory())
    for method, name, args in walk:
        assert getattr(client, method)(reverse(name, args=args)).status_code == 404, name
    client.force_login(maren)
    for _, name, args in walk[:2]:
        assert client.get(reverse(name, args=args)).status_code == 405, name
    assert client.get(reverse("review_question", args=[*place, 10**9])).status_code == 404


def test_every_address_of_the_room_is_walked_somewhere():
    [room] = [one for one in get_resolver().url_patterns if str(one.pattern).endswith("/review/")]
    assert {one.name for one in room.url_patterns} == {
        "review_sets", "review", "review_data", "review_flag", "review_plain", "review_decide", "review_accept",
        "review_undo", "review_answer", "review_sign", "review_reopen",  # test_views.py
        "review_record", "review_drawing",  # test_record.py, test_drawings.py
        "review_note", "review_result_note", "review_question", "review_questions",
    }  # fmt: skip


def test_an_empty_note_from_the_result_page_says_so(desk, client):
    review_set, tmax, _, maren = desk
    client.force_login(maren)
    address = reverse("review_result_note", args=[review_set.project.slug, review_set.pk, tmax.pk])
    page = client.post(address, {"text": " ", "kind": "note"}, follow=True)
    assert "A note says something." in page.content.decode()
    assert not Note.objects.exists()
