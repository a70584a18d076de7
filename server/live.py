"""The live socket: a design comes, its frame goes back, and only the newest design counts.

Two tasks a connection: one reads every message at once and keeps the newest, the other answers it. So a hand that
moves faster than the server computes never builds up a queue.
"""

from __future__ import annotations

import asyncio
import contextlib
import logging

from fastapi import APIRouter
from starlette.websockets import WebSocket, WebSocketDisconnect

from engine.errors import Fault
from server.error_shape import RefusedError
from server.faults import refuse, too_long
from server.live_answer import answer_to, seq_in
from server.live_frame import refusal_frame
from server.services import Services
from server.worker import TooLongError

_LOG = logging.getLogger("loopwright.live")


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
            frame = refusal_frame(seq_in(message), refusal.status, [refusal.fault])
        except TooLongError as error:
            frame = refusal_frame(seq_in(message), 422, [Fault("", too_long(error))])
        try:
            await socket.send_bytes(frame)
        except (WebSocketDisconnect, RuntimeError):
            return  # the other end has gone; the reader notices too
