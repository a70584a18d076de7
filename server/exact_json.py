"""JSON responses: the same digits as at every other entrance."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from starlette.responses import Response

from server.json_text import json_text


def exact_json(
    value: Any, status: int = 200, headers: Mapping[str, str] | None = None, indent: int | None = None
) -> Response:
    """A JSON response."""
    return Response(json_text(value, indent), status, headers, media_type="application/json")
