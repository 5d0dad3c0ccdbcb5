"""A project in which no page is empty: files, results, flags, decisions, a signature, a release, jobs, tokens."""

import io
from dataclasses import dataclass, field
from datetime import timedelta

from django.core.files.base import ContentFile
from django.core.files.storage import default_storage
from django.db import transaction
from django.utils import timezone
from openpyxl import Workbook

from labdata import audit
from labdata.models import (
    CasingShoe,
    CoreRun,
    CustodyEvent,
    FormationTop,
    Job,
    JobEvent,
    JobState,
    MudInterval,
    Release,
    Result,
    SourceFile,
    SweeperBeat,
    Upload,
    Well,
)
from labdata.release import manifest as manifests
from labdata.release import parquet
from labdata.release.rows import read
from labdata.release.services import signed_data
from labdata.tokens import issue_token
from qc.models import Flag, QcRun, QcRunWell, RuleSet, Severity
from tests.release.scene import ANALYTES, Scene, small_scene

QUESTION = {
    "level": "question", "id": "unit:Sheet1!H", "code": "unit_missing", "sheet": "Sheet1", "cell": "H1", "value": "TOC",
    "message": "The column TOC names no unit.", "remedy": "Ask the laboratory.", "options": ["wt%", "fraction"],
}  # fmt: skip
ANSWER = {
    "outcome": "waiting",
    "tables": [{"sheet": "Sheet1", "range": "A1:N9", "kind": "pyrolysis", "unmapped": ["Analyst"], "columns": [
        {"column": "F", "header": "S2 (mg/g)", "field": "S2", "unit": "mg/g", "confidence": 0.98, "reason": "the header"},
        {"column": "N", "header": "TOC", "field": "TOC", "unit": "", "confidence": 0.6, "reason": "values up to 3"}]}],
    "counts": {"wells_new": 0, "samples_new": 3, "samples_matched": 3, "analyses": 6, "results": 24, "blank": 1},
    "findings": [QUESTION, {"level": "warning", "id": "w1", "code": "footnote", "sheet": "Sheet1", "cell": "F7",
                            "value": "0.5*", "message": "A footnote mark follows the number.", "remedy": "None needed."}],
}  # fmt: skip
KIND = {
    "kind": "index_digits", "title": "Two digits of an index exchanged", "definition": "off by 8 to 30 %", "meant_rules": [],
    "candidates": 20,
}  # fmt: skip
REHEARSAL = {
    "project": "scene", "rule_set": {"name": "standard", "version": 1}, "wells": {"rehearsed": 2, "with_analyses": 2}, "seed": 1,
    "kinds": [
        {**KIND, "strength": "moderate", "applicable": True, "injected": 9, "caught": 8, "rate": 0.889,
         "rules": {"index_recalc": 8}, "missed": ["Quill 1 S-2 at 2020.00 m: HI 250 → 520"]},
        {**KIND, "strength": "strong", "applicable": False, "injected": 0, "caught": 0, "rate": None, "rules": {}, "missed": [],
         "reason": "none of 20 candidates can carry it at this strength"},
    ],
    "false_alarms": {
        "analyses": 40, "flagged": 1, "rate": 0.025, "by_rule": {"index_recalc": 1}, "sets": {},
        "left_out": {"analyses_with_accepted_fault": 2},
        "limits_of_reading": {"rules": ["toc_floor_for_indices"], "analyses": 3},
        "after_injection": {"samples": 400, "flagged": 2, "rate": 0.005, "by_rule": {"index_recalc": 2}, "sets": {}},
    },
}  # fmt: skip


@dataclass
class World:
    """The scene and one of everything that a page shows."""

    scene: Scene
    well: Well
    result: Result
    upload: Upload
    job: Job
    run: QcRun
    release: Release
    token: int
    more: dict = field(default_factory=dict)

    @property
    def slug(self) -> str:
        return self.scene.project.slug

    @property
    def landed(self) -> Upload:
        return Upload.objects.get(project=self.scene.project, outcome="imported")

    def person(self, role: str):
        return self.scene.person(role)


def workbook() -> bytes:
    """The laboratory's sheet behind the scene: a header, a units row, values where the results say they stand."""
    book = Workbook()
    sheet = book.active
    sheet.title = "Sheet1"
    for place, (code, (unit, method, _)) in enumerate(ANALYTES.items()):
        column = place + 4 + 10 * (method == "carbon")
        sheet.cell(1, column, code)
        sheet.cell(2, column, unit)
        for row in range(5, 8):
            sheet.cell(row, column, {"S1": "<0.05", "S2": 5.0, "TMAX": 431, "HI": 250.5, "TOC": 2.125}[code])
    out = io.BytesIO()
    book.save(out)
    return out.getvalue()


def world() -> World:
    """One signed and released well, one in review, a file that waits for an answer, a job of each kind."""
    scene = small_scene()
    for source in SourceFile.objects.filter(project=scene.project):
        default_storage.save(source.stored_as, ContentFile(workbook()))
    SweeperBeat.objects.create(worker="w1", at=timezone.now())
    scene.accept(scene.sets[0])
    scene.sign(scene.sets[0])
    well = scene.sets[1].well
    _along(scene, well)
    result = Result.objects.filter(analysis__sample__well=well, analyte__code="S2").order_by("pk")[1]
    job = _job(scene)
    Job.objects.create(
        project=scene.project, kind="rehearse", state=JobState.SUCCEEDED, finished_at=timezone.now(), result=REHEARSAL
    )
    issue_token(scene.person("coordinator"), scene.project, "read", 30)
    return World(
        scene, well, result, _upload(scene, job), job, _run(scene, well, result), _release(scene),
        scene.person("coordinator").api_tokens.get().pk,
    )  # fmt: skip


