"""The fields of a JSON object that is no design: what a request wraps around one."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from engine.errors import DesignError, Fault


def fields_of(data: Any, required: Sequence[str], optional: Sequence[str] = ()) -> Mapping[str, Any]:
    """A JSON object with these fields and no others; DesignError names every field that is wrong."""
    known = ", ".join([*required, *optional])
    if not isinstance(data, dict):
        raise DesignError("", f"must be a JSON object with {known}")
    faults = [Fault(name, "is missing") for name in required if name not in data]
    faults += [
        Fault(name[:80], f"is not a field here; known are {known}")
        for name in data
        if name not in required and name not in optional
    ]
    if faults:
        raise DesignError.of(faults[:20])
    return data
