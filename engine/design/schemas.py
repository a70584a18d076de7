"""JSON Schema (2020-12) of the documents other people's files depend on."""

from __future__ import annotations

from typing import Any

from pydantic import TypeAdapter

from engine.design.document import Design, Model, Requirement

DIALECT = "https://json-schema.org/draft/2020-12/schema"


def json_schemas() -> dict[str, dict[str, Any]]:
    """By name: `design`, `model`, `requirement`."""
    sources: dict[str, TypeAdapter[Any]] = {
        "design": TypeAdapter(Design),
        "model": TypeAdapter(Model),
        "requirement": TypeAdapter(Requirement),
    }
    return {
        name: {
            "$schema": DIALECT,
            "$id": f"urn:loopwright:{name}:1",
            **adapter.json_schema(mode="validation"),
        }
        for name, adapter in sources.items()
    }
