"""Projects, wells, samples, analyses, results and flags: read only."""

from collections import defaultdict
from typing import Any

from django.db.models import QuerySet
from drf_spectacular.utils import extend_schema
from rest_framework.request import Request
from rest_framework.response import Response

from labdata.api import filters, serializers
from labdata.api.base import ListAndDetailView, ListView
from labdata.api.pagination import ByIdCursor
from labdata.models import Analysis, Membership, Project, Result, Sample, Well
from labdata.release.rows import long_table
from qc.models import Flag


@extend_schema(tags=["registry"])
class Projects(ListAndDetailView):
    """Projects of the caller."""

    rows = Project.objects.all()
    project_path = "pk"
    serializer_class = serializers.ProjectOut
    filterset_class = filters.ProjectRows
    lookup_field = "slug"
    lookup_value_regex = "[-a-zA-Z0-9_]+"

    def get_serializer_context(self) -> dict[str, Any]:
        held: dict[int, list[str]] = defaultdict(list)
        if not getattr(self, "swagger_fake_view", False):
            for project, role in Membership.objects.filter(user=self.caller.user).values_list("project_id", "role"):
                held[project].append(role)
        return {**super().get_serializer_context(), "roles": held}


@extend_schema(tags=["registry"])
class Wells(ListAndDetailView):
    """Wells of the caller's projects."""

    rows = Well.objects.select_related("project").prefetch_related("aliases")
    serializer_class = serializers.WellOut
    filterset_class = filters.WellRows


@extend_schema(tags=["registry"])
class Samples(ListAndDetailView):
    """Samples with canonical and reported depth."""

    rows = Sample.objects.select_related("well__project")
    project_path = "well__project"
    serializer_class = serializers.SampleOut
    filterset_class = filters.SampleRows


@extend_schema(tags=["registry"])
class Analyses(ListAndDetailView):
    """One run of one method on one sample each; current ones unless the superseded are asked for."""

    rows = Analysis.objects.select_related(
        "project", "sample__well", "method", "report", "laboratory", "review_item__review_set"
    )
    serializer_class = serializers.AnalysisOut
    filterset_class = filters.AnalysisRows


class ResultPages(ByIdCursor):
    """Pages of ids, filled with long rows."""

    ordering = "pk"


@extend_schema(tags=["registry"])
class Results(ListView):
    """Values with their qualifier, verdict, signature, flags and source cell: the long rows of today's data."""

    rows = Result.objects.all()
    project_path = "analysis__project"
    serializer_class = serializers.ResultOut
    filterset_class = filters.ResultRows
    pagination_class = ResultPages

    def list(self, request: Request, *args: Any, **kwargs: Any) -> Response:
        found = self.filter_queryset(self.get_queryset()).select_related("analysis")
        page = self.paginate_queryset(found) or []
        return self.get_paginated_response(long_rows(page))

    @extend_schema(responses=serializers.ResultOut)
    def retrieve(self, request: Request, pk: str) -> Response:
        """One value, also a superseded one."""
        self.filter_queryset(self.get_queryset())
        result = self.caller.find(self.rows.select_related("analysis"), int(pk), "result", self.project_path)
        return Response(long_rows([result])[0])


def long_rows(results: list[Result]) -> list[dict[str, Any]]:
    """The results as long rows, in their own order."""
    by_project: dict[int, list[int]] = defaultdict(list)
    for result in results:
        by_project[result.analysis.project_id].append(result.pk)
    rows: dict[int, dict[str, Any]] = {}
    for project in Project.objects.filter(pk__in=by_project):
        chosen: QuerySet[Result] = Result.objects.filter(pk__in=by_project[project.pk])
        for row in long_table(project, chosen).to_pylist():
            pk = row.pop("result")
            rows[pk] = {"id": pk, **row}
    return [rows[result.pk] for result in results]


@extend_schema(tags=["qc"])
class Flags(ListAndDetailView):
    """Firings of rules, with their evidence; those of the latest run of each well unless a run is named."""

    rows = Flag.objects.select_related("well__project", "analysis__sample", "analysis__method")
    project_path = "well__project"
    serializer_class = serializers.FlagOut
    filterset_class = filters.FlagRows
