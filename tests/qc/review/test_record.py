"""The signed record: what was signed, by whom, when and meaning what, read back from the PDF itself."""

import re

import pytest
from django.urls import reverse

from labdata.models import Role
from qc.models import ReviewSet
from qc.review.record import record, signed_lines
from qc.review.record_pdf import record_pdf
from qc.review.services import Choice, answer_flags, decide, reopen, sign_off
from qc.review.standing import results_of
from tests.factories import PASSWORD, UserFactory
from tests.qc.review.test_arrival import bench, later_version  # noqa: F401 - a fixture
from tests.qc.review.wells import flag, people, person, qc_run, small_set

pytestmark = pytest.mark.django_db


def text_of(pdf: bytes) -> str:
    """What the page contents of an uncompressed PDF say, in order; signs beyond ASCII are left out."""
    shown = re.findall(rb"\(((?:[^()\\]|\\.)*)\) Tj", pdf)
    plain = re.compile(rb"\\([0-7]{3}|.)")
    unescape = lambda found: bytes([int(found[1], 8) & 255]) if found[1].isdigit() else found[1]  # noqa: E731
    words = [plain.sub(unescape, part).decode("latin-1") for part in shown]
    return re.sub(r"\s+", " ", " ".join(words))


@pytest.fixture
def signed():
    """A set with one rejection, signed by Ysolde Marr; its chemist, approver and signature."""
    review_set = small_set(samples=2)
    qc_run(review_set.well)
    chemist = person(review_set.project, Role.GEOCHEMIST, "maren", first_name="Maren", last_name="Holt")
    approver = person(review_set.project, Role.APPROVER, "ysolde", first_name="Ysolde", last_name="Marr")
    ids = list(results_of(review_set).order_by("pk").values_list("pk", flat=True))
    decide(user=chemist, review_set=review_set, choices=[
        Choice(ids[0], "rejected", "depth", "wrong bag"), *(Choice(pk, "accepted") for pk in ids[1:])])  # fmt: skip
    return review_set, chemist, approver, sign(review_set, approver)


def sign(review_set, approver):
    return sign_off(user=approver, review_set=review_set, password=PASSWORD, meaning="reviewed_limits")


def said(sign_off) -> str:
    return text_of(record_pdf(record(sign_off), compress=False))


def test_it_says_who_signed_when_meaning_what_and_over_what(signed):
    review_set, _, _, signature = signed
    text = said(signature)
    for part in (
        "Signed record", f"Well {review_set.well.name}, review set 1", "Ysolde Marr", "ysolde", signature.meaning[:40],
        f"{signature.signed_at:%Y-%m-%d %H:%M:%S} UTC", "8: 7 accepted, 1 rejected, 0 held, 0 undecided",
        signature.content_sha256, "rule set standard version 1", "the results and verdicts of then give this hash", "in force",
        "This is the first signature of the set.", "page 1 of 1", "End of the signed record",
    ):  # fmt: skip
        assert part in text, part


def test_every_rejected_result_is_named_with_reason_and_person(signed):
    text = said(signed[3])
    assert "Rejected results: 1" in text and "A-1" in text and "wrong depth or wrong sample: wrong bag" in text
    assert "Maren Holt" in text and "none: a set is not signed while a result is on hold" in text


def test_the_same_signature_gives_the_same_bytes(signed):
    signature = signed[3]
    assert record_pdf(record(signature)) == record_pdf(record(signature))


