"""Serve the workbench: take the port, say where it is, open a browser."""

from __future__ import annotations

import errno
import logging
import os
import socket
import sys
import threading
import webbrowser

import uvicorn

from engine.errors import LoopwrightError
from server.application import create_app
from server.settings import Settings
from server.version import loopwright_version
from server.worker import LOG_FORMAT

_BACKLOG = 128
_GRACE_S = 3


class ListenError(LoopwrightError):
    """The address cannot be listened on."""


def serve(settings: Settings, open_browser: bool) -> int:
    """Run until stopped; returns the exit code."""
    listening = listen_on(settings.host, settings.port)
    logging.basicConfig(level=logging.WARNING, format=LOG_FORMAT)
    config = uvicorn.Config(
        create_app(settings),
        log_config=None,
        access_log=False,
        server_header=False,
        ws_per_message_deflate=False,  # deflating costs more time than sending over a local line
        # Beyond its own limit the socket is closed at once; up to it, the answer can say what is wrong.
        ws_max_size=4 * settings.body_bytes,
        timeout_graceful_shutdown=_GRACE_S,
    )
    address = _address(settings.host, listening)
    _Announcing(config, address, open_browser and _has_screen()).run(sockets=[listening])
    return 0


def listen_on(host: str, port: int) -> socket.socket:
    """A listening socket; ListenError says in one line why there is none."""
    try:
        family, kind, protocol, _, place = socket.getaddrinfo(host, port, type=socket.SOCK_STREAM)[0]
    except (socket.gaierror, UnicodeError):
        raise ListenError(f"the host {host!r} is not known; use an address of this machine, as 127.0.0.1") from None
    made = socket.socket(family, kind, protocol)
    if os.name == "posix":  # elsewhere this would allow two servers on one port
        made.setsockopt(socket.SOL_SOCKET, socket.SO_REUSEADDR, 1)
    try:
        made.bind(place)
        made.listen(_BACKLOG)
    except OSError as error:
        made.close()
        raise ListenError(_why_not(error, host, port)) from None
    return made


def _why_not(error: OSError, host: str, port: int) -> str:
    if error.errno == errno.EADDRINUSE:
        return f"port {port} is taken; choose another with --port (0 takes any free one)"
    if error.errno == errno.EACCES:
        return f"port {port} may not be used by this user; choose one above 1023 with --port"
    if error.errno == errno.EADDRNOTAVAIL:
        return f"the host {host!r} is not an address of this machine; 127.0.0.1 always is"
    return f"cannot listen on {host} port {port}: {error.strerror}"


class _Announcing(uvicorn.Server):
    """Says where the workbench is as soon as it answers."""

    def __init__(self, config: uvicorn.Config, address: str, open_browser: bool) -> None:
        super().__init__(config)
        self._address = address
        self._open_browser = open_browser

    async def startup(self, sockets: list[socket.socket] | None = None) -> None:
        await super().startup(sockets)
        if not self.started:
            return
        print(f"Loopwright {loopwright_version()} is open at {self._address} (Ctrl+C stops it)", flush=True)
        if self._open_browser:
            # Some browsers keep the caller waiting until they are closed.
            threading.Thread(target=webbrowser.open, args=(self._address,), daemon=True).start()


def _address(host: str, listening: socket.socket) -> str:
    port = listening.getsockname()[1]
    shown = {"0.0.0.0": "127.0.0.1", "::": "[::1]", "": "127.0.0.1"}.get(host, f"[{host}]" if ":" in host else host)
    return f"http://{shown}:{port}/"


def _has_screen() -> bool:
    """Whether a browser window can open; a text browser would take over the terminal."""
    return sys.platform in ("darwin", "win32") or bool(os.environ.get("DISPLAY") or os.environ.get("WAYLAND_DISPLAY"))
