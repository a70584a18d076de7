"""The pages: the workbench, the workbench on a shared design, the words about the API; and their static files."""

from __future__ import annotations

import mimetypes
from collections.abc import Mapping
from typing import Any

from fastapi import APIRouter, FastAPI, Request, Response
from starlette.responses import HTMLResponse
from starlette.staticfiles import StaticFiles
from starlette.templating import Jinja2Templates
from starlette.types import Scope

from server.error_shape import RefusedError
from server.plotly_script import PlotlyScript
from server.services import Services
from server.shared_designs import UNKNOWN
from server.shipped import STATIC, TEMPLATES
from server.version import loopwright_version

_REVALIDATE = "no-cache"
_FOR_GOOD = "public, max-age=31536000, immutable"
_HOW = ["GET", "HEAD"]

# Some systems call scripts something else, and a browser that is told not to sniff then refuses them.
mimetypes.add_type("text/javascript", ".js")
mimetypes.add_type("image/svg+xml", ".svg")


class RevalidatedFiles(StaticFiles):
    """Files that a browser may keep, but must ask about (ETag) before it uses them again."""

    async def get_response(self, path: str, scope: Scope) -> Response:
        """The file, or 304 when the browser's copy is still right."""
        response = await super().get_response(path, scope)
        response.headers["Cache-Control"] = _REVALIDATE
        return response


def install(app: FastAPI, services: Services) -> None:
    """Add the pages and the static files."""
    plotly = PlotlyScript()
    app.include_router(_routes(app, services, plotly))
    app.mount("/static", RevalidatedFiles(directory=STATIC, check_dir=False))


def _routes(app: FastAPI, services: Services, plotly: PlotlyScript) -> APIRouter:
    router = APIRouter(include_in_schema=False)
    templates = Jinja2Templates(directory=TEMPLATES)
    words = {"version": loopwright_version(), "plotly_version": plotly.version}

    def page(request: Request, name: str, status: int = 200, **more: Any) -> HTMLResponse:
        return templates.TemplateResponse(request, name, {**words, **more}, status_code=status)

    @router.api_route("/", methods=_HOW)
    async def workbench(request: Request) -> Response:
        return page(request, "workbench.html", token="")

    @router.api_route("/d/{token}", methods=_HOW)
    async def workbench_on_shared_design(request: Request, token: str) -> Response:
        known = await services.disk(services.store.get, token) is not None
        if not known and "text/html" not in request.headers.get("accept", ""):
            raise RefusedError(404, UNKNOWN, "token")
        return page(request, "workbench.html", 200 if known else 404, token=token)

    @router.api_route("/api/docs", methods=_HOW)
    async def words_about_the_api(request: Request) -> Response:
        return page(request, "api_docs.html", operations=operations_of(app.openapi()))

    @router.api_route("/static/plotly.min.js", methods=_HOW)
    async def plotly_script(request: Request, v: str = "") -> Response:
        headers = {
            "Cache-Control": _FOR_GOOD if v == plotly.version else _REVALIDATE,
            "ETag": plotly.etag,
            "Vary": "Accept-Encoding",
        }
        if plotly.etag in request.headers.get("if-none-match", ""):
            return Response(status_code=304, headers=headers)
        if "gzip" not in request.headers.get("accept-encoding", ""):
            return Response(plotly.plain, headers=headers, media_type="text/javascript")
        packed = await services.disk(lambda: plotly.packed)
        return Response(packed, headers={**headers, "Content-Encoding": "gzip"}, media_type="text/javascript")

    return router


def operations_of(description: Mapping[str, Any]) -> list[dict[str, Any]]:
    """The operations of an OpenAPI document in a flat list, for the page about the API."""
    return [
        {
            "method": method.upper(),
            "path": path,
            "what": operation.get("description", ""),
            "parameters": operation.get("parameters", []),
            "body": operation.get("requestBody", {}).get("content", {}).get("application/json", {}).get("schema"),
        }
        for path, methods in description["paths"].items()
        for method, operation in methods.items()
    ]