def test_a_later_signature_says_what_changed_and_the_earlier_one_stays_readable(signed):
    review_set, chemist, approver, first = signed
    before = signed_lines(first)
    reopen(user=approver, review_set=review_set, reason="Tmax of A-2 is in doubt")
    tmax = results_of(review_set).get(analyte__code="TMAX", analysis__sample__label="A-2")
    decide(user=chemist, review_set=review_set, choices=[Choice(tmax.pk, "rejected", "low_signal")])
    second = sign(review_set, approver)
    ended, again = record(first), record(second)
    assert ended.lines == before and ended.whole and again.whole
    assert "re-opened" in said(first) and "Tmax of A-2 is in doubt" in said(first)
    [change] = again.changed
    assert (change.name.split(",")[0], change.before, change.now) == (
        "TMAX of A-2", "432, accepted", "432, rejected (signal too small)",
    )  # fmt: skip
    assert [event.by for event in again.events] == ["ysolde", "maren"]
    assert "Signed before" in said(second) and "re-opened it" in said(second)


def test_answers_to_flags_are_counted_alike(signed):
    review_set, chemist, approver, _ = signed
    reopen(user=approver, review_set=review_set, reason="flags came in")
    two = [flag(one) for one in results_of(review_set).filter(analyte__code="TMAX")]
    answer_flags(user=chemist, review_set=review_set, flags=[(one.rule, one.fingerprint) for one in two],
                 answer="dismissed", reason="seen in the core")  # fmt: skip
    assert record(sign(review_set, approver)).answers == [
        ("tmax_range", "dismissed", "seen in the core", "Maren Holt (maren)", 2)
    ]


def test_a_name_corrected_in_the_registry_is_said(signed):
    review_set, _, _, signature = signed
    review_set.well.name = "Renamed 1"
    review_set.well.save()
    signature.refresh_from_db()
    assert "no longer give this hash" in said(signature.__class__.objects.get(pk=signature.pk))


def test_many_rejections_run_over_numbered_pages():
    review_set = small_set(samples=40)
    chemist, approver = people(review_set.project)
    decide(user=chemist, review_set=review_set, choices=[
        Choice(pk, "rejected", "other", "<b>& odd ☂") for pk in results_of(review_set).values_list("pk", flat=True)])  # fmt: skip
    text = said(sign(review_set, approver))
    pages = [(int(n), int(m)) for n, m in re.findall(r"page (\d+) of (\d+)", text)]
    assert len(pages) > 3 and pages == [(n, len(pages)) for n in range(1, len(pages) + 1)]
    assert text.count("(say which):") == text.count("< b > & odd") == 160


def test_members_get_the_file_and_nobody_else(signed, client):
    review_set, _, _, signature = signed
    address = reverse("review_record", args=[review_set.project.slug, review_set.pk, signature.pk])
    assert client.get(address).status_code == 302
    client.force_login(UserFactory())
    assert client.get(address).status_code == 404
    for role in Role:
        client.force_login(person(review_set.project, role))
        answer = client.get(address)
        assert (answer.status_code, answer["Content-Type"], answer.content[:5]) == (200, "application/pdf", b"%PDF-")
    other = small_set(review_set.project)
    assert (
        client.get(reverse("review_record", args=[review_set.project.slug, other.pk, signature.pk])).status_code == 404
    )
    assert ReviewSet.objects.count() == 2


def test_a_later_report_version_leaves_the_record_of_what_was_signed(bench):  # noqa: F811
    first = bench.review_set.sign_offs.get()
    before = signed_lines(first)
    fresh = later_version(bench.report, bench.analyses, changes={"TMAX": 441}, drop=("S1",))
    ended = record(first)
    assert ended.whole and ended.lines == before and len(ended.lines) == 8
    assert "changed, added or withdrew signed values" in ended.reopening.reason and ended.reopening.reopened_by is None
    tmax = fresh[0].results.get(analyte__code="TMAX")
    decide(user=bench.chemist, review_set=bench.review_set, choices=[Choice(tmax.pk, "accepted")])
    again = record(sign(bench.review_set, person(bench.project, Role.APPROVER)))
    assert again.whole
    changed = {change.name.split(" ")[0]: (change.before, change.now) for change in again.changed}
    assert changed == {"TMAX": ("436, accepted", "441, accepted"), "S1": ("0.40, accepted", "")}
    assert [event.by for event in again.events][:2] == ["system", "system"]
