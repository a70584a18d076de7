"""What every request passes first: who may ask, how much may be sent, and what a browser may do with the answer."""

from __future__ import annotations

import contextlib
import ipaddress
import re
import socket
from collections.abc import Iterable
from urllib.parse import urlsplit

from starlette.datastructures import Headers, MutableHeaders
from starlette.requests import ClientDisconnect
from starlette.types import ASGIApp, Message, Receive, Scope, Send

from server.error_shape import RefusedError
from server.faults import refuse
from server.settings import Settings

_HOST = re.compile(r"(?P<name>\[[0-9a-fA-F:.]+\]|[A-Za-z0-9._-]+)(:\d{1,5})?")
_SAFE_METHODS = frozenset({"GET", "HEAD", "OPTIONS"})

_FIXED_HEADERS = {
    "X-Content-Type-Options": "nosniff",
    "X-Frame-Options": "DENY",
    "Referrer-Policy": "no-referrer",  # a link's token must not travel to another site
    "Cross-Origin-Opener-Policy": "same-origin",
    "Cross-Origin-Resource-Policy": "same-origin",
    "Permissions-Policy": "camera=(), geolocation=(), microphone=()",
}


class Doorkeeper:
    """Stands around the whole application, so that even the answer to a surprise carries the headers."""

    def __init__(self, app: ASGIApp, settings: Settings) -> None:
        self._app = app
        self._body_bytes = settings.body_bytes
        self._own_origin = settings.base_url.lower()
        self._names = _names_of_this_server(settings)

    async def __call__(self, scope: Scope, receive: Receive, send: Send) -> None:
        """Refuse what may not pass; else hand on, with the body counted and the headers added."""
        if scope["type"] not in ("http", "websocket"):
            await self._app(scope, receive, send)
            return
        headers = Headers(scope=scope)
        host = headers.get("host", "")
        problem = self._foreign(scope, headers, host)
        answer = _with_headers(send, _content_policy("" if problem else host))
        if problem:
            status, what = problem
            await refuse(status, what)(scope, receive, answer)
        elif scope["type"] == "websocket":
            await self._app(scope, receive, answer)
        else:
            await self._with_bounded_body(scope, headers, receive, answer)

    def _foreign(self, scope: Scope, headers: Headers, host: str) -> tuple[int, str] | None:
        """Why this request may not pass, if so.

        A page of another site can make a browser send requests here. It gives itself away by `Origin`; or, if its
        name was made to point at this address (DNS rebinding), by a `Host` that is not one of this server's names.
        """
        found = _HOST.fullmatch(host)
        if not found:
            return 400, f"the Host header must name this server, is {host[:80]!r}"
        if not self._is_own(found["name"].lower()):
            return 403, f"this server is not called {host[:80]!r}; names can be added in LOOPWRIGHT_HOSTS"
        origin = headers.get("origin")
        asks_for_change = scope["type"] == "websocket" or scope["method"] not in _SAFE_METHODS
        if origin is not None and asks_for_change and not self._same_site(origin.lower(), host.lower()):
            return 403, f"requests from pages of {origin[:80]!r} are refused; open the workbench at its own address"
        return None

    def _is_own(self, name: str) -> bool:
        # Rebinding needs a name that the attacker controls, so a plain address is always safe.
        return name in self._names or _is_address(name)

    def _same_site(self, origin: str, host: str) -> bool:
        return origin in (f"http://{host}", f"https://{host}") or (
            bool(self._own_origin) and origin == self._own_origin
        )

    async def _with_bounded_body(self, scope: Scope, headers: Headers, receive: Receive, send: Send) -> None:
        """Hand on with the body counted; too large a body is refused at once, announced or not."""
        what = f"the body is too large, at most {self._body_bytes} bytes are taken"
        announced = headers.get("content-length", "0")
        if not announced.isdigit() or len(announced) > 18 or int(announced) > self._body_bytes:
            # The rest is not waited for. The connection stays open while the client goes on sending, so that it
            # gets to read the answer; what arrives is dropped.
            await refuse(413, what)(scope, receive, send)
            return
        read = 0

        async def counted() -> Message:
            nonlocal read
            message = await receive()
            read += len(message.get("body", b""))
            if read > self._body_bytes:
                raise RefusedError(413, what)
            return message

        # A client that went away in the middle of its body cannot be answered.
        with contextlib.suppress(ClientDisconnect):
            await self._app(scope, counted, send)


def _names_of_this_server(settings: Settings) -> frozenset[str]:
    machine = socket.gethostname().lower()
    own = urlsplit(settings.base_url).hostname or ""
    return frozenset({"localhost", machine, machine.split(".")[0], own, settings.host.lower(), *settings.hosts}) - {""}


def _is_address(name: str) -> bool:
    try:
        ipaddress.ip_address(name.strip("[]"))
    except ValueError:
        return False
    return True


def _content_policy(host: str) -> str:
    live = f" ws://{host} wss://{host}" if host else ""
    return _joined(
        (
            "default-src 'self'",
            "style-src 'self' 'unsafe-inline'",  # Plotly writes its own style element
            "img-src 'self' data: blob:",
            f"connect-src 'self'{live}",
            "worker-src 'self' blob:",
            "object-src 'none'",
            "base-uri 'none'",
            "form-action 'self'",
            "frame-ancestors 'none'",
        )
    )


def _joined(directives: Iterable[str]) -> str:
    return "; ".join(directives)


def _with_headers(send: Send, content_policy: str) -> Send:
    async def sending(message: Message) -> None:
        if message["type"] in ("http.response.start", "websocket.http.response.start"):
            headers = MutableHeaders(scope=message)
            headers["Content-Security-Policy"] = content_policy
            for name, value in _FIXED_HEADERS.items():
                headers[name] = value
            headers.setdefault("Cache-Control", "no-store")
        await send(message)

    return sending
