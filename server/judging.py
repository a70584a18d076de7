"""Routes that compute: assessment, exports, one model, one stage for a purpose."""

from __future__ import annotations

import re
from typing import Annotated, Any

from fastapi import APIRouter, Query, Request, Response

from engine.design.assess import assess
from engine.design.canonical import design_sha256
from engine.design.document import Design
from engine.design.parse import parse_design, parse_model
from engine.design.purposes import PURPOSES, stage_for
from engine.design.transfer_function import root_pairs
from engine.errors import DesignError
from engine.model.spelling import as_text
from server.exact_json import exact_json
from server.export_kinds import EXPORTS, refusal_of
from server.faults import RefusedError
from server.json_text import parse_json
from server.request_body import DESIGN_BODY, body_text, described, fields_of, object_body
from server.services import Services
from server.shared_designs import link_to


def routes(services: Services) -> APIRouter:
    """The routes of this module."""
    router = APIRouter()
    limits = services.settings.limits

    def design_in(text: bytes) -> Design:
        return parse_design(parse_json(text), limits)

    @router.post("/api/assessment", openapi_extra=described(DESIGN_BODY))
    async def assessment(request: Request, curves: bool = False) -> Response:
        """Every reading and verdict of a design; with `curves=true` the sampled curves too."""
        text = await body_text(request)
        return exact_json(await services.requests.run(lambda: assess(design_in(text), curves)))

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
        chosen = EXPORTS[kind]

        def work() -> tuple[str, str]:
            design = design_in(text)
            return design.title, chosen.write(design, _link(services, request, design, token))

        title, made = await services.requests.run(work)
        name = f"{_file_name(title)}-{kind}.{chosen.ending}"
        headers = {"Content-Disposition": f'attachment; filename="{name}"'}
        return Response(made, headers=headers, media_type=chosen.media_type)

    @router.post("/api/models", openapi_extra=object_body(model={"$ref": "/api/schemas/model"}))
    async def model(request: Request) -> Response:
        """One model by itself: its gain, zeros, poles and dead time, or what is wrong with it."""
        text = await body_text(request)
        return exact_json(await services.requests.run(lambda: _model_parts(text, services)))

    @router.post("/api/stages", openapi_extra=object_body(design=DESIGN_BODY, purpose={"enum": list(PURPOSES)}))
    async def stage(request: Request) -> Response:
        """A sensible stage at a sensible place for a purpose."""
        text = await body_text(request)

        def work() -> dict[str, Any]:
            fields = fields_of(parse_json(text), ["design", "purpose"])
            if not isinstance(fields["purpose"], str):
                raise DesignError("purpose", f"must be one of {', '.join(PURPOSES)}")
            found = stage_for(parse_design(fields["design"], limits), fields["purpose"])
            return {"ok": True, "stage": found.stage, "why": found.why}

        return exact_json(await services.requests.run(work))

    return router


def _link(services: Services, request: Request, design: Design, token: str) -> str | None:
    """The link of the stored design, if a token is given and stands for exactly this design."""
    if not token:
        return None
    stored = services.store.get(token)
    if stored is None or stored.design_sha256 != design_sha256(design.document()):
        raise RefusedError(422, "does not stand for this design; share it first, or leave the token out", "token")
    return link_to(services.settings, request, token)


def _model_parts(text: bytes, services: Services) -> dict[str, Any]:
    fields = fields_of(parse_json(text), ["model"])
    model = parse_model(fields["model"], services.settings.limits)
    return {
        "ok": True,
        "gain": model.gain,
        "zeros": root_pairs(model.zeros),
        "poles": root_pairs(model.poles),
        "dead_time_s": model.dead_time_s,
        "text": as_text(model),
    }


def _file_name(title: str) -> str:
    return re.sub(r"[^a-z0-9]+", "-", title.lower()).strip("-")[:60] or "design"
