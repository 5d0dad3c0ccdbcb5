"""Files made to hurt: each is refused in plain words, or read, within the time and memory of one ordinary file."""

import io
import resource
import time
import zipfile

import pytest

from labdata.intake.preparing import Request, prepare_file
from labdata.models import Sample, Upload
from tests.factories import ProjectFactory
from tests.intake.landing import land, workbook
from tests.intake.test_percent import as_ods
from tests.intake.test_real_records import REAL

pytestmark = pytest.mark.django_db
ROWS = [["Sample", "Depth (m)", "TOC (wt%)"], ["A", 10, 1.5], ["B", 20, 2.5]]
BOMB = "<!DOCTYPE z [" + '<!ENTITY a "aaaaaaaaaa">' + "".join(
    f'<!ENTITY {name} "{f"&{before};" * 10}">' for before, name in zip("abcdefghij", "bcdefghijk", strict=True)
) + "]>"  # fmt: skip


def plain():
    return workbook(lambda book: [book.active.append(row) for row in ROWS])


def changed(content, part, change):
    """The archive with one of its parts changed."""
    stream = io.BytesIO()
    with zipfile.ZipFile(io.BytesIO(content)) as old, zipfile.ZipFile(stream, "w", zipfile.ZIP_DEFLATED) as new:
        for entry in old.infolist():
            data = old.read(entry.filename)
            new.writestr(entry.filename, change(data) if entry.filename == part else data)
    return stream.getvalue()


SHEET = "xl/worksheets/sheet1.xml"


def with_entities(part):
    def put(data):
        return data.replace(b"?>", b"?>" + BOMB.encode(), 1) if data.startswith(b"<?xml") else BOMB.encode() + data

    return lambda: changed(plain(), part, put)


def far_corner():
    def fill(book):
        for row in ROWS:
            book.active.append(row)
        book.active["XFD1048576"] = 1

    return workbook(fill)


def far_row():
    return changed(
        plain(),
        SHEET,
        lambda data: data.replace(b"</sheetData>", b'<row r="1048576"><c r="ZZ1048576"><v>1</v></c></row></sheetData>'),
    )


def declared_only():
    return changed(
        plain(), SHEET, lambda data: data.replace(b'<dimension ref="A1:C3"', b'<dimension ref="A1:XFD1048576"')
    )


def repeated_cells():
    content = as_ods()
    old, new = (
        b'<table:table-cell office:value-type="float"',
        b'<table:table-cell table:number-columns-repeated="16000" office:value-type="float"',
    )
    return changed(
        content,
        "content.xml",
        lambda data: data.replace(
            b"<table:table-row>", b'<table:table-row table:number-rows-repeated="1000000">'
        ).replace(old, new),
    )


def deep_xml():
    return changed(plain(), SHEET, lambda data: data.replace(b"<sheetData>", b"<x>" * 200_000 + b"<sheetData>"))


def wide_text():
    return ("Sample,Depth (m),TOC (wt%)" + "," * 200_000 + "\nA,10,1\n").encode()


def long_cell():
    return ("Sample,Depth (m),TOC (wt%)\nA,10," + "9" * 1_000_000 + "\n").encode()


def many_headers():
    return (("Sample,Depth (m),TOC (wt%)\n" * 3000) + "A,10,1\n").encode()


def many_depths():
    return (
        b"~Version\n VERS. 2.0:\n WRAP. NO:\n~Well\n NULL. -999.25:\n~Curve\n DEPT.M :\n GR.GAPI :\n~A\n"
        + b"1 1e309\n" * 50_000
    )


def text_in_log():
    return b"~Version\n VERS. 2.0:\n WRAP. NO:\n~Well\n WELL. Quill 1:\n NULL. -999.25:\n~Curve\n DEPT.M :\n GR.GAPI :\n~A\n1 2\n2 x\n3 4\n"


def log_of_version_three():
    return b"~Version\n VERS. 3.0:\n WRAP. NO:\n~Well\n NULL. -999.25:\n~Curve\n DEPT.M :\n GR.GAPI :\n~A\n1 2\n"


def cut(path, share):
    content = (REAL / path).read_bytes()
    return content[: int(len(content) * share)]


REFUSED = {
    "entities in a sheet": with_entities(SHEET), "entities in the strings": with_entities("xl/workbook.xml"),
    "entities in the styles": with_entities("xl/styles.xml"), "a cell in the far corner": far_corner, "a cell in a far row": far_row,
    "cells repeated without end": repeated_cells, "a cell of a million digits": long_cell,
    "a log of version three": log_of_version_three, "a log with text among its readings": text_in_log,
    "a workbook cut off": lambda: plain()[:-200], "a survey cut off": lambda: cut("surveys/P-135_deviation_survey.xlsx", 0.7),
    "a header alone": lambda: cut("las/6038187_v1.2.las", 0.01), "a picture with a workbook's name": lambda: b"\x89PNG\r\n\x1a\n" + b"\0" * 99,
    "nothing but zeros": lambda: b"\0" * 5000, "random bytes": lambda: bytes(range(256)) * 40,
}  # fmt: skip
READ = {
    "nested without end": deep_xml,
    "a declared range without end": declared_only, "a very wide line": wide_text, "a header three thousand times": many_headers,
    "a log of infinite readings": many_depths, "core text cut off": lambda: cut("core_analysis/7121_8-1__ROCK_AND_CORE__CORE_CONV_RAW_1.SPWLA", 0.5),
}  # fmt: skip


def read(project, name, content):
    """(prepared, seconds), the memory of the process held against a gigabyte."""
    before = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
    started = time.perf_counter()
    request = Request(project, name, content, "0" * 64, well="Quill 1", create_wells=True)
    prepared = prepare_file(request, lambda note: None)
    assert resource.getrusage(resource.RUSAGE_SELF).ru_maxrss - before < 1_000_000
    return prepared, time.perf_counter() - started


@pytest.mark.parametrize("make", REFUSED.values(), ids=REFUSED.keys())
def test_is_refused_in_plain_words(make):
    prepared, seconds = read(ProjectFactory(), "hostile.xlsx", make())
    assert prepared.outcome == Upload.Outcome.REFUSED
    errors = [finding for finding in prepared.findings.found if finding.level == "error"]
    assert all(finding.message and finding.remedy for finding in errors)
    assert seconds < 20


@pytest.mark.parametrize("make", READ.values(), ids=READ.keys())
def test_is_read_or_refused_within_the_limits(make):
    prepared, seconds = read(ProjectFactory(), "hostile.xlsx", make())
    assert prepared.findings.found or prepared.lands
    assert seconds < 20


def test_formulas_are_text_and_never_run():
    def fill(book):
        for row in (*ROWS, ["=cmd|'/c calc'!A1", 30, 3.5], ["@SUM(1)", 40, 4.5]):
            book.active.append(row)
        book.active["A4"].data_type = "s"

    landed = land(ProjectFactory(), workbook(fill), "formulas.xlsx", well="Quill 1")
    assert set(Sample.objects.values_list("label", flat=True)) == {"A", "B", "=cmd|'/c calc'!A1", "@SUM(1)"}
    assert landed.upload.answer["counts"]["results"] == 4
