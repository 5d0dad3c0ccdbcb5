"""Unit tests of the plot modules, run in the browser on the pages' own files."""

import json
from pathlib import Path

import pytest
from django.http import HttpRequest, HttpResponse
from django.urls import include, path

from labdata.env import CHECKOUT

pytestmark = [pytest.mark.browser, pytest.mark.django_db(transaction=True)]
MODULES = CHECKOUT / "labdata" / "static" / "js"
CHECKS = Path(__file__).parent / "review_modules"


def harness(request: HttpRequest) -> HttpResponse:
    """A page that runs the checks and leaves their outcome in its text."""
    return HttpResponse(
        '<!doctype html><title>checks</title><link rel="icon" href="data:,"><main id="outcome"></main>'
        '<script type="module" src="/module-checks/checks.js"></script>'
    )


def script(request: HttpRequest, name: str) -> HttpResponse:
    return HttpResponse((CHECKS / name).read_text(encoding="utf-8"), content_type="text/javascript")


harness.login_required = script.login_required = False
urlpatterns = [
    path("module-checks/", harness),
    path("module-checks/<str:name>", script),
    path("", include("labdata.urls")),
]


@pytest.mark.urls(__name__)
def test_every_module_does_what_it_says(live_server, new_page):
    page = new_page()
    page.goto(f"{live_server.url}/module-checks/")
    for _ in range(100):
        if page.evaluate("document.querySelector('#outcome').dataset.done === 'yes'"):
            break
        page.wait_for_timeout(50)
    outcome = json.loads(page.inner_text("#outcome"))
    assert len(outcome) >= 20
    assert [check for check in outcome if check["fault"]] == []
