"""The JSON body of a request, read strictly, and how OpenAPI is told about it."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from starlette.requests import Request

from server.error_shape import RefusedError

DESIGN_BODY: dict[str, Any] = {"$ref": "/api/schemas/design"}


async def body_text(request: Request) -> bytes:
    """The body as it came, if it is announced as JSON."""
    kind = request.headers.get("content-type", "").partition(";")[0].strip().lower()
    if kind != "application/json" and not (kind.startswith("application/") and kind.endswith("+json")):
        raise RefusedError(415, f"send JSON with Content-Type: application/json, is {kind[:60] or 'not given'!r}")
    return await request.body()


def described(schema: Mapping[str, Any]) -> dict[str, Any]:
    """The OpenAPI words for a JSON body of this schema."""
    return {"requestBody": {"required": True, "content": {"application/json": {"schema": dict(schema)}}}}


def object_body(**fields: Mapping[str, Any]) -> dict[str, Any]:
    """The OpenAPI words for a JSON object of these fields."""
    return described({"type": "object", "properties": dict(fields)})
