"""The live socket: a design comes, its frame goes back, and only the newest design counts.

Two tasks a connection: one reads every message at once and keeps the newest, the other answers it. So a hand that
moves faster than the server computes never builds up a queue.
"""

from __future__ import annotations

import asyncio
import contextlib
import logging
import time
from typing import Any

from fastapi import APIRouter
from starlette.websockets import WebSocket, WebSocketDisconnect

from engine.design.aim import aimed_at
from engine.design.assess import assess_with_arrays
from engine.design.canonical import design_sha256
from engine.design.limits import Limits
from engine.design.parse import parse_design
from engine.errors import DesignError, Fault
from server.faults import RefusedError, refuse
from server.json_text import parse_json
from server.live_frame import frame_of, refusal_frame
from server.request_body import fields_of
from server.services import Services

_LOG = logging.getLogger("loopwright.live")
_LARGEST_SEQ = 2**53


def routes(services: Services) -> APIRouter:
    """The route of this module."""
    router = APIRouter()
    open_sockets = 0

    @router.websocket("/live")
    async def live(socket: WebSocket) -> None:
        nonlocal open_sockets
        if open_sockets >= services.settings.sockets:
            await socket.send_denial_response(
                refuse(503, f"all {services.settings.sockets} live connections are taken; close another page")
            )
            return
        open_sockets += 1
        try:
            await socket.accept()
            await _serve(socket, services)
        finally:
            open_sockets -= 1

    return router


class _Newest:
    """Holds one message; a newer one takes its place."""

    def __init__(self) -> None:
        self._message: str | bytes = ""
        self._arrived = asyncio.Event()

    def put(self, message: str | bytes) -> None:
        self._message = message
        self._arrived.set()

    async def take(self) -> str | bytes:
        await self._arrived.wait()
        self._arrived.clear()
        return self._message


async def _serve(socket: WebSocket, services: Services) -> None:
    newest = _Newest()
    answering = asyncio.create_task(_answer(socket, newest, services))
    answering.add_done_callback(_tell)
    try:
        while True:
            message = await socket.receive()
            if message["type"] == "websocket.disconnect":
                return
            newest.put(message.get("text") or message.get("bytes") or "")
    finally:
        answering.cancel()
        with contextlib.suppress(asyncio.CancelledError):
            await answering


def _tell(task: asyncio.Task[None]) -> None:
    if not task.cancelled() and task.exception() is not None:
        _LOG.error("a live connection failed", exc_info=task.exception())


async def _answer(socket: WebSocket, newest: _Newest, services: Services) -> None:
    most, limits = services.settings.body_bytes, services.settings.limits
    while True:
        message = await newest.take()
        try:
            frame = await services.live.run(answer_to, message, most, limits)
        except RefusedError as refusal:
            frame = refusal_frame(None, refusal.status, [refusal.fault])
        try:
            await socket.send_bytes(frame)
        except (WebSocketDisconnect, RuntimeError):
            return  # the other end has gone; the reader notices too


def answer_to(message: str | bytes, most_bytes: int, limits: Limits) -> bytes:
    """The frame that answers one message; every failure is a frame too."""
    seq: int | None = None
    try:
        if len(message) > most_bytes:
            return refusal_frame(
                seq, 413, [Fault("", f"the message is too large, at most {most_bytes} bytes are taken")]
            )
        data = parse_json(message)
        seq = _seq_of(data)
        fields = fields_of(data, ["seq", "design"], ["aim"])
        if seq is None:
            raise DesignError("seq", "must be a whole number from 0 up")
        return _assessed(seq, fields["design"], fields.get("aim"), limits)
    except DesignError as error:
        return refusal_frame(seq, 422, error.faults)
    except Exception:
        _LOG.exception("an assessment failed")
        return refusal_frame(
            seq, 500, [Fault("", "something went wrong in Loopwright itself; its log has the details")]
        )


def _assessed(seq: int, document: Any, aim: Any, limits: Limits) -> bytes:
    design = parse_design(document, limits)
    more: dict[str, Any] = {}
    if aim is not None:
        design = aimed_at(design, _crossover_of(aim))
        more["gain"] = design.compensator.gain
    began = time.perf_counter()
    assessment, arrays = assess_with_arrays(design)
    more["assess_ms"] = round((time.perf_counter() - began) * 1e3, 3)
    more["design_sha256"] = design_sha256(design.document())
    return frame_of({"seq": seq, "ok": True, "assessment": assessment, **more}, arrays)


def _seq_of(data: Any) -> int | None:
    seq = data.get("seq") if isinstance(data, dict) else None
    return seq if type(seq) is int and 0 <= seq < _LARGEST_SEQ else None


def _crossover_of(aim: Any) -> float:
    try:
        crossover = fields_of(aim, ["crossover_rad_s"])["crossover_rad_s"]
    except DesignError as error:
        raise error.within("aim") from None
    if type(crossover) not in (int, float) or not crossover > 0:
        raise DesignError("aim.crossover_rad_s", "must be a number greater than 0")
    return float(crossover)
