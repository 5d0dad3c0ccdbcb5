"""A later version of a report: value by value, the earlier one kept."""

import pytest

from labdata import audit
from labdata.models import Analysis, AuditEntry, Report, Result, Sample
from tests.factories import ProjectFactory
from tests.intake.landing import entry, findings_of, land

pytestmark = [pytest.mark.django_db, pytest.mark.both]
HEAD = "Report No.: KG-17{title},,,\nSample,Depth (m),TOC (wt%),S2 (mg/g)\n"
FIRST = HEAD.format(title="") + "A,10,1.00,2.5\nB,11,1.10,<0.05\nC,12,1.20,3.5\nD,13,1.3,\n"
SECOND = HEAD.format(title=" Rev 2") + "A,10,1.0,2.6\nB,11,1.10,<0.05\nC,12.5,1.20,3.5\nD,13,1.3,4\n"


def two_versions(second=SECOND, **options):
    project = ProjectFactory()
    first = land(project, FIRST, "first.csv", well="Quill 1")
    return first, land(project, second, "second.csv", well="Quill 1", **options)


def named(pairs):
    """{(sample, analyte): (old text, new text)} of pairs of results."""
    results = Result.objects.select_related("analysis__sample", "analyte").in_bulk(
        [pk for pair in pairs for pk in pair]
    )
    return {
        (results[new].analysis.sample.label, results[new].analyte.code): (
            results[old].value_reported,
            results[new].value_reported,
        )
        for old, new in pairs
    }


def test_the_later_version_supersedes_and_the_earlier_stays():
    first, second = two_versions()
    report = second.report
    assert (report.number, report.version, report.supersedes) == ("KG-17", 2, first.report)
    assert not Result.objects.filter(analysis__report=first.report, current=True).exists()
    assert Result.objects.filter(analysis__report=first.report).count() == 7
    assert Result.objects.filter(current=True).count() == 8


def test_every_value_is_unchanged_changed_added_or_withdrawn():
    _, second = two_versions()
    assert named(second.changed) == {("A", "S2"): ("2.5", "2.6")}
    assert named(second.unchanged) == {
        ("A", "TOC"): ("1.00", "1.0"), ("B", "TOC"): ("1.10", "1.10"), ("B", "S2"): ("<0.05", "<0.05"),
        ("C", "TOC"): ("1.20", "1.20"), ("C", "S2"): ("3.5", "3.5"), ("D", "TOC"): ("1.3", "1.3"),
    }  # fmt: skip
    assert second.withdrawn == []
    counts = {
        key: second.report.difference[key]
        for key in ("added", "changed", "withdrawn", "unchanged", "superseded", "revision")
    }
    assert counts == {"added": 1, "changed": 1, "withdrawn": 0, "unchanged": 6, "superseded": 1, "revision": 2}
    assert second.report.difference["values"] == [
        {"what": "changed", "sample": "A", "analyte": "S2", "was": "2.5", "now": "2.6"},
        {"what": "added", "sample": "D", "analyte": "S2", "was": "", "now": "4"},
    ]


def test_new_results_know_what_they_supersede_and_keep_the_replicate():
    _, second = two_versions()
    for old, new in second.changed + second.unchanged:
        assert Result.objects.get(pk=new).supersedes_id == old
    assert set(Analysis.objects.current().values_list("replicate", flat=True)) == {1}
    assert len(second.replaced_analyses) == 4


def test_a_corrected_depth_is_another_sample_of_the_same_analysis():
    _, second = two_versions()
    assert list(Sample.objects.filter(label="C").values_list("top_md_m", flat=True)) == [12.0, 12.5]
    new = Analysis.objects.current().get(sample__label="C")
    assert Analysis.objects.get(pk=second.replaced_analyses[new.pk]).sample.top_md_m == 12.0


