"""Routes of the link store: share a design, open it, withdraw it."""

from __future__ import annotations

import json
from typing import Annotated

from fastapi import APIRouter, Header, Request, Response

from server import computing
from server.error_shape import RefusedError
from server.exact_json import exact_json
from server.request_body import DESIGN_BODY, body_text, described
from server.services import Services
from server.settings import Settings

WITHDRAW_HEADER = "X-Withdraw-Key"
UNKNOWN = "no design is shared under this link; it may be incomplete, or the design was withdrawn"


def link_to(settings: Settings, request: Request, token: str) -> str:
    """The absolute address of a shared design."""
    return f"{settings.base_url or str(request.base_url).rstrip('/')}/d/{token}"


def routes(services: Services) -> APIRouter:
    """The routes of this module."""
    router = APIRouter()
    store = services.store

    @router.post("/api/designs", status_code=201, openapi_extra=described(DESIGN_BODY))
    async def share(request: Request) -> Response:
        """Store a design for good. The withdraw key is told this once."""
        text = await body_text(request)
        ready = await services.requests.run(computing.checked, text, services.settings.limits)
        ticket = await services.disk(store.put, ready.document, ready.design_sha256)
        told = {
            "ok": True,
            "token": ticket.token,
            "link": link_to(services.settings, request, ticket.token),
            "withdraw_key": ticket.withdraw_key,
            "design_sha256": ready.design_sha256,
        }
        return exact_json(told, 201)

    @router.get("/api/designs/{token}")
    async def shared(request: Request, token: str) -> Response:
        """A shared design, exactly as it was stored."""
        stored = await services.disk(store.get, token)
        if stored is None:
            raise RefusedError(404, UNKNOWN, "token")
        return exact_json(
            {
                "ok": True,
                "token": token,
                "link": link_to(services.settings, request, token),
                "design": json.loads(stored.document),
                "design_sha256": stored.design_sha256,
                "stored_at": stored.stored_at,
            }
        )

    @router.delete("/api/designs/{token}")
    async def withdraw(
        token: str,
        withdraw_key: Annotated[str, Header(alias=WITHDRAW_HEADER, description="as told when it was shared")] = "",
    ) -> Response:
        """Remove a shared design; whoever has its link finds nothing any more."""
        if not withdraw_key:
            raise RefusedError(401, f"give the withdraw key in the header {WITHDRAW_HEADER}", WITHDRAW_HEADER)
        done = await services.disk(store.withdraw, token, withdraw_key)
        if done == "unknown":
            raise RefusedError(404, UNKNOWN, "token")
        if done == "wrong key":
            raise RefusedError(403, "is not the withdraw key of this design", WITHDRAW_HEADER)
        return exact_json({"ok": True, "token": token, "withdrawn": True})

    return router
