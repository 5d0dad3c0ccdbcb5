"""Releases: the list, the manifest, the data in every format, and what changed since another."""

import json

from django.core.serializers.json import DjangoJSONEncoder
from django.db.models import F
from django.http import HttpResponse, HttpResponseBase
from drf_spectacular.types import OpenApiTypes
from drf_spectacular.utils import OpenApiParameter, extend_schema, inline_serializer
from rest_framework import serializers as fields
from rest_framework.request import Request
from rest_framework.response import Response

from labdata.access import Action
from labdata.api import filters, serializers
from labdata.api.base import ApiView, Body, ListAndDetailView, accepted, checked, refuse_unknown
from labdata.api.downloads import send
from labdata.api.idempotency import once
from labdata.api.schema import IDEMPOTENCY_KEY
from labdata.api.views.qc import JOB
from labdata.audit import canonical
from labdata.errors import InvalidInput
from labdata.models import Release
from labdata.release.changes import changes
from labdata.release.export import FORMATS
from labdata.release.pull import INCLUDES, pull_release
from labdata.release.services import request_release, withdraw
from labdata.release.shapes import SHAPES

ID_DIGITS = 18


class ReleaseBody(Body):
    project = fields.CharField(help_text="slug")
    title = fields.CharField(max_length=200)


class WithdrawalBody(Body):
    reason = fields.CharField(max_length=2000)


@extend_schema(tags=["releases"])
class Releases(ListAndDetailView):
    """Frozen, numbered datasets made from signed review sets."""

    rows = (
        Release.objects.select_related("project", "created_by", "withdrawn_by")
        .defer("manifest")
        .annotate(counts=F("manifest__counts"))
    )
    serializer_class = serializers.ReleaseOut
    filterset_class = filters.ReleaseRows

    @extend_schema(request=ReleaseBody, responses={202: JOB}, parameters=[IDEMPOTENCY_KEY])
    @once
    def create(self, request: Request) -> Response:
        """Build the next release of a project. 202 with the job; its result names the release."""
        data = checked(ReleaseBody, request)
        project = self.caller.project(data["project"])
        self.caller.require(project, Action.RELEASE)
        job = request_release(project=project, user=self.caller.user, title=data["title"])
        return accepted(job, {"job": serializers.JobOut(job).data})

    @extend_schema(request=WithdrawalBody, responses=serializers.ReleaseOut, parameters=[IDEMPOTENCY_KEY])
    @once
    def withdrawal(self, request: Request, pk: str) -> Response:
        """Say that a release should no longer be used, and why. Its data stay readable."""
        release = self.caller.find(self.rows, int(pk), "release")
        self.caller.require(release.project, Action.WITHDRAW)
        data = checked(WithdrawalBody, request)
        withdraw(release=release, user=self.caller.user, reason=data["reason"])
        return Response(serializers.ReleaseOut(self.rows.get(pk=release.pk)).data)


class OneRelease(ApiView):
    """What is had of one release."""

    def release(self, pk: str) -> Release:
        return self.caller.find(Release.objects.select_related("project"), int(pk), "release")


@extend_schema(tags=["releases"])
class Manifest(OneRelease):
    @extend_schema(operation_id="releases_manifest", responses=OpenApiTypes.OBJECT)
    def get(self, request: Request, pk: str) -> HttpResponseBase:
        """The manifest, as the very bytes that ``manifest_sha256`` speaks of."""
        refuse_unknown(request, ())
        release = self.release(pk)
        headers = {"ETag": f'"{release.manifest_sha256}"'}
        return HttpResponse(canonical(release.manifest), content_type="application/json", headers=headers)


def _one_of(name: str, values: list[str], default: str, description: str) -> OpenApiParameter:
    return OpenApiParameter(name, str, enum=values, default=default or None, description=description)


@extend_schema(tags=["releases"])
class Data(OneRelease):
    @extend_schema(
        operation_id="releases_data",
        parameters=[
            _one_of("format", list(FORMATS), "parquet", "How to write."),
            _one_of("shape", list(SHAPES), "long", "One row a result (long) or an analysis (wide)."),
            _one_of("include", ["rejected"], "", "Rejected values too, each with its verdict."),
        ],
        responses={(200, written.content_type.split(";")[0]): OpenApiTypes.BINARY for written in FORMATS.values()},
    )
    def get(self, request: Request, pk: str) -> HttpResponseBase:
        """The data. Ranges and If-None-Match are honoured; LAS of several wells comes as a zip."""
        refuse_unknown(request, ("format", "shape", "include"))
        asked = request.query_params
        release = self.release(pk)
        if "include" in asked and asked["include"] not in INCLUDES:
            raise InvalidInput(
                f"«{asked['include']}» is nothing to include.", remedy="Known: rejected.", field="include"
            )
        download = pull_release(
            release, format_name=asked.get("format", "parquet"), shape=asked.get("shape", "long"),
            include=asked.get("include", ""),
        )  # fmt: skip
        response = send(request, download)
        response["Kerogate-Release-State"] = "withdrawn" if release.withdrawn_at else "valid"
        return response


CHANGED = inline_serializer(
    "ReleaseChanges",
    {
        "release": fields.IntegerField(),
        "since": fields.IntegerField(),
        "added": fields.ListField(child=fields.DictField()),
        "changed": fields.ListField(child=fields.DictField(), help_text="before, after, fields"),
        "withdrawn": fields.ListField(child=fields.DictField()),
    },
)


@extend_schema(tags=["releases"])
class Changes(OneRelease):
    @extend_schema(
        operation_id="releases_changes",
        parameters=[OpenApiParameter("since", int, required=True, description="Id of another release of the project.")],
        responses=CHANGED,
    )
    def get(self, request: Request, pk: str) -> HttpResponseBase:
        """Rows added, changed and withdrawn against another release."""
        refuse_unknown(request, ("since",))
        since = request.query_params.get("since", "")
        release = self.release(pk)
        if not (since.isascii() and since.isdigit() and len(since) <= ID_DIGITS):
            raise InvalidInput(
                f"«{since}» is no release id.", remedy="Give since=ID of an earlier release.", field="since"
            )
        told = changes(release, self.release(since))
        return HttpResponse(
            json.dumps(told, cls=DjangoJSONEncoder, ensure_ascii=False), content_type="application/json"
        )
