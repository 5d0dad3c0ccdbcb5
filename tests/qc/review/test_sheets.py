"""Decisions from a table: understood to the last row, or refused with every bad row named."""

import json

import pytest
from django.core.management import call_command

from labdata.errors import Conflict, InvalidInput, NotAllowed
from labdata.models import Project, Role, Sample
from qc.models import Decision, ReviewSet
from qc.review.services import sign_off
from qc.review.sheets import decide_from_sheet
from qc.review.standing import results_of, standing, verdict_counts
from tests.factories import PASSWORD, ProjectFactory
from tests.qc.review.wells import fill, people, person, results, small_set, table, well

pytestmark = [pytest.mark.django_db, pytest.mark.both]
HEADER = "sample,method,replicate,analyte,verdict,reason"


@pytest.fixture
def desk():
    """A set with samples A-1 to A-3, one of them run twice, and its geochemist."""
    review_set = small_set()
    of, columns = table(results_of(review_set).first().analysis.report, ["TOC", "S1", "S2", "TMAX"])
    sample = Sample.objects.get(well=review_set.well, label="A-3")
    again = results(sample, of, columns, 9, {"TOC": 1.31, "TMAX": 434}, replicate=2)
    review_set.items.create(analysis=again)
    return review_set, people(review_set.project)[0]


def give(review_set, user, *rows, header=HEADER):
    text = "\n".join([header, *rows])
    return decide_from_sheet(user=user, project=review_set.project, content=text.encode())


def verdicts(review_set):
    named = {r.pk: r for r in results_of(review_set).select_related("analyte", "analysis__sample")}
    return {
        (named[pk].analysis.sample.label, named[pk].analysis.replicate, named[pk].analyte.code): (s.verdict, s.reason, s.text)
        for pk, s in standing(results_of(review_set)).items()
    }  # fmt: skip


def test_one_result_a_whole_analysis_and_a_replicate(desk):
    review_set, chemist = desk
    answer = give(
        review_set, chemist, "A-1,pyrolysis,1,TMAX,rejected,low_signal", "A-2,pyrolysis,,,accept,",
        "A-3,pyrolysis,2,tmax,Hold,Repeat asked from the laboratory",
    )  # fmt: skip
    assert answer["decisions"] == 6 and answer["rows"] == 3
    assert answer["review_sets"][0]["review_set"] == review_set.pk
    said = verdicts(review_set)
    assert said["A-1", 1, "TMAX"] == ("rejected", "low_signal", "")
    assert said["A-3", 2, "TMAX"] == ("held", "repeat_asked", "")
    assert [said["A-2", 1, code][0] for code in ("TOC", "S1", "S2", "TMAX")] == ["accepted"] * 4
    assert Decision.objects.values("batch").distinct().count() == 1


def test_a_reason_in_free_words_is_kept_as_other(desk):
    review_set, chemist = desk
    give(review_set, chemist, 'A-1,pyrolysis,1,TMAX,rejected,"flat peak, no maximum"')
    assert verdicts(review_set)["A-1", 1, "TMAX"] == ("rejected", "other", "flat peak, no maximum")


def test_columns_in_any_order_with_semicolons_text_and_well(desk):
    review_set, chemist = desk
    give(
        review_set, chemist, f"{review_set.well.name};accepted;;geology;coaly streak;PYROLYSIS;a-1;TOC",
        header="\ufeffWell;Verdict;Replicate;Reason;Text;Method;Sample;Analyte",
    )  # fmt: skip
    assert verdicts(review_set)["A-1", 1, "TOC"] == ("accepted", "geology", "coaly streak")


def test_a_sample_may_be_named_by_its_number(desk):
    review_set, chemist = desk
    number = Sample.objects.get(well=review_set.well, label="A-1").pk
    give(review_set, chemist, f"{number},pyrolysis,1,TOC,accepted,")
    assert verdicts(review_set)["A-1", 1, "TOC"][0] == "accepted"


