"""Routes that compute: assessment, exports, one model, one stage for a purpose."""

from __future__ import annotations

from typing import Annotated

from fastapi import APIRouter, Query, Request, Response

from engine.design.purposes import PURPOSES
from server import computing
from server.computing import Trace
from server.error_shape import RefusedError
from server.exact_json import json_response
from server.export_kinds import EXPORTS, refusal_of
from server.request_body import DESIGN_BODY, body_text, described, object_body
from server.services import Services
from server.shared_designs import link_to


def routes(services: Services) -> APIRouter:
    """The routes of this module."""
    router = APIRouter()
    limits = services.settings.limits
    lane = services.requests

    @router.post("/api/assessment", openapi_extra=described(DESIGN_BODY))
    async def assessment(request: Request, curves: bool = False) -> Response:
        """Every reading and verdict of a design; with `curves=true` the sampled curves too."""
        return json_response(await lane.run(computing.assessment, await body_text(request), curves, limits))

    @router.post("/api/exports/{kind}", openapi_extra=described(DESIGN_BODY))
    async def export(
        request: Request,
        kind: str,
        token: Annotated[str, Query(description="token of the stored design, for tracing back")] = "",
    ) -> Response:
        """The final transfer function (JSON) or the curves (CSV) of a design, as a file."""
        refusal = refusal_of(kind)
        if refusal:
            raise RefusedError(404, refusal, "kind")
        text = await body_text(request)
        trace = await _trace(services, request, token) if token else None
        name, content = await lane.run(computing.export, kind, text, trace, limits)
        headers = {"Content-Disposition": f'attachment; filename="{name}"'}
        return Response(content, headers=headers, media_type=EXPORTS[kind].media_type)

    @router.post("/api/models", openapi_extra=object_body(model={"$ref": "/api/schemas/model"}))
    async def model(request: Request) -> Response:
        """One model by itself: its gain, zeros, poles and dead time, or what is wrong with it."""
        return json_response(await lane.run(computing.model, await body_text(request), limits))

    @router.post("/api/stages", openapi_extra=object_body(design=DESIGN_BODY, purpose={"enum": list(PURPOSES)}))
    async def stage(request: Request) -> Response:
        """A sensible stage at a sensible place for a purpose."""
        return json_response(await lane.run(computing.stage, await body_text(request), limits))

    return router


async def _trace(services: Services, request: Request, token: str) -> Trace:
    stored = await services.disk(services.store.get, token)
    if stored is None:
        raise RefusedError(422, "stands for no shared design; share this one first, or leave the token out", "token")
    return Trace(link_to(services.settings, request, token), stored.design_sha256)
