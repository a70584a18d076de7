"""The web application: the routes put together, with one error shape and one doorkeeper around them."""

from __future__ import annotations

from collections.abc import AsyncIterator
from contextlib import asynccontextmanager

from fastapi import APIRouter, FastAPI, Response
from starlette.types import ASGIApp

from server import catalogue, faults, judging, live, pages, shared_designs
from server.doorkeeper import Doorkeeper
from server.error_shape import RefusedError
from server.services import Services
from server.settings import Settings
from server.version import loopwright_version

_LATER = {
    "/api/proposals": "proposals are",
    "/api/reports": "reports are",
    "/api/measurements": "measured plants are",
}


def create_app(settings: Settings | None = None) -> ASGIApp:
    """The application, ready for an ASGI server."""
    services = Services.of(settings or Settings.from_environment())
    return Doorkeeper(web_application(services), services.settings)


def web_application(services: Services) -> FastAPI:
    """The routes without the doorkeeper."""

    @asynccontextmanager
    async def lifespan(_: FastAPI) -> AsyncIterator[None]:
        services.open()
        yield
        services.close()

    app = FastAPI(
        title="Loopwright",
        version=loopwright_version(),
        description="Feedback compensators judged against a requirement sheet. Frequencies are rad/s, times seconds.",
        openapi_url="/api/openapi.json",
        docs_url=None,  # the usual page loads its scripts from another host; pages.py has its own
        redoc_url=None,
        redirect_slashes=False,
        lifespan=lifespan,
    )
    faults.install(app)
    for part in (judging, shared_designs, catalogue, live):
        app.include_router(part.routes(services))
    app.include_router(_later())
    pages.install(app, services)
    return app


def _later() -> APIRouter:
    router = APIRouter(include_in_schema=False)

    def refuse_for_now(path: str, what: str) -> None:
        @router.post(path)
        async def not_yet() -> Response:
            raise RefusedError(404, f"{what} not in this version yet")

    for path, what in _LATER.items():
        refuse_for_now(path, what)
    return router
