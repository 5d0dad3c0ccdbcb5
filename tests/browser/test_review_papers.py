"""What leaves the review page: figures and the signed record as files; and the threads on flags and results."""

from pathlib import Path

import pytest

from labdata.models import Role
from qc.models import Note
from qc.review.services import Choice, decide, sign_off
from qc.review.standing import results_of
from tests.browser.test_review_page import assert_accessible, open_review, until
from tests.factories import PASSWORD
from tests.qc.review.wells import flag, people, person, small_set

pytestmark = [pytest.mark.browser, pytest.mark.django_db(transaction=True)]


def test_a_plot_and_the_signed_record_are_downloaded(live_server, page_for):
    review_set = small_set(samples=2)
    chemist, approver = people(review_set.project)
    decide(user=chemist, review_set=review_set, choices=[
        Choice(pk, "accepted") for pk in results_of(review_set).values_list("pk", flat=True)])  # fmt: skip
    signature = sign_off(user=approver, review_set=review_set, password=PASSWORD, meaning="reviewed")
    page = open_review(page_for(chemist), live_server, review_set)
    page.click("summary:text-is('Download')")
    for choice, name in (
        ({"label": "S2 – TOC"}, "S2-TOC.svg"),
        ({"label": "S1"}, "S1.svg"),
        ({"value": "shown"}, "TOC-S1.svg"),
    ):
        page.select_option("#drawing-what", **choice)
        page.check("#drawing input[value=svg]")
        with page.expect_download() as waiting:
            page.click("#drawing button")
        assert waiting.value.suggested_filename.endswith(name)
        assert "<svg" in Path(waiting.value.path()).read_text(encoding="utf-8")
    assert_accessible(page)
    page.keyboard.press("Escape")
    page.click("#tab-sign")
    with page.expect_download() as waiting:
        page.click("text=Signed record (PDF)")
    assert waiting.value.suggested_filename.endswith(f"signature-{signature.pk}.pdf")


def test_a_question_is_asked_on_a_flag_and_answered_on_the_result(live_server, page_for):
    review_set = small_set(samples=3)
    tmax = results_of(review_set).get(analyte__code="TMAX", analysis__sample__label="A-2")
    flag(tmax)
    page = open_review(page_for(person(review_set.project, Role.GEOCHEMIST, "maren")), live_server, review_set)
    page.click("details.rule summary")
    page.click("details.thread summary")
    page.fill("details.thread textarea", "Was the S2 peak bimodal?")
    page.check("details.thread [name=ask]")
    page.click("details.thread button[type=submit]")
    until(page, "document.querySelector('.note-question')")
    assert "no answer yet" in page.inner_text("details.thread")
    assert_accessible(page)
    with page.expect_download() as waiting:
        page.click("text=1 open question to the laboratory, as a text")
    assert "Cell: Data!G3" in Path(waiting.value.path()).read_text(encoding="utf-8")
    page.goto(f"{live_server.url}/p/{review_set.project.slug}/results/{tmax.pk}/")
    page.click("text=Text for the laboratory")
    page.click("text=Write down the answer")
    page.fill("#notes form >> nth=0 >> textarea", "A slip of ours; an amended report follows.")
    assert_accessible(page)
    page.click("#notes form >> nth=0 >> button")
    until_text(page, "amended report follows")
    assert Note.objects.get(kind="answer").answers == Note.objects.get(kind="question")


def until_text(page, text: str) -> None:
    page.wait_for_selector(f"#notes >> text={text}")
