"""All addresses: pages under /, a project's pages under /p/SLUG/, the API under /api/v1/."""

from django.urls import include, path

from labdata.health import healthz

urlpatterns = [
    path("healthz", healthz, name="healthz"),
    path("", include("labdata.pages.urls")),
    path("p/<slug:slug>/review/", include("qc.review.urls")),
    path("api/v1/", include("labdata.api.urls")),
]
