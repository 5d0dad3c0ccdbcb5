"""Bad files, tables, columns, cells and depths, and the exact words each is answered with."""

import io
import zipfile

import pytest

from labdata.access import Role
from labdata.errors import InvalidInput, NotAllowed, NotFound
from labdata.intake import services
from labdata.models import Membership, Sample, SourceFile, Upload, Well
from tests.factories import ProjectFactory, UserFactory, WellFactory
from tests.intake.landing import entry, findings_of, land, workbook

pytestmark = pytest.mark.django_db
HEAD = "Sample,Depth (m),TOC (wt%),S2 (mg/g)\n"
OLE = b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1"


def archive(files):
    stream = io.BytesIO()
    with zipfile.ZipFile(stream, "w", zipfile.ZIP_DEFLATED) as out:
        for name, content in files.items():
            out.writestr(name, content)
    return stream.getvalue()


def half_a_workbook():
    whole = workbook(lambda book: book.active.append(["Sample", "Depth (m)", "TOC (wt%)"]))
    return whole[: len(whole) // 2]


def tampered():
    """A workbook whose sheet does not have the checksum that it declares."""
    whole = archive({"xl/workbook.xml": "<workbook/>", "xl/worksheets/sheet1.xml": "1234567890"})
    stored = io.BytesIO()
    with zipfile.ZipFile(io.BytesIO(whole)) as old, zipfile.ZipFile(stored, "w", zipfile.ZIP_STORED) as new:
        for name in old.namelist():
            new.writestr(name, old.read(name))
    return stored.getvalue().replace(b"1234567890", b"1234567891")


FILES = {
    "empty": (b"", "«r.csv» is empty (0 bytes)."),
    "blanks only": (b" \n , \n", "«r.csv» holds nothing but blanks."),
    "a PDF named .csv": (b"%PDF-1.7 x", "«r.csv» is a PDF, not a table."),
    "a picture": (b"\x89PNG\r\n", "«r.csv» is a picture, not a table."),
    "an archive": (archive({"a.txt": "x"}), "«r.csv» is a zip archive, not a workbook."),
    "cut off": (half_a_workbook(), "«r.csv» is a damaged or incomplete workbook."),
    "zip bomb": (archive({"xl/workbook.xml": "x" * 60_000_000}), "«r.csv» would unpack to 60 MB from 0.06 MB; it is not read."),
    "damaged inside": (tampered(), "«r.csv» is a damaged or incomplete workbook (xl/worksheets/sheet1.xml in it is not whole)."),
    "damaged .xls": (OLE + b"\0" * 600, "«r.csv» is a damaged or incomplete workbook (Cannot detect file format)."),
    "password": (OLE + b"\0" * 100 + "EncryptedPackage".encode("utf-16-le"), "«r.csv» is protected with a password."),
    "a web page": (b"<html><table></table></html>", "«r.csv» is a web page or XML, whatever its name says."),
    "a well log": (b"~Version information\n VERS. 2.0:\n", "«r.csv» is a log without values."),
    "binary": (b"\x01\x02\x00\x03" * 50, "«r.csv» is neither a table of text nor a workbook: it holds binary data."),
    "open quote": (HEAD + 'A,10,"1,2\n', "«r.csv» breaks off inside a quoted cell (unexpected end of data)."),
}  # fmt: skip


@pytest.mark.parametrize(("content", "message"), FILES.values(), ids=FILES.keys())
def test_a_file_that_is_no_table_is_refused(content, message):
    answer = entry(ProjectFactory(), content, "r.csv")
    assert answer["outcome"] == "refused"
    (finding,) = answer["findings"]
    assert (finding["level"], finding["code"], finding["message"]) == ("error", "unreadable_file", message)
    assert finding["remedy"]


TABLES = {
    "no header": ("1,2,3\n4,5,6\n", "no_table", "A1", "No table of results was found in «r.csv»; its first line reads «1 | 2 | 3»."),
    "a letter": ("Dear colleague,\nplease find\n", "no_table", "A1", "No table of results was found in «r.csv»; its first line reads «Dear colleague»."),
    "no rows": (HEAD, "no_rows", "A1", "The table at A1:D1 has a header and no rows."),
    "no sample": ("TOC (wt%),S2 (mg/g)\n1,2\n", "no_sample_column", "A1", "The table at A1:B2 has neither a sample nor a depth column; its headers are «TOC (wt%)», «S2 (mg/g)»."),
    "wrong unit": ("Sample,Depth (m),Tmax (°F)\nA,10,800\n", "unit_not_convertible", "C1", "Column C «Tmax (°F)» is in degF, which does not convert to degC."),
    "text": (HEAD + "A,10,abc,1\n", "unreadable_value", "C2", "TOC in cell C2 cannot be read: «abc» is not a number."),
    "a range": (HEAD + "A,10,0.4 - 0.6,1\n", "unreadable_value", "C2", "TOC in cell C2 cannot be read: «0.4 - 0.6» is not a number."),
    "error cell": (HEAD + "A,10,#DIV/0!,1\n", "unreadable_value", "C2", "TOC in cell C2 cannot be read: «#DIV/0!» is a spreadsheet error."),
    "foreign unit": (HEAD + "A,10,5 degC,1\n", "unreadable_value", "C2", "TOC in cell C2 cannot be read: «5 degC» carries «degC», which is no unit of TOC."),
    "brackets": (HEAD + "A,10,(0.12),1\n", "unreadable_value", "C2", "TOC in cell C2 cannot be read: «(0.12)» is not a number."),
    "infinite": (HEAD + "A,10,1e999,1\n", "unreadable_value", "C2", "TOC in cell C2 cannot be read: «1e999» is not a finite number."),
    "depth text": (HEAD + "A,ten,1,1\n", "depth_unreadable", "B2", "Depth «ten» is not a depth."),
    "depth negative": (HEAD + "A,-5,1,1\n", "depth_negative", "B2", "Depth «-5» is negative; measured depth runs down from the well's datum."),
    "depth too deep": (HEAD + "A,99999,1,1\n", "depth_too_deep", "B2", "Depth «99999» is 99,999 m, deeper than any well."),
    "depth units mixed": (HEAD + "A,10 m - 20 ft,1,1\n", "depth_unreadable", "B2", "Depth «10 m - 20 ft» mixes metres and feet."),
    "nobody's row": (HEAD + ",,1,1\n", "row_without_sample", "A2", "Row 2 has values but neither a sample number nor a depth."),
    "replicate": ("Sample,Depth (m),Replicate,TOC (wt%)\nA,10,first,1\n", "replicate_unreadable", "C2", "Replicate «first» is neither a number from 1 nor a letter."),
    "no well in row": ("Well,Sample,Depth (m),TOC (wt%)\n,A,10,1\n", "row_without_well", "A2", "Row 2 names no well."),
}  # fmt: skip


@pytest.mark.parametrize(("content", "code", "cell", "message"), TABLES.values(), ids=TABLES.keys())
def test_a_fault_in_a_table_refuses_the_file_and_names_the_cell(content, code, cell, message):
    answer = entry(ProjectFactory(), content, "r.csv")
    assert answer["outcome"] == "refused"
    finding = findings_of(answer, "error")[0]
    assert (finding["code"], finding["cell"], finding["message"]) == (code, cell, message)
    assert finding["remedy"]


QUESTIONS = {
    "two TOC columns": ("Sample,Depth (m),TOC (wt%),TOC (wt%)\nA,10,1,2\n", "column:TOC", ["C", "D"]),
    "TOC without unit": ("Sample,Depth (m),TOC\nA,10,0.0074\n", "unit:C", ["fraction", "wt%"]),
    "depth without unit": ("Sample,Depth,TOC (wt%)\nA,10,1\n", "unit:B", ["m", "ft"]),
    "thousands or decimals": ("Sample\tDepth (m)\tTOC (wt%)\nA\t1,620\t2\n", "comma:A1", ["thousands", "decimal"]),
    "thousands or decimals between semicolons": ("Sample;Depth (ft);Ba (ppm)\nA;9,870;1,500\n", "comma:A1", ["thousands", "decimal"]),
    "elements without unit": ("Depth (m),Al,Fe,Mo\n10,1,2,3\n", "unit:elements", ["wt%", "ug/g"]),
    "PI above 1": ("Sample,Depth (m),PI\nA,10,12\n", "unit:C", ["fraction", "%"]),
}  # fmt: skip


@pytest.mark.parametrize(("content", "id_", "options"), QUESTIONS.values(), ids=QUESTIONS.keys())
def test_what_can_be_read_in_two_ways_is_asked_and_every_answer_is_taken(content, id_, options):
    project = ProjectFactory()
    answer = entry(project, content)
    assert answer["outcome"] == "waiting"
    (question,) = findings_of(answer, "question")
    assert (question["id"], question["options"]) == (id_, options)
    for option in options:
        assert entry(project, content, answers={id_: option})["outcome"].startswith("imported")


def test_an_answer_that_is_no_option_is_asked_again():
    answer = entry(ProjectFactory(), "Sample,Depth,TOC (wt%)\nA,10,1\n", answers={"unit:B": "furlongs"})
    assert findings_of(answer, "question")[0]["message"].endswith("The answer «furlongs» is none of the options.")


def test_every_bad_cell_is_named_not_just_the_first():
    rows = "".join(f"S{at},{at},x{at},y{at}\n" for at in range(2, 7))
    answer = entry(ProjectFactory(), HEAD + rows)
    assert [finding["cell"] for finding in answer["findings"]] == [f"{c}{r}" for c in "CD" for r in range(2, 7)]


def test_a_bad_cell_can_be_left_out_knowingly():
    landed = land(ProjectFactory(), HEAD + "A,10,abc,1\n", well="Quill 1", answers={"cell:C2": "blank"})
    counts = landed.upload.answer["counts"]
    assert (counts["results"], counts["named"]) == (1, 1)
    assert [finding["cell"] for finding in findings_of(landed.upload.answer, "warning")] == ["C2"]


def test_a_refused_file_leaves_nothing_behind_but_its_bytes_and_findings():
    project = ProjectFactory()
    landed = land(project, HEAD + "A,10,abc,1\nB,11,1,1\n", well="Quill 1")
    assert (landed.report, Well.objects.count(), Sample.objects.count()) == (None, 0, 0)
    assert (Upload.objects.get().outcome, SourceFile.objects.count()) == ("refused", 1)


def test_an_unknown_well_is_an_error_with_the_nearest_name():
    project = ProjectFactory()
    WellFactory(project=project, name="Quill 1")
    far, near = (entry(project, HEAD + "A,10,1,1\n", well=well, create_wells=False) for well in ("Nowhere 9", "Quil 1"))
    assert findings_of(far, "error")[0]["message"] == "There is no well «Nowhere 9» in the project."
    assert "Did you mean «Quill 1»?" in findings_of(near, "error")[0]["remedy"]


def test_a_near_miss_is_asked_never_taken():
    project = ProjectFactory()
    well = WellFactory(project=project, name="Quill 1")
    question = findings_of(entry(project, HEAD + "A,10,1,1\n", well="Quil 1"), "question")[0]
    assert (question["id"], question["options"]) == ("well:Quil 1", ["Quill 1", "new well"])
    landed = land(project, HEAD + "A,10,1,1\n", well="Quil 1", answers={"well:Quil 1": "Quill 1"})
    assert landed.well_ids == [well.pk]
    again = land(project, HEAD + "B,10,1,1\n", "other.csv", well="Quil 1", create_wells=False)
    assert again.well_ids == [well.pk]  # the spelling is an alias by now


def test_wells_whose_numbers_differ_are_no_near_miss():
    project = ProjectFactory()
    WellFactory(project=project, name="Quill 1")
    assert entry(project, HEAD + "A,10,1,1\n", well="Quill 2")["outcome"] == "imported"


def test_a_file_without_a_well_asks_for_it():
    project = ProjectFactory()
    WellFactory(project=project, name="Quill 1")
    answer = entry(project, HEAD + "A,10,1,1\n", well="")
    assert [(f["id"], f["options"]) for f in findings_of(answer, "question")] == [("well", ["Quill 1"])]
    assert entry(project, HEAD + "A,10,1,1\n", well="", answers={"well": "Quill 1"})["outcome"] == "imported"


def test_a_file_that_waits_is_settled_when_the_same_bytes_come_in_with_answers():
    project, text = ProjectFactory(), "Sample,Depth,TOC (wt%)\nA,10,1\n"
    waiting = land(project, text, well="Quill 1").upload
    land(project, text, well="Quill 1", answers={"unit:B": "m"})
    waiting.refresh_from_db()
    assert waiting.outcome == "already_held"


def test_the_same_request_made_twice_is_one_upload():
    project = ProjectFactory()
    first, again = (
        services.receive(project=project, name="r.csv", content=b"x", user=None, idem_key="once") for _ in range(2)
    )
    assert first == again


def test_a_large_workbook_is_read_in_a_process_of_its_own(monkeypatch):
    monkeypatch.setattr("labdata.intake.workbook.APART_BYTES", 1)
    rows = [["Sample", "Depth (m)", "TOC (wt%)"], ["A", 10, 1.5]]
    answer = entry(ProjectFactory(), workbook(lambda book: [book.active.append(row) for row in rows]), "x.xlsx")
    assert (answer["outcome"], answer["counts"]["results"]) == ("imported", 1)


def test_a_reader_that_exceeds_its_limits_refuses_the_file(monkeypatch):
    monkeypatch.setattr("labdata.intake.workbook.APART_BYTES", 1)
    monkeypatch.setattr("labdata.intake.apart.SECONDS", 0.01)
    answer = entry(ProjectFactory(), workbook(lambda book: book.active.append(["x"])), "x.xlsx")
    (finding,) = answer["findings"]
    assert (
        finding["message"]
        == "«x.xlsx» could not be read within the limits of memory and time (it took more than 0.01 s)."
    )


def test_who_may_not_upload_is_told_so():
    project, stranger, reader = ProjectFactory(), UserFactory(), UserFactory()
    Membership.objects.create(project=project, user=reader, role=Role.INTERPRETER)
    with pytest.raises(NotFound):
        services.receive(project=project, name="r.csv", content=b"x", user=stranger)
    with pytest.raises(NotAllowed, match="may not upload"):
        services.receive(project=project, name="r.csv", content=b"x", user=reader)
    assert not Upload.objects.exists()


def test_making_wells_needs_the_right_to_register():
    project, analyst = ProjectFactory(), UserFactory()
    Membership.objects.create(project=project, user=analyst, role=Role.ANALYST)
    with pytest.raises(NotAllowed, match="may not register"):
        services.receive(project=project, name="r.csv", content=b"x", user=analyst, create_wells=True)


def test_answers_must_be_an_object_of_texts():
    with pytest.raises(InvalidInput, match="Answers are an object"):
        entry(ProjectFactory(), HEAD + "A,10,1,1\n", answers=["ft"])