def _along(scene: Scene, well: Well) -> None:
    well.td_md_m, well.datum_kind, well.datum_elevation_m = 3120.0, "KB", 25.4
    well.operator, well.field = "Alder Exploration", "Quill"
    well.save()
    FormationTop.objects.create(well=well, name="Upper Shale", top_md_m=1990)
    CoreRun.objects.create(well=well, number=1, top_md_m=2005, base_md_m=2020, recovered_m=14.2)
    CasingShoe.objects.create(well=well, md_m=1500, diameter_in=9.625)
    MudInterval.objects.create(well=well, top_md_m=1500, base_md_m=3120, kind="oil", additives="lignite")
    for sample in well.samples.all():
        CustodyEvent.objects.create(
            sample=sample,
            kind="received",
            place="Core store",
            at=timezone.now(),
            recorded_by=scene.person("coordinator"),
        )


def _job(scene: Scene) -> Job:
    job = Job.objects.create(
        project=scene.project, kind="intake", params={}, created_by=scene.person("coordinator"), progress_note="reading"
    )
    JobEvent.objects.create(job=job, to_state=JobState.QUEUED, note="asked")
    Job.objects.create(
        project=scene.project, kind="qc", state=JobState.FAILED, created_by=scene.person("geochemist"),
        error_code="example", error_message="The table could not be read.", finished_at=timezone.now(),
    )  # fmt: skip
    return job


def _upload(scene: Scene, job: Job) -> Upload:
    source = SourceFile.objects.filter(project=scene.project).first()
    Upload.objects.create(
        project=scene.project, source_file=source, file_name="S2 and Tmax, batch 7.xlsx", laboratory_name="Laboratory 1",
        created_by=scene.person("analyst"), outcome="imported", report=source.report, answer={**ANSWER, "findings": []},
    )  # fmt: skip
    return Upload.objects.create(
        project=scene.project, source_file=source, file_name="TOC without unit.xlsx", laboratory_name="Laboratory 1",
        created_by=scene.person("analyst"), outcome="waiting", answer=ANSWER,
        job=Job.objects.create(project=scene.project, kind="intake", state=JobState.SUCCEEDED, finished_at=timezone.now()),
    )  # fmt: skip


def _run(scene: Scene, well: Well, result: Result) -> QcRun:
    rules = RuleSet.objects.filter(project=None).first() or RuleSet.objects.create(
        name="standard", version=1, thresholds={"s2_floor_for_tmax": {"s2_min": {
            "value": 0.2, "unit": "mg/g", "source": "Peters 1986", "mark": "MEM"}}}, reason="first",
    )  # fmt: skip
    run = QcRun.objects.create(
        project=scene.project, rule_set=rules, started_by=scene.person("geochemist"), seconds=0.4, analyses_checked=6,
        results_checked=15, summary=[{"rule": "s2_floor_for_tmax", "family": "validity", "pass": 2, "fire": 1,
                                      "not_applicable": 3, "cannot_evaluate": 0}],
    )  # fmt: skip
    QcRunWell.objects.create(run=run, well=well)
    Flag.objects.create(
        run=run, well=well, analysis=result.analysis, result=result, rule="s2_floor_for_tmax", family="validity",
        severity=Severity.WARN, analyte="TMAX", value=431.0, message="Tmax was read from an S2 peak below 0.2 mg/g.",
        evidence={
            "rule": "s2_floor_for_tmax", "version": 1, "computed": 0.12, "limit": 0.2,
            "parameters": {"s2_min": {"value": 0.2, "unit": "mg/g", "source": "Peters 1986"}},
            "inputs": [{"analyte": "S2", "value": 0.12, "qualifier": "", "unit": "mg/g", "text": "0.12", "sheet": "Sheet1",
                        "cell": "F6", "result": result.pk}],
            "neighbours": [{"sample": "S-0", "top_m": 2000.0, "S2": "5"}, {"sample": "S-2", "top_m": 2020.0, "S2": "7"}],
        }, source="Peters 1986",
        fingerprint="a" * 64,
    )  # fmt: skip
    return run


def _release(scene: Scene) -> Release:
    selection = signed_data(scene.project)
    table = read(selection)
    content, sha256 = parquet.as_bytes(table)
    manifest = manifests.describe(selection, table, sha256, len(content))
    user = scene.person("approver")
    with transaction.atomic():
        made = Release.objects.create(
            project=scene.project, number=1, title="First look", created_by=user, manifest=manifest,
            manifest_sha256=manifests.sha256_of(manifest), data_sha256=sha256, analysis_count=6, result_count=15,
            stored_as=parquet.keep(f"releases/{sha256}.parquet", content), created_at=timezone.now() - timedelta(hours=1),
        )  # fmt: skip
        made.sign_offs.set(scene.sets[0].sign_offs.all())
        audit.record("release.made", made, actor=user, project=scene.project, after={"number": 1})
    return made
