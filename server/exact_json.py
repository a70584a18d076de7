"""JSON out: the same digits as every other entrance, and never a NaN."""

from __future__ import annotations

import json
from collections.abc import Mapping
from typing import Any

from starlette.responses import Response


def json_text(value: Any, indent: int | None = None) -> str:
    """One spelling for files, responses and frames: shortest exact digits, text as it is; ValueError on a NaN."""
    separators = (",", ":") if indent is None else (",", ": ")
    return json.dumps(value, ensure_ascii=False, allow_nan=False, indent=indent, separators=separators)


def exact_json(
    value: Any, status: int = 200, headers: Mapping[str, str] | None = None, indent: int | None = None
) -> Response:
    """A JSON response."""
    return Response(json_text(value, indent), status, headers, media_type="application/json")
