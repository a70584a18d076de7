"""One way to ask a server, and the one test for its error shape."""

from __future__ import annotations

import http.client
import json
from typing import Any

import httpx

JSON = {"Content-Type": "application/json"}
TIMEOUT_S = 30


def client(url: str) -> httpx.Client:
    """A client that a test closes by `with`."""
    return httpx.Client(base_url=url, timeout=TIMEOUT_S, trust_env=False)


def assert_refused(answer: httpx.Response, status: int, where: str | None = None, what: str = "") -> dict[str, Any]:
    """The answer has the one error shape, with this status, place and words; returns its first error."""
    assert answer.status_code == status, answer.text
    assert answer.headers["content-type"] == "application/json"
    body = answer.json()
    assert set(body) == {"ok", "status", "errors"}
    assert body["ok"] is False
    assert body["status"] == status
    assert body["errors"]
    for error in body["errors"]:
        assert set(error) == {"where", "what"}
        assert error["what"]
        assert "\n" not in error["what"]
        assert "Traceback" not in error["what"]
        assert len(error["what"]) < 1200  # an unknown measure is told all the known ones
    first = body["errors"][0]
    if where is not None:
        assert first["where"] == where, first
    assert what in first["what"], first
    return first


def assert_serves(url: str, design: dict[str, Any]) -> None:
    """The server still judges a design."""
    with client(url) as ask:
        assert ask.post("/api/assessment", json=design).json()["format"] == "loopwright-assessment/1"


def raw(host: str, method: str, path: str, headers: dict[str, str], body: bytes = b"") -> tuple[int, dict[str, Any]]:
    """Send exactly these headers and bytes, nothing added but Host; returns status and body."""
    connection = http.client.HTTPConnection(host, timeout=TIMEOUT_S)
    try:
        connection.putrequest(method, path, skip_host="Host" in headers, skip_accept_encoding=True)
        for name, value in headers.items():
            connection.putheader(name, value)
        connection.endheaders(body or None)
        answer = connection.getresponse()
        return answer.status, json.loads(answer.read())
    finally:
        connection.close()
