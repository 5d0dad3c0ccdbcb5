"""Uploads and the jobs that read them."""

import json
from typing import Any

from drf_spectacular.types import OpenApiTypes
from drf_spectacular.utils import extend_schema, inline_serializer
from rest_framework import serializers as fields
from rest_framework.parsers import MultiPartParser
from rest_framework.request import Request
from rest_framework.response import Response

from labdata.access import Action
from labdata.api import filters, serializers
from labdata.api.base import Body, ListAndDetailView, ReadView, accepted, checked, refuse_unknown
from labdata.api.idempotency import once
from labdata.api.schema import IDEMPOTENCY_KEY
from labdata.errors import NotFound
from labdata.intake import services
from labdata.models import Job, Upload


class Answers(fields.JSONField):
    """``{question id: answer}``, as JSON text in a form."""

    def to_internal_value(self, data: Any) -> dict[str, str]:
        try:
            held = json.loads(data) if isinstance(data, str) else data
        except ValueError:
            held = None
        if not isinstance(held, dict) or not all(isinstance(answer, str) for answer in held.values()):
            raise fields.ValidationError("Answers are an object of question id and answer text.")
        return held


class UploadBody(Body):
    file = fields.FileField(max_length=255, allow_empty_file=True)
    project = fields.CharField(help_text="slug")
    lab = fields.CharField(required=False, default="", allow_blank=True, max_length=160)
    well = fields.CharField(
        required=False, default="", allow_blank=True, max_length=120, help_text="for a file without a well column"
    )
    create_wells = fields.BooleanField(required=False, default=False, help_text="make wells that are not known yet")
    answers = Answers(required=False, default=dict, help_text="{question id: answer}")
    dry_run = fields.BooleanField(required=False, default=False, help_text="say what would happen, write nothing")


class AnswersBody(Body):
    answers = Answers(help_text="{question id: answer}")


UPLOAD_AND_JOB = inline_serializer(
    "UploadAndJob", {"upload": serializers.UploadOut(), "job": serializers.JobOut(allow_null=True)}
)


def _upload_and_job(upload: Upload) -> Response:
    upload = Upload.objects.select_related("project", "source_file", "report", "created_by", "job").get(pk=upload.pk)
    job = upload.job
    held = {"upload": serializers.UploadOut(upload).data, "job": serializers.JobOut(job).data if job else None}
    return accepted(job, held)


@extend_schema(tags=["intake"])
class Uploads(ListAndDetailView):
    """Laboratory files as received, and what became of each."""

    rows = Upload.objects.select_related("project", "source_file", "report", "created_by")
    serializer_class = serializers.UploadOut
    filterset_class = filters.UploadRows

    def get_parsers(self) -> list[Any]:
        parsers = (
            [MultiPartParser()] if getattr(self, "action_map", {}).get("post") == "create" else super().get_parsers()
        )
        return list(parsers)

    @extend_schema(
        request={"multipart/form-data": UploadBody},
        responses={202: UPLOAD_AND_JOB, 200: OpenApiTypes.OBJECT},
        parameters=[IDEMPOTENCY_KEY],
    )
    @once
    def create(self, request: Request) -> Response:
        """Send a file. 202 with the upload and the job that reads it (no job when the bytes are held already)."""
        data = checked(UploadBody, request)
        project = self.caller.project(data["project"])
        self.caller.require(project, Action.UPLOAD)
        file = data["file"]
        asked = {name: data[name] for name in ("lab", "well", "create_wells", "answers")}
        if data["dry_run"]:
            return Response(services.preview(project=project, name=file.name, content=file.read(), **asked))
        upload = services.receive(project=project, name=file.name, content=file.read(), user=self.caller.user, **asked)
        return _upload_and_job(upload)

    @extend_schema(request=AnswersBody, responses={202: UPLOAD_AND_JOB}, parameters=[IDEMPOTENCY_KEY])
    @once
    def answer(self, request: Request, pk: str) -> Response:
        """Answer the questions of a waiting upload; it is read again."""
        upload = self.caller.find(self.rows, int(pk), "upload")
        self.caller.require(upload.project, Action.UPLOAD)
        data = checked(AnswersBody, request)
        return _upload_and_job(services.answer_questions(upload=upload, user=self.caller.user, answers=data["answers"]))


@extend_schema(tags=["intake"])
class Jobs(ReadView):
    """Background work: how far it is and how it ended."""

    rows = Job.objects.select_related("project")
    serializer_class = serializers.JobOut

    @extend_schema(responses=serializers.JobOut)
    def retrieve(self, request: Request, pk: str) -> Response:
        """One job."""
        refuse_unknown(request, ())
        job = self.get_queryset().filter(pk=pk).first()
        if job is None:
            raise NotFound(f"There is no job {pk}.", remedy="The answer to a POST names its job.")
        return Response(serializers.JobOut(job).data)
