"""JSON responses: the same digits as at every other entrance."""

from __future__ import annotations

from typing import Any

from starlette.responses import Response

from server.json_text import json_text


def exact_json(value: Any, status: int = 200, indent: int | None = None) -> Response:
    """A value as a JSON response."""
    return json_response(json_text(value, indent), status)


def json_response(text: str, status: int = 200) -> Response:
    """A text that is JSON already."""
    return Response(text, status, media_type="application/json")
