"""The OpenAPI schema is valid, complete and free of warnings."""

import io
import re

import pytest
from django.core.management import call_command
from drf_spectacular.validation import validate_schema
from rest_framework.test import APIClient

from labdata.api.urls import urlpatterns

pytestmark = pytest.mark.django_db


@pytest.fixture
def schema():
    answer = APIClient().get("/api/v1/schema/")
    assert answer["Content-Type"].startswith("application/vnd.oai.openapi+json")
    return answer.json()


def test_it_is_openapi_3_1(schema):
    assert schema["openapi"] == "3.1.0"
    validate_schema(schema)


def test_it_gives_no_warning():
    out = io.StringIO()
    call_command("spectacular", validate=True, fail_on_warn=True, stdout=out)
    assert out.getvalue().startswith("openapi: 3.1.0")


def shape(text):
    """A path with its parameters' names taken out."""
    return re.sub(r"\{[^}]+\}|\(\?P<[^>]+>[^)]+\)|<[^>]+>", "{}", text).strip("^$")


def test_every_route_is_in_it(schema):
    known = {shape(path.removeprefix("/api/v1/")) for path in schema["paths"]}
    routes = {shape(str(pattern.pattern)) for pattern in urlpatterns if pattern.name not in {"api-schema", "api-other"}}
    assert known == routes


def operations(schema):
    return [
        (path, method, operation)
        for path, methods in schema["paths"].items()
        for method, operation in methods.items()
        if method in {"get", "post"}
    ]


def test_every_operation_is_described_and_its_errors_are_problems(schema):
    for path, method, operation in operations(schema):
        assert operation.get("description"), (path, method)
        assert "application/problem+json" in operation["responses"]["default"]["content"]
        if method == "post":
            assert "Idempotency-Key" in {parameter["name"] for parameter in operation["parameters"]}


def test_every_parameter_is_described(schema):
    bare = [
        (path, parameter["name"])
        for path, _, operation in operations(schema)
        for parameter in operation.get("parameters", [])
        if parameter["in"] == "query" and not parameter.get("description")
    ]
    assert bare == []


def test_results_document_their_filters(schema):
    names = {p["name"] for p in schema["paths"]["/api/v1/results"]["get"]["parameters"]}
    assert names >= {
        "project", "well", "formation", "method", "analyte", "state", "verdict", "top_m__gte", "base_m__lte",
        "changed_since", "cursor", "page_size",
    }  # fmt: skip


def test_every_answer_has_the_fields_that_it_promises(schema):
    assert {"TOKEN", "token"} & set(schema["components"]["securitySchemes"])
    assert "password" not in schema["components"]["schemas"]["SignOffOut"]["properties"]
