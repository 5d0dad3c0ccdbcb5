"""Addresses of the API. Each may also be written with a slash at its end."""

from typing import Any

from django.contrib.auth.decorators import login_not_required
from django.http import HttpRequest, HttpResponseBase, JsonResponse
from django.urls import Resolver404, URLPattern, path, re_path, resolve
from django.views.decorators.csrf import csrf_exempt
from drf_spectacular.renderers import OpenApiJsonRenderer, OpenApiYamlRenderer
from drf_spectacular.views import SpectacularAPIView

from labdata.api.base import ReadView
from labdata.api.problems import CONTENT_TYPE, problem
from labdata.api.views import audit, intake, qc, registry, releases, review

LIST: dict[str, Any] = {"get": "list"}
LIST_AND_POST: dict[str, Any] = {"get": "list", "post": "create"}


def _list(name: str, view: type[ReadView], actions: dict[str, Any]) -> URLPattern:
    return path(name, view.as_view(actions, detail=False), name=f"api-{name}")


def _one(name: str, view: type[ReadView], pattern: str = r"(?P<pk>[0-9]{1,18})") -> URLPattern:
    return re_path(rf"^{name}/{pattern}$", view.as_view({"get": "retrieve"}, detail=True), name=f"api-{name}-one")


@csrf_exempt
@login_not_required
def other(request: HttpRequest, rest: str) -> HttpResponseBase:
    """An address with a slash at its end is the one without; anything else is not there."""
    if rest.endswith("/"):
        try:
            found = resolve(request.path.rstrip("/"))
        except Resolver404:
            found = None
        if found is not None and found.url_name != "api-other":
            answer: HttpResponseBase = found.func(request, *found.args, **found.kwargs)
            return answer
    body = problem(404, "not_found", f"There is nothing at {request.path}.", schema="/api/v1/schema/")
    return JsonResponse(body, status=404, content_type=CONTENT_TYPE)


schema = SpectacularAPIView.as_view(renderer_classes=[OpenApiJsonRenderer, OpenApiYamlRenderer])
RELEASE = r"^releases/(?P<pk>[0-9]{1,18})"

urlpatterns = [
    path("schema/", schema, name="api-schema"),
    _list("projects", registry.Projects, LIST),
    _one("projects", registry.Projects, r"(?P<slug>[-a-zA-Z0-9_]+)"),
    _list("wells", registry.Wells, LIST),
    _one("wells", registry.Wells),
    _list("samples", registry.Samples, LIST),
    _one("samples", registry.Samples),
    _list("analyses", registry.Analyses, LIST),
    _one("analyses", registry.Analyses),
    _list("results", registry.Results, LIST),
    _one("results", registry.Results),
    _list("flags", registry.Flags, LIST),
    _one("flags", registry.Flags),
    _list("uploads", intake.Uploads, LIST_AND_POST),
    _one("uploads", intake.Uploads),
    re_path(
        r"^uploads/(?P<pk>[0-9]{1,18})/answers$",
        intake.Uploads.as_view({"post": "answer"}, detail=True),
        name="api-upload-answers",
    ),
    path("jobs/<uuid:pk>", intake.Jobs.as_view({"get": "retrieve"}, detail=True), name="api-jobs-one"),
    _list("rule-sets", qc.RuleSets, LIST),
    _one("rule-sets", qc.RuleSets),
    _list("qc-runs", qc.QcRuns, LIST_AND_POST),
    _one("qc-runs", qc.QcRuns),
    _list("decisions", review.Decisions, LIST_AND_POST),
    _one("decisions", review.Decisions),
    _list("review-sets", review.ReviewSets, LIST),
    _one("review-sets", review.ReviewSets),
    _list("sign-offs", review.SignOffs, LIST_AND_POST),
    _one("sign-offs", review.SignOffs),
    _list("releases", releases.Releases, LIST_AND_POST),
    _one("releases", releases.Releases),
    re_path(rf"{RELEASE}/manifest$", releases.Manifest.as_view(), name="api-release-manifest"),
    re_path(rf"{RELEASE}/data$", releases.Data.as_view(), name="api-release-data"),
    re_path(rf"{RELEASE}/changes$", releases.Changes.as_view(), name="api-release-changes"),
    re_path(
        rf"{RELEASE}/withdrawal$",
        releases.Releases.as_view({"post": "withdrawal"}, detail=True),
        name="api-release-withdrawal",
    ),
    _list("audit", audit.Audit, LIST),
    re_path(r"^(?P<rest>.*)$", other, name="api-other"),
]
