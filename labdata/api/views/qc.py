"""Rule sets and QC runs."""

from typing import Any, cast

from django.db.models import Q, QuerySet
from drf_spectacular.utils import extend_schema, inline_serializer
from rest_framework import serializers as fields
from rest_framework.request import Request
from rest_framework.response import Response

from labdata.access import Action
from labdata.api import filters, serializers
from labdata.api.base import Body, ListAndDetailView, accepted, checked
from labdata.api.callers import Caller
from labdata.api.idempotency import once
from labdata.api.schema import IDEMPOTENCY_KEY
from labdata.models import Project, Well
from labdata.registry.names import name_key
from qc.models import QcRun, RuleSet
from qc.services import start_run


@extend_schema(tags=["qc"])
class RuleSets(ListAndDetailView):
    """Versioned thresholds: the standard ones and those of the caller's projects."""

    rows = RuleSet.objects.select_related("project", "author")
    serializer_class = serializers.RuleSetOut
    filterset_class = filters.RuleSetRows

    def get_queryset(self) -> QuerySet[RuleSet]:
        if getattr(self, "swagger_fake_view", False):
            return self.rows.none()
        return self.rows.filter(Q(project=None) | Q(project__in=self.caller.projects))


class QcRunBody(Body):
    project = fields.CharField(help_text="slug")
    wells = fields.ListField(
        child=fields.CharField(max_length=120), required=False, default=list, help_text="names, UWIs or ids; none: all"
    )


JOB = inline_serializer("QueuedJob", {"job": serializers.JobOut()})


def wells_named(caller: Caller, project: Project, names: list[str]) -> list[Well]:
    """Wells of the project by name, UWI or id. Raises ValidationError naming each that is not there."""
    wells: list[Well] = []
    errors: dict[int, Any] = {}
    for number, text in enumerate(names):
        named = Q(name_key=name_key(text)) | Q(uwi=text) | Q(aliases__name_key=name_key(text))
        if text.isascii() and text.isdigit() and len(text) < 19:
            named |= Q(pk=int(text))
        found = list(caller.visible(Well.objects.filter(named, project=project)).distinct())
        if not found:
            errors[number] = [f"There is no well «{text}» in project «{project.slug}»."]
        wells += found
    if errors:
        raise fields.ValidationError({"wells": cast(Any, errors)})
    return wells


@extend_schema(tags=["qc"])
class QcRuns(ListAndDetailView):
    """Runs of a rule set over wells, with the counts of every rule's answers."""

    rows = QcRun.objects.select_related("project", "rule_set", "started_by").prefetch_related("wells")
    serializer_class = serializers.QcRunOut
    filterset_class = filters.QcRunRows

    @extend_schema(request=QcRunBody, responses={202: JOB}, parameters=[IDEMPOTENCY_KEY])
    @once
    def create(self, request: Request) -> Response:
        """Run the rules over wells of a project (all, unless told). 202 with the job."""
        data = checked(QcRunBody, request)
        project = self.caller.project(data["project"])
        self.caller.require(project, Action.RUN_QC)
        wells = wells_named(self.caller, project, data["wells"])
        job = start_run(project, wells or None, self.caller.user)
        return accepted(job, {"job": serializers.JobOut(job).data})
