"""One of everything that the API serves, and how to reach it."""

import json
from dataclasses import dataclass
from typing import Any

from django.core.files.uploadedfile import SimpleUploadedFile

from labdata.intake.services import receive
from labdata.models import Job, Release, Upload
from qc.models import Decision, Flag, QcRun, QcRunWell, RuleSet, Severity
from tests.factories import PASSWORD
from tests.release.scene import Scene

LISTS = (
    "projects", "wells", "samples", "analyses", "results", "flags", "uploads", "rule-sets", "qc-runs", "decisions",
    "review-sets", "sign-offs", "releases", "audit",
)  # fmt: skip
TEMPLATES = {
    "api-schema": "schema/", "api-upload-answers": "uploads/{upload}/answers", "api-projects-one": "projects/{project}",
    "api-wells-one": "wells/{well}", "api-samples-one": "samples/{sample}", "api-analyses-one": "analyses/{analysis}",
    "api-results-one": "results/{result}", "api-flags-one": "flags/{flag}", "api-uploads-one": "uploads/{upload}",
    "api-jobs-one": "jobs/{job}", "api-rule-sets-one": "rule-sets/{rule_set}", "api-qc-runs-one": "qc-runs/{run}",
    "api-decisions-one": "decisions/{decision}", "api-review-sets-one": "review-sets/{review_set}",
    "api-sign-offs-one": "sign-offs/{sign_off}", "api-releases-one": "releases/{release}",
    "api-release-manifest": "releases/{release}/manifest", "api-release-data": "releases/{release}/data",
    "api-release-changes": "releases/{release}/changes?since={release}",
    "api-release-withdrawal": "releases/{release}/withdrawal",
}  # fmt: skip
CSV = b"Well,Depth (m),TOC (wt%)\nQuill 1,2500,1.5\n"


@dataclass
class Things:
    """Addresses and bodies of one of each."""

    scene: Scene
    ids: dict[str, Any]

    def template(self, name: str) -> str:
        return TEMPLATES.get(name) or name.removeprefix("api-")

    def shared(self, name: str) -> bool:
        """Whether the thing belongs to no project: the standard rule set."""
        return name == "api-rule-sets-one"

    def address(self, name: str) -> str:
        return "/api/v1/" + self.template(name).format(**self.ids)

    def body(self, name: str) -> dict[str, Any] | None:
        slug, held = self.scene.project.slug, self.scene.sets[0]
        bodies: dict[str, dict[str, Any]] = {
            "api-uploads": {"project": slug, "file": SimpleUploadedFile("late.csv", CSV), "lab": "Lab"},
            "api-upload-answers": {"answers": {"unit:Sheet1!C": "wt%"}},
            "api-qc-runs": {"project": slug, "wells": [held.well.name]},
            "api-decisions": {
                "review_set": held.pk,
                "decisions": [{"result": self.ids["result"], "verdict": "accepted"}],
            },
            "api-sign-offs": {"review_set": held.pk, "password": PASSWORD, "meaning": "reviewed"},
            "api-releases": {"project": slug, "title": "Another"},
            "api-release-withdrawal": {"reason": "Not good"},
        }
        return bodies.get(name)

    def call(self, client: Any, method: str, url: str, body: Any) -> Any:
        """The request; a file goes as a form, anything else as JSON."""
        if method == "get":
            return client.get(url)
        if body and "file" in body:
            body["file"].seek(0)
            return client.post(url, body, format="multipart")
        return client.post(url, json.dumps(body), content_type="application/json")


def one_of_everything(scene: Scene, release: Release) -> Things:
    """Make what the scene lacks: an upload with its job, a run with a flag."""
    held = scene.sets[0]
    analysis = held.analyses.order_by("pk").first()
    result = analysis.results.order_by("pk").first()
    rules, _ = RuleSet.objects.get_or_create(name="standard", version=1, project=None, defaults={"thresholds": {}})
    run = QcRun.objects.create(project=scene.project, rule_set=rules)
    QcRunWell.objects.create(run=run, well=held.well)
    flag = Flag.objects.create(
        run=run, well=held.well, analysis=analysis, result=result, rule="s1_toc_line", family="contamination",
        severity=Severity.WARN, analyte="S1", message="S1 high", source="made up", fingerprint="f",
    )  # fmt: skip
    upload = receive(project=scene.project, name="a.csv", content=b"Well,Depth\nQ,1\n", user=scene.person("analyst"))
    Upload.objects.filter(pk=upload.pk).update(outcome=Upload.Outcome.WAITING)
    job = Job.objects.filter(project=scene.project, kind="intake").first()
    ids = {
        "project": scene.project.slug, "well": held.well_id, "sample": analysis.sample_id, "analysis": analysis.pk,
        "result": result.pk, "flag": flag.pk, "upload": upload.pk, "job": job.pk, "rule_set": rules.pk, "run": run.pk,
        "decision": Decision.objects.filter(review_set=held).first().pk, "review_set": held.pk,
        "sign_off": held.sign_offs.first().pk, "release": release.pk,
    }  # fmt: skip
    return Things(scene, ids)
