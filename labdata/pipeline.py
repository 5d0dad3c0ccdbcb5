"""The rooms in the order data walks through them: intake, registry, review, QC. The job kind "intake" runs this."""

from collections.abc import Callable
from typing import Any

from labdata.intake import services as intake
from labdata.jobs import JobContext, enqueue
from labdata.models import Upload
from labdata.registry import services as registry
from qc.review import services as review


def process_upload(ctx: JobContext) -> Callable[[], dict[str, Any]]:
    """Take one received file to the reviewer's desk.

    The file is read and matched before the transaction; the returned commit writes everything or nothing. What
    lands is put up for review, and QC of the wells it touches is enqueued with it.
    """
    upload = Upload.objects.select_related("project", "source_file", "created_by").get(pk=ctx.job.params["upload"])
    prepared = intake.prepare(upload, ctx)

    def commit() -> dict[str, Any]:
        landed = registry.store(prepared)
        if landed.report is not None:
            review.take_in(landed)
            enqueue(
                "qc",
                {"project": upload.project_id, "wells": sorted(landed.well_ids)},
                project=upload.project,
                user=upload.created_by,
                idem_key=f"qc-after-upload-{upload.pk}-{landed.report.pk}",
            )
        return {"upload": upload.pk, "outcome": landed.upload.outcome}

    return commit
