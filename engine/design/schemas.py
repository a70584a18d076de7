"""JSON Schema (2020-12) of the documents other people's files depend on."""

from __future__ import annotations

from typing import Any

from pydantic import TypeAdapter

from engine.design.document import Design, Model, Requirement
from engine.design.published import AssessmentOut, TransferFunctionOut

DIALECT = "https://json-schema.org/draft/2020-12/schema"


def json_schemas() -> dict[str, dict[str, Any]]:
    """By name: `design`, `model`, `requirement` as they are read; `assessment`, `transfer-function` as written."""
    read: dict[str, TypeAdapter[Any]] = {
        "design": TypeAdapter(Design),
        "model": TypeAdapter(Model),
        "requirement": TypeAdapter(Requirement),
    }
    written: dict[str, TypeAdapter[Any]] = {
        "assessment": TypeAdapter(AssessmentOut),
        "transfer-function": TypeAdapter(TransferFunctionOut),
    }
    return {
        name: {"$schema": DIALECT, "$id": f"urn:loopwright:{name}:1", **adapter.json_schema(mode="validation")}
        for name, adapter in {**read, **written}.items()
    }
