"""The JSON body of a request, read strictly, and how OpenAPI is told about it."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from starlette.requests import Request

from engine.errors import DesignError, Fault
from server.faults import RefusedError

DESIGN_BODY: dict[str, Any] = {"$ref": "/api/schemas/design"}


async def body_text(request: Request) -> bytes:
    """The body as it came, if it is announced as JSON."""
    kind = request.headers.get("content-type", "").partition(";")[0].strip().lower()
    if kind != "application/json" and not (kind.startswith("application/") and kind.endswith("+json")):
        raise RefusedError(415, f"send JSON with Content-Type: application/json, is {kind[:60] or 'not given'!r}")
    return await request.body()


def fields_of(data: Any, required: Sequence[str], optional: Sequence[str] = ()) -> Mapping[str, Any]:
    """A JSON object with these fields and no others; DesignError names every field that is wrong."""
    if not isinstance(data, dict):
        raise DesignError("", f"must be a JSON object with {', '.join([*required, *optional])}")
    known = {*required, *optional}
    faults = [Fault(name, "is missing") for name in required if name not in data]
    faults += [
        Fault(name[:80], f"is not a field here; known are {', '.join([*required, *optional])}")
        for name in data
        if name not in known
    ]
    if faults:
        raise DesignError.of(faults[:20])
    return data


def described(schema: Mapping[str, Any]) -> dict[str, Any]:
    """The OpenAPI words for a JSON body of this schema."""
    return {"requestBody": {"required": True, "content": {"application/json": {"schema": dict(schema)}}}}


def object_body(**fields: Mapping[str, Any]) -> dict[str, Any]:
    """The OpenAPI words for a JSON object of these fields."""
    return described({"type": "object", "properties": dict(fields)})
