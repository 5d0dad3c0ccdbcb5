"""``python -m tests.jobs.real_work STEP``: one step of the demonstration, as a process that may be killed at any moment."""

import json
import sys

import django

django.setup()

from labdata import audit  # noqa: E402
from labdata.demo import reviewing, scenario  # noqa: E402
from labdata.demo.workbooks import AMENDED, files  # noqa: E402
from labdata.intake.services import receive  # noqa: E402
from labdata.models import Job, Release, Report, Result, Upload  # noqa: E402
from labdata.release.services import request_release  # noqa: E402
from qc.models import QcRun  # noqa: E402

FILES = 5


def stage():
    return scenario.set_stage(lambda text: None, must_sign=True)


def wanted():
    """Files that land without an answer from anybody."""
    return [file for file in files() if file.outcome.startswith("imported") and file.name != AMENDED]


def receive_all():
    """Upload every file; a second run finds held bytes."""
    at = stage()
    for file in wanted():
        receive(
            project=at.project, name=file.name, content=file.content, user=at.users["analyst"],
            lab=file.laboratory.name, well=file.well,
        )  # fmt: skip


def release():
    """Decide on everything, sign it, and ask for the release twice."""
    at = stage()
    for review_set in scenario._open_sets(at.project):
        reviewing.decide_all(review_set, at.users["geochemist"])
        scenario._sign(at, review_set)
    for _ in range(2):
        request_release(project=at.project, user=at.users["approver"], title="All wells", idem_key="release-all")


def look():
    """What is in the database, as one JSON line."""
    uploads = [upload for upload in Upload.objects.order_by("pk") if upload.outcome != "already_held"]
    told = {
        "files": sorted(upload.file_name for upload in uploads),
        "outcomes": sorted({upload.outcome for upload in uploads}),
        "promised": [upload.answer["counts"]["results"] for upload in uploads],
        "landed": [
            Result.objects.filter(analysis__report__source_file=upload.source_file).count() for upload in uploads
        ],
        "reports": Report.objects.count(),
        "jobs": sorted(set(Job.objects.values_list("kind", "state", "error_message"))),
        "intake_jobs": Job.objects.filter(kind="intake").count(),
        "qc_jobs": sorted(Job.objects.filter(kind="qc").values_list("idem_key", flat=True)),
        "qc_runs": QcRun.objects.count(),
        "releases": list(Release.objects.values_list("number", "result_count")),
        "again": sum(Job.objects.values_list("attempt", flat=True)) - Job.objects.count(),
        "audit": audit.verify()["entries"],
    }
    print(json.dumps(told))


STEPS = {step.__name__: step for step in (receive_all, release, look)}

if __name__ == "__main__":
    STEPS[sys.argv[1]]()
