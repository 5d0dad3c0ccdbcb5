"""The audit trail, for those who may read it."""

from django.db.models import QuerySet
from drf_spectacular.utils import extend_schema

from labdata.access import Action
from labdata.api import filters, serializers
from labdata.api.base import ListView
from labdata.models import AuditEntry


@extend_schema(tags=["audit"])
class Audit(ListView):
    """Who did what, when and why, in the projects whose audit trail the caller may read."""

    rows = AuditEntry.objects.select_related("project")
    serializer_class = serializers.AuditOut
    filterset_class = filters.AuditRows

    def get_queryset(self) -> QuerySet[AuditEntry]:
        if getattr(self, "swagger_fake_view", False):
            return self.rows.none()
        slug = self.request.query_params.get("project")
        if slug is not None:
            self.caller.require(self.caller.project(slug), Action.READ_AUDIT)
        return self.rows.filter(project__in=self.caller.permitted(Action.READ_AUDIT))