def test_a_row_that_is_gone_is_withdrawn_and_said_so():
    first, second = two_versions(HEAD.format(title=" Rev 2") + "A,10,1,2.5\nB,11,1.1,<0.05\nC,12,1.2,3.5\n")
    gone = Result.objects.filter(pk__in=second.withdrawn).values_list(
        "analysis__sample__label", "analyte__code", "current"
    )
    assert list(gone) == [("D", "TOC", False)]
    assert (
        findings_of(second.upload.answer, "warning")[0]["message"]
        == "1 values of version 1 are not in this version and are withdrawn."
    )
    assert second.upload.outcome == "imported_with_findings"
    assert first.report.tables.count() == 1


PART = HEAD.format(title=" Rev 2") + "A,10,1,9.9\n"


@pytest.mark.parametrize(("answer", "current"), [("withdrawn", 2), ("still valid", 7)])
def test_a_version_that_lacks_most_rows_is_asked_about(answer, current):
    project = ProjectFactory()
    land(project, FIRST, "first.csv", well="Quill 1")
    question = findings_of(entry(project, PART, "part.csv"), "question")[0]
    assert (question["id"], question["options"]) == ("missing_rows", ["withdrawn", "still valid"])
    land(project, PART, "part.csv", well="Quill 1", answers={"missing_rows": answer})
    assert Result.objects.filter(current=True).count() == current


def test_other_content_under_the_same_number_is_asked_about():
    project = ProjectFactory()
    land(project, FIRST, "first.csv", well="Quill 1")
    other = FIRST.replace("2.5", "2.7")
    question = findings_of(entry(project, other, "again.csv"), "question")[0]
    assert (question["id"], question["options"]) == ("version", ["amended version", "separate report"])
    amended = land(project, other, "again.csv", well="Quill 1", answers={"version": "amended"})
    assert (amended.report.version, len(amended.changed)) == (2, 1)


def test_a_separate_report_of_the_same_number_adds_replicates():
    project = ProjectFactory()
    land(project, FIRST, "first.csv", well="Quill 1")
    other = land(
        project, FIRST.replace("2.5", "2.7"), "again.csv", well="Quill 1", answers={"version": "separate report"}
    )
    assert (other.report.number, other.report.version) == ("again", 1)
    assert set(other.report.analyses.values_list("replicate", flat=True)) == {2}
    assert Analysis.objects.current().count() == 8


def test_the_file_name_may_tell_the_version():
    project = ProjectFactory()
    text = FIRST.partition("\n")[2]
    land(project, text, "core A.csv", well="Quill 1")
    second = land(project, text.replace("2.5", "2.7"), "core A_v2.csv", well="Quill 1")
    assert (second.report.number, second.report.version) == ("core A", 2)
    third = land(project, text.replace("2.5", "2.8"), "core A_amended.csv", well="Quill 1")
    assert third.report.version == 3
    assert Report.objects.count() == 3


def test_the_same_bytes_again_change_nothing():
    project = ProjectFactory()
    land(project, FIRST, "first.csv", well="Quill 1")
    before = Result.objects.count()
    again = land(project, FIRST, "copy.csv", well="Quill 1")
    assert (again.report, again.upload.outcome, Result.objects.count()) == (None, "already_held", before)
    assert again.upload.answer["report"] == "KG-17"


def test_landing_is_in_the_audit_trail():
    _, second = two_versions()
    last = AuditEntry.objects.order_by("-seq").first()
    assert (last.action, last.object_id) == ("report.imported", str(second.report.pk))
    assert last.after["difference"]["changed"] == 1
    audit.verify()


def test_further_measurements_of_a_sample_are_its_next_replicates():
    project = ProjectFactory()
    text = "Sample,Depth (m),TOC (wt%)\nA,10,1.0\nA,10,1.1\n"
    land(project, text, "one.csv", well="Quill 1")
    land(project, text.replace("1.1", "1.2"), "two.csv", well="Quill 1")
    assert sorted(Analysis.objects.current().values_list("replicate", flat=True)) == [1, 2, 3, 4]
    assert Sample.objects.count() == 1
