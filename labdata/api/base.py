"""What the views of the API share."""

from collections.abc import Iterable
from typing import Any

from django.db.models import Model, QuerySet
from django_filters.rest_framework import DjangoFilterBackend
from rest_framework import mixins, serializers
from rest_framework.exceptions import ValidationError
from rest_framework.negotiation import BaseContentNegotiation
from rest_framework.parsers import BaseParser, JSONParser
from rest_framework.renderers import BaseRenderer
from rest_framework.request import Request
from rest_framework.response import Response
from rest_framework.views import APIView
from rest_framework.viewsets import GenericViewSet

from labdata.api.callers import Caller, caller_of
from labdata.models import Job


class AlwaysJson(BaseContentNegotiation):
    """JSON whatever Accept says; ``format`` is a parameter of the data route and nothing else."""

    def select_parser(self, request: Request, parsers: Iterable[BaseParser]) -> BaseParser | None:
        kind = (request.content_type or "").split(";")[0].strip().lower()
        return next((parser for parser in parsers if parser.media_type == kind), None)

    def select_renderer(
        self, request: Request, renderers: Iterable[BaseRenderer], format_suffix: str | None = None
    ) -> tuple[BaseRenderer, str]:
        first = next(iter(renderers))
        return first, first.media_type or ""


def refuse_unknown(request: Request, known: Iterable[str]) -> None:
    """Raises ValidationError naming query parameters that mean nothing here: a slip would widen the answer."""
    names = set(known)
    strange = [name for name in request.query_params if name not in names]
    if strange:
        message = f"This parameter is not known here; known: {', '.join(sorted(names)) or 'none'}."
        raise ValidationError({name: [message] for name in strange})


class StrictFilters(DjangoFilterBackend):
    """Filters of the view's filter set; unknown parameters are refused."""

    def filter_queryset(self, request: Request, queryset: QuerySet[Model], view: Any) -> QuerySet[Model]:
        filters = getattr(view, "filterset_class", None)
        named = filters.base_filters if filters and view.detail is False else ()
        paging = ("cursor", "page_size") if view.detail is False else ()
        refuse_unknown(request, [*named, *paging])
        return queryset if view.detail else super().filter_queryset(request, queryset, view)


class ApiView(APIView):
    """A view that knows its caller and speaks JSON."""

    content_negotiation_class = AlwaysJson
    parser_classes = [JSONParser]
    query_parameters: tuple[str, ...] = ()

    @property
    def caller(self) -> Caller:
        return caller_of(self.request)


class ReadView(ApiView, GenericViewSet[Any]):
    """A list. ``rows`` is the queryset before it is cut to the caller's projects; ``project_path`` leads there."""

    filter_backends = [StrictFilters]
    lookup_value_regex = "[0-9]{1,18}"
    rows: QuerySet[Any]
    project_path = "project"

    def get_queryset(self) -> QuerySet[Any]:
        if getattr(self, "swagger_fake_view", False):  # the schema only needs the model
            return self.rows.none()
        return self.caller.visible(self.rows.all(), self.project_path)


class ListView(mixins.ListModelMixin, ReadView):
    pass


class ListAndDetailView(mixins.RetrieveModelMixin, ListView):
    pass


class Body(serializers.Serializer[Any]):
    """What a POST holds. A field that is not known is refused, not passed over."""

    def to_internal_value(self, data: Any) -> Any:
        if isinstance(data, dict):
            strange = [name for name in data if name not in self.fields]
            if strange:
                known = ", ".join(self.fields)
                raise ValidationError({name: [f"This field is not known here; known: {known}."] for name in strange})
        return super().to_internal_value(data)


def checked(body: type[Body], request: Request) -> dict[str, Any]:
    """The request's content, checked. Raises ValidationError naming each field at fault."""
    refuse_unknown(request, ())
    held = body(data=request.data)
    held.is_valid(raise_exception=True)
    data: dict[str, Any] = held.validated_data
    return data


def accepted(job: Job | None, data: dict[str, Any]) -> Response:
    """202: the work is queued; Location says where to look."""
    headers = {"Location": f"/api/v1/jobs/{job.pk}"} if job else {}
    return Response(data, status=202, headers=headers)