BAD_ROWS = [
    ("Z-9,pyrolysis,1,TMAX,accepted,", "sample", "there is no sample «Z-9» in the project"),
    (",pyrolysis,1,TMAX,accepted,", "sample", "names no sample"),
    ("A-1,gc,1,TMAX,accepted,", "method", "«gc» is no method of this sample"),
    ("A-1,,1,TMAX,accepted,", "method", "names no method"),
    ("A-1,pyrolysis,4,TMAX,accepted,", "replicate", "there is no replicate «4»"),
    ("A-3,pyrolysis,,TMAX,accepted,", "replicate", "the sample was run 2 times"),
    ("A-1,pyrolysis,1,RO,accepted,", "analyte", "«RO» was not measured in this analysis"),
    ("A-1,pyrolysis,1,TMAX,fine,", "verdict", "«fine» is no verdict"),
    ("A-1,pyrolysis,1,TMAX,,", "verdict", "«» is no verdict"),
    ("A-1,pyrolysis,1,TMAX,rejected,", "reason", "a result is not rejected without a reason"),
    ("A-1,pyrolysis,1,TMAX,hold,", "reason", "a result is not held without a reason"),
    ("A-1,pyrolysis,1,TMAX,hold,other", "reason", "the reason «other» needs words"),
    ("A-2,pyrolysis,1,TOC,rejected,depth", "sample", "decides again what row 2 decides"),
]


@pytest.mark.parametrize(("row", "column", "says"), BAD_ROWS)
def test_a_bad_row_is_named_and_nothing_is_decided(desk, row, column, says):
    review_set, chemist = desk
    with pytest.raises(InvalidInput) as refusal:
        give(review_set, chemist, "A-2,pyrolysis,1,TOC,accepted,", row)
    [fault] = refusal.value.where["rows"]
    assert (fault["row"], fault["column"], fault["message"]) == (3, column, says)
    assert fault["remedy"]
    assert f"row 3, {column}: {says}" in str(refusal.value)
    assert not Decision.objects.exists()


def test_every_bad_row_is_named_at_once(desk):
    review_set, chemist = desk
    with pytest.raises(InvalidInput, match=r"13 rows cannot be applied: row 3.*and 3 more"):
        give(review_set, chemist, "A-2,pyrolysis,1,TOC,accepted,", *(row for row, _, _ in BAD_ROWS))


@pytest.mark.parametrize(("content", "says"), [
    (b"", "The file is empty"),
    (b"sample,method,replicate,analyte,verdict,reason\n", "a header and no decisions"),
    (b"sample,method,verdict\nA-1,pyrolysis,accepted\n", "column «analyte» is missing"),
    (b"sample,method,analyte,verdict,color\nA-1,pyrolysis,TOC,accepted,red\n", "column «color» is not known"),
    (b"sample,method,analyte,verdict,verdict\n", "column «verdict» stands twice"),
    (b"sample,method,analyte,verdict\nA-1,pyrolysis,TOC,accept\xe9\n", "is not UTF-8 text"),
])  # fmt: skip
def test_a_table_that_is_none_is_refused(desk, content, says):
    review_set, chemist = desk
    with pytest.raises(InvalidInput, match=says):
        decide_from_sheet(user=chemist, project=review_set.project, content=content)


def test_a_label_used_in_two_wells_asks_for_the_well(desk):
    review_set, chemist = desk
    fill(well(review_set.project, "Ambry North"), 1)
    with pytest.raises(InvalidInput, match="«A-1» names 2 samples") as refusal:
        give(review_set, chemist, "A-1,pyrolysis,1,TOC,accepted,")
    assert "Name the well" in refusal.value.where["rows"][0]["remedy"]
    answer = give(review_set, chemist, "A-1,pyrolysis,1,TOC,accepted,,ambry north", header=HEADER + ",well")
    assert answer["review_sets"][0]["well"] == "Ambry North"
    with pytest.raises(InvalidInput, match="well «Nowhere» has no sample «A-1»"):
        give(review_set, chemist, "A-1,pyrolysis,1,TOC,accepted,,Nowhere", header=HEADER + ",well")


