"""Files changed at random, seeded: reading never crashes and never hangs, and a file is in whole or not at all."""

import io
import random
import time
import zipfile

import pytest

from labdata.intake.preparing import Request, prepare_file
from labdata.models import Analysis, LogCurve, Report, Result, Sample, SurveyStation, Upload, Well
from tests.factories import ProjectFactory
from tests.intake.corpus import clean, control_rows, make, qualified
from tests.intake.landing import land
from tests.intake.test_percent import as_ods, as_xls
from tests.intake.test_real_records import REAL

pytestmark = pytest.mark.django_db
WORDS = [
    b"<", b"&", b"\x00", b"\xff\xfe", b"1e999", b"NaN", b"-999.25", b"\r", b"\t", b'"', b"'", b";;;;", b",,,,", b"99999999999999999999", b"=1+1",
    b"\xef\xbb\xbf", b"10     2", b"40     1   10", b"~A", b"# UNITS: FT", b"\n\n", b"Depth", b"TOC (%)", b"</row>", b"<row r=\"0\">", b"r=\"A0\"", b"\xe2\x88\x9e",
]  # fmt: skip


def seeds():
    """Small files of every kind that is read."""
    files = {
        f"{layout}.xlsx": make(layout, qualified, "pyrolysis", 1, "xlsx").content
        for layout in ("units row", "turned", "beside")
    }
    files |= {
        "control.csv": make("one row", control_rows, "carbon", 1, "csv").content,
        "plain.csv": make("turned", clean, "elements", 1, "csv").content,
    }
    files |= {"old.xls": as_xls(), "open.ods": as_ods()}
    for path in (
        "surveys/P-135_deviation_survey.xlsx",
        "surveys/wellpathpy_deviation.csv",
        "tops/4900527774.tops",
        "tops/Tops_Alcor14.csv",
    ):
        files[path.rpartition("/")[2]] = (REAL / path).read_bytes()
    core = (REAL / "core_analysis/7121_8-1__ROCK_AND_CORE__CORE_CONV_RAW_1.SPWLA").read_bytes()
    files["core.txt"] = core[:6000]
    for name in ("6038187_v1.2.las", "P-135_first700steps.LAS"):
        files[name] = (REAL / "las" / name).read_bytes()[:12_000]
    return files


def mutate(rng, content):
    """The content with one to eight changes: bytes changed, parts cut out, doubled, moved, or words put in."""
    data = bytearray(content)
    for _ in range(rng.randint(1, 8)):
        at, size = rng.randrange(len(data) + 1), rng.choice([1, 1, 2, 8, 60])
        act = rng.randrange(6)
        if act == 0 and at < len(data):
            data[at] = rng.randrange(256)
        elif act == 1:
            del data[at : at + size]
        elif act == 2:
            data[at:at] = data[at : at + size]
        elif act == 3:
            data[at:at] = rng.choice(WORDS)
        elif act == 4:
            data = data[: max(1, at)] if rng.random() < 0.3 else data
        else:
            other = rng.randrange(len(data) + 1)
            data[at:at] = data[other : other + size]
        if not data:
            data = bytearray(b" ")
    return bytes(data)


def mutate_inside(rng, content):
    """A zip archive with one of its parts changed, whole as an archive."""
    stream = io.BytesIO()
    with zipfile.ZipFile(io.BytesIO(content)) as old, zipfile.ZipFile(stream, "w", zipfile.ZIP_DEFLATED) as new:
        names = old.namelist()
        chosen = rng.choice([name for name in names if name.endswith((".xml", ".rels"))] or names)
        for name in names:
            if name == chosen and rng.random() < 0.05:
                continue
            new.writestr(name, mutate(rng, old.read(name)) if name == chosen else old.read(name))
    return stream.getvalue()


def mutations(count):
    """(name, content), seeded."""
    rng = random.Random(20)
    files = sorted(seeds().items())
    for at in range(count):
        name, content = files[at % len(files)]
        if name == "old.xls" and at > 100:
            continue  # each is read in a process of its own, which takes its time
        inside = content.startswith(b"PK") and rng.random() < 0.8
        yield f"{at} {name}", mutate_inside(rng, content) if inside else mutate(rng, content)


def test_reading_never_crashes_and_never_hangs():
    project = ProjectFactory()
    outcomes = dict.fromkeys(Upload.Outcome.values, 0)
    started = time.perf_counter()
    for name, content in mutations(600):
        before = time.perf_counter()
        request = Request(project, name, content, "0" * 64, well="Quill 1", create_wells=True)
        prepared = prepare_file(request, lambda note: None)
        assert prepared.lands or prepared.findings.found, name
        assert all(finding.message for finding in prepared.findings.found), name
        assert time.perf_counter() - before < 10, name
        outcomes[prepared.outcome] += 1
        if time.perf_counter() - started > 12:
            break
    assert outcomes["refused"] > 20
    assert outcomes["imported"] + outcomes["imported_with_findings"] > 20


def test_a_file_is_in_whole_or_not_at_all():
    project = ProjectFactory()
    for name, content in mutations(45):
        before = [model.objects.count() for model in (Well, Sample, Report, Analysis, Result, SurveyStation, LogCurve)]
        landed = land(project, content, f"{name}.bin", well="Quill 1", answers={"version": "separate report"})
        after = [model.objects.count() for model in (Well, Sample, Report, Analysis, Result, SurveyStation, LogCurve)]
        if landed.report is None:
            assert before == after, name
            continue
        counts = landed.upload.answer["counts"]
        assert after[4] - before[4] == counts["results"], name
        assert after[3] - before[3] == counts["analyses"], name
        assert counts["cells"] == counts["results"] + counts["blank"] + counts["named"], name
