"""Every way to fail over HTTP, answered in the one error shape."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TypeVar

from fastapi import FastAPI, Request
from fastapi.exceptions import RequestValidationError
from starlette.exceptions import HTTPException
from starlette.responses import JSONResponse

from engine.errors import DesignError, Fault
from server.error_shape import SURPRISE, RefusedError, error_body
from server.link_store import StoreError
from server.worker import TooLongError

Kind = TypeVar("Kind", bound=Exception)


def refuse(status: int, what: str, where: str = "", headers: Mapping[str, str] | None = None) -> JSONResponse:
    """One fault as a response."""
    return JSONResponse(error_body(status, [Fault(where, what)]), status, headers)


def install(app: FastAPI) -> None:
    """Make every way to fail speak the one shape."""
    app.add_exception_handler(RefusedError, _on_refused)
    app.add_exception_handler(DesignError, _on_design_error)
    app.add_exception_handler(TooLongError, _on_too_long)
    app.add_exception_handler(StoreError, _on_store_error)
    app.add_exception_handler(HTTPException, _on_http_exception)
    app.add_exception_handler(RequestValidationError, _on_parameters)
    app.add_exception_handler(Exception, _on_surprise)


def _on_refused(_: Request, error: Exception) -> JSONResponse:
    refusal = _as(RefusedError, error)
    return JSONResponse(error_body(refusal.status, [refusal.fault]), refusal.status, refusal.headers)


def _on_design_error(_: Request, error: Exception) -> JSONResponse:
    return JSONResponse(error_body(422, _as(DesignError, error).faults), 422)


def _on_too_long(_: Request, error: Exception) -> JSONResponse:
    return refuse(422, too_long(_as(TooLongError, error)))


def too_long(error: TooLongError) -> str:
    """What a person can do about it."""
    return f"{error}; use fewer plant cases, requirements or stages (or raise LOOPWRIGHT_MAX_SECONDS)"


def _on_store_error(_: Request, error: Exception) -> JSONResponse:
    return refuse(507 if _as(StoreError, error).full else 503, f"the link store {error}")


def _on_http_exception(request: Request, error: Exception) -> JSONResponse:
    known = _as(HTTPException, error)
    path = request.url.path[:120]
    what = {
        404: f"there is nothing at {path}",
        405: f"{request.method} is not possible at {path}",
    }.get(known.status_code, str(known.detail))
    return refuse(known.status_code, what, headers=known.headers)


def _on_parameters(_: Request, error: Exception) -> JSONResponse:
    """Path and query parameters; bodies are read by our own reader."""
    faults = [
        Fault(str(entry["loc"][-1]), f"{entry['msg'][0].lower()}{entry['msg'][1:]}, is {str(entry['input'])[:60]!r}")
        for entry in _as(RequestValidationError, error).errors()
    ]
    return JSONResponse(error_body(422, faults), 422)


def _on_surprise(_: Request, __: Exception) -> JSONResponse:
    return refuse(500, SURPRISE)


def _as(kind: type[Kind], error: Exception) -> Kind:
    if not isinstance(error, kind):
        raise error
    return error