def test_a_signed_set_among_others_refuses_all(desk):
    review_set, chemist = desk
    other = fill(well(review_set.project, "Ambry North"), 1, prefix="N")
    give(review_set, chemist, "N-1,pyrolysis,1,,accepted,")
    approver = person(review_set.project, Role.APPROVER)
    sign_off(user=approver, review_set=other, password=PASSWORD, meaning="reviewed")
    before = Decision.objects.count()
    with pytest.raises(Conflict, match="was signed by"):
        give(review_set, chemist, "A-1,pyrolysis,1,TOC,accepted,", "N-1,pyrolysis,1,TOC,accepted,")
    assert Decision.objects.count() == before


def test_the_role_is_asked_first(desk):
    review_set, _ = desk
    with pytest.raises(NotAllowed, match="may not decide"):
        give(review_set, person(review_set.project, Role.APPROVER), "nonsense")


def run(capsys, *args) -> tuple[int, dict]:
    """A command with --json: exit status and its one object on stdout."""
    status = 0
    try:
        call_command(*args, "--json")
    except SystemExit as leaving:
        status = leaving.code
    return status, json.loads(capsys.readouterr().out)


def test_the_commands_decide_and_sign(desk, tmp_path, capsys, monkeypatch):
    review_set, chemist = desk
    approver = person(review_set.project, Role.APPROVER)
    path = tmp_path / "decisions.csv"
    rows = [f"A-{n},pyrolysis,1,,accepted," for n in (1, 2, 3)]
    path.write_text("\n".join([HEADER, *rows, "A-3,pyrolysis,2,,rejected,measurement"]), encoding="utf-8")
    slug = review_set.project.slug
    status, answer = run(capsys, "decide", f"--project={slug}", f"--file={path}", f"--user={chemist}")
    assert (status, answer["decisions"]) == (0, 14)
    monkeypatch.setenv("KEROGATE_PASSWORD", PASSWORD)
    ask = ("sign", f"--project={slug}", f"--review-set={review_set.pk}")
    status, answer = run(capsys, *ask, f"--user={approver}")
    assert (status, answer["counts"]["rejected"]) == (0, 2)
    assert verdict_counts(review_set)["undecided"] == 0
    status, answer = run(capsys, *ask, f"--user={approver}")
    assert (status, answer["error"]["code"]) == (1, "conflict")


@pytest.mark.parametrize(("args", "code"), [
    (("decide", "--file=/nowhere.csv", "--user={chemist}"), "not_found"),
    (("decide", "--file=/nowhere.csv", "--user=nobody"), "not_found"),
    (("sign", "--review-set=999999", "--user={approver}"), "not_found"),
    (("sign", "--review-set={set}", "--user={chemist}"), "not_allowed"),
    (("sign", "--review-set={set}", "--user={approver}"), "open_results"),
])  # fmt: skip
def test_a_refused_command_says_so_in_json(desk, capsys, monkeypatch, args, code):
    review_set, chemist = desk
    monkeypatch.setenv("KEROGATE_PASSWORD", PASSWORD)
    names = {"chemist": chemist, "approver": person(review_set.project, Role.APPROVER), "set": review_set.pk}
    name, *rest = [arg.format(**names) for arg in args]
    status, answer = run(capsys, name, f"--project={review_set.project.slug}", *rest)
    assert (status, answer["error"]["code"]) == (1, code)


def test_an_unknown_project_is_named(capsys, tmp_path):
    ProjectFactory(slug="known")
    status, answer = run(capsys, "decide", "--project=unknown", "--file=x", "--user=y")
    assert status == 1 and "known" in answer["error"]["remedy"]
    assert not ReviewSet.objects.exists() and Project.objects.count() == 1
