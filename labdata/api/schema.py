"""What the OpenAPI schema cannot find out by itself."""

from typing import Any

from drf_spectacular.extensions import OpenApiAuthenticationExtension
from drf_spectacular.utils import OpenApiParameter

IDEMPOTENCY_KEY = OpenApiParameter(
    "Idempotency-Key",
    str,
    OpenApiParameter.HEADER,
    description="A key of the client's choice: the same request under the same key is done once and answered alike.",
)


class TokenScheme(OpenApiAuthenticationExtension):  # type: ignore[no-untyped-call]
    """``Authorization: Token KEY``."""

    target_class = "labdata.api.authentication.TokenAuthentication"
    name = "token"

    def get_security_definition(self, auto_schema: Any) -> dict[str, str]:
        return {
            "type": "apiKey", "in": "header", "name": "Authorization",
            "description": "«Token KEY», made with the command token or on the account's page.",
        }  # fmt: skip


def with_problems(result: dict[str, Any], generator: Any, request: Any, public: bool) -> dict[str, Any]:
    """Add to every operation that errors come as problem documents."""
    schemas = result["components"].setdefault("schemas", {})
    schemas["Problem"] = {
        "type": "object",
        "description": "RFC 9457 problem document; further members say where (field, errors, cell, …).",
        "required": ["type", "title", "status", "detail"],
        "properties": {
            "type": {"type": "string", "format": "uri"}, "title": {"type": "string"}, "status": {"type": "integer"},
            "detail": {"type": "string"}, "code": {"type": "string"},
            "errors": {"type": "object", "additionalProperties": {"type": "array", "items": {"type": "string"}}},
        },
    }  # fmt: skip
    content = {"application/problem+json": {"schema": {"$ref": "#/components/schemas/Problem"}}}
    for path in result["paths"].values():
        for operation in path.values():
            if isinstance(operation, dict) and "responses" in operation:
                operation["responses"]["default"] = {"description": "A problem.", "content": content}
    return result
