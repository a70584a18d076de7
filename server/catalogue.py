"""Routes that list: demos, measures, schemas; and whether the server is well."""

from __future__ import annotations

from typing import Any

from fastapi import APIRouter, Response

from engine.design.measures import MEASURES, Measure
from engine.design.schemas import json_schemas
from server.demos import demo_list
from server.error_shape import RefusedError
from server.exact_json import exact_json
from server.services import Services
from server.version import loopwright_version

_NEEDS_FREQUENCIES = ("at_rad_s", "over_rad_s", "mask")


def routes(services: Services) -> APIRouter:
    """The routes of this module."""
    router = APIRouter()
    schemas = json_schemas()

    @router.get("/api/demos")
    async def demos() -> Response:
        """The designs that ship with the workbench; `landing` marks the one a first visit opens on."""
        return exact_json(demo_list(services.demos))

    @router.get("/api/demos/{name}")
    async def demo(name: str) -> Response:
        """One demo with its design."""
        found = services.demos.get(name)
        if found is None:
            raise RefusedError(404, f"there is no demo {name[:60]!r}; there are {', '.join(services.demos)}", "name")
        return exact_json({"ok": True, "name": name, "design": found.design})

    @router.get("/api/measures")
    async def measures() -> Response:
        """Every measure that a requirement can name."""
        return exact_json([measure_entry(measure) for measure in MEASURES.values()])

    @router.get("/api/schemas")
    async def schema_names() -> Response:
        """The names of the schemas."""
        return exact_json(list(schemas))

    @router.get("/api/schemas/{name}")
    async def schema(name: str) -> Response:
        """A JSON Schema (2020-12) of what this version reads or writes."""
        found = schemas.get(name.removesuffix(".json"))
        if found is None:
            raise RefusedError(404, f"there is no schema {name[:60]!r}; there are {', '.join(schemas)}", "name")
        return Response(exact_json(found, indent=2).body, media_type="application/schema+json")

    @router.head("/healthz", include_in_schema=False)
    @router.get("/healthz")
    async def healthz() -> Response:
        """Whether the server answers and can store designs."""
        await services.disk(services.store.check)
        return exact_json({"ok": True, "version": loopwright_version()})

    return router


def measure_entry(measure: Measure) -> dict[str, Any]:
    """A measure as the API lists it."""
    return {
        "measure": measure.name,
        "label": measure.label,
        "unit": measure.unit,
        "direction": measure.usual,
        "kind": "frequency" if measure.per_frequency else "scalar",
        "what": measure.what,
        "needs": list(_NEEDS_FREQUENCIES) if measure.per_frequency else [],
        "scale": measure.scale,
        "read_from": measure.read_from,
        "group": measure.group,
    }
