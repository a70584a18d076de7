"""Who may ask, how much may be sent, what a browser may do with the answer."""

from __future__ import annotations

import socket
from collections.abc import Callable
from typing import Any

import pytest
from websockets.exceptions import InvalidStatus
from websockets.sync.client import connect

from tests.server.asking import JSON, assert_refused, assert_serves, client, raw
from tests.workbench_process import WorkbenchProcess


@pytest.mark.parametrize("path", ["/", "/healthz", "/api/demos", "/nothing", "/static/plotly.min.js", "/api/docs"])
def test_every_answer_carries_the_headers(workbench_url: str, path: str) -> None:
    with client(workbench_url) as ask:
        headers = ask.get(path).headers
    policy = dict(rule.split(" ", 1) for rule in headers["content-security-policy"].split("; "))
    host = workbench_url.removeprefix("http://")
    assert policy["default-src"] == "'self'"
    assert policy["connect-src"] == f"'self' ws://{host} wss://{host}"
    assert policy["worker-src"] == "'self' blob:"
    assert policy["object-src"] == policy["base-uri"] == policy["frame-ancestors"] == "'none'"
    assert "script-src" not in policy  # so that default-src holds for scripts: none inline, none from elsewhere
    assert headers["x-content-type-options"] == "nosniff"
    assert headers["referrer-policy"] == "no-referrer"
    assert "server" not in headers


@pytest.mark.parametrize(
    "host", ["evil.example", "evil.example:80", "localhost.evil.example", "127.0.0.1.evil.example"]
)
def test_a_name_that_is_not_this_servers_is_refused(workbench: WorkbenchProcess, host: str) -> None:
    status, body = raw(workbench.host, "GET", "/api/demos", {"Host": host})
    assert status == 403
    assert body["errors"][0]["what"].startswith(f"this server is not called '{host}'")


@pytest.mark.parametrize("host", ["", "a b", "localhost:x", "<script>", "user@localhost"])
def test_a_host_that_is_none_is_refused(workbench: WorkbenchProcess, host: str) -> None:
    status, body = raw(workbench.host, "GET", "/", {"Host": host})
    assert status in (400, 403)
    assert body["ok"] is False


@pytest.mark.parametrize("host", ["localhost", "LOCALHOST:8478", "127.0.0.1:1", "[::1]:8478", "192.0.2.7:8478"])
def test_own_names_and_plain_addresses_are_served(workbench: WorkbenchProcess, host: str) -> None:
    assert raw(workbench.host, "GET", "/healthz", {"Host": host})[0] == 200


def test_further_names_and_the_base_url_can_be_set(launch_workbench: Callable[..., WorkbenchProcess]) -> None:
    started = launch_workbench(LOOPWRIGHT_HOSTS="loops", LOOPWRIGHT_BASE_URL="https://loops.example")
    for host in ("loops", "loops.example"):
        assert raw(started.host, "GET", "/healthz", {"Host": host})[0] == 200
    # Behind a proxy that ends TLS, the page's origin is the base address whatever Host says.
    headers = {**JSON, "Host": "loops", "Origin": "https://loops.example", "Content-Length": "2"}
    assert raw(started.host, "POST", "/api/designs", headers, b"{}")[0] == 422


@pytest.mark.parametrize("origin", ["https://evil.example", "null", "http://127.0.0.1:1", "", "file://"])
@pytest.mark.parametrize(("method", "path"), [("POST", "/api/designs"), ("DELETE", "/api/designs/x")])
def test_changes_from_foreign_pages_are_refused(workbench_url: str, origin: str, method: str, path: str) -> None:
    with client(workbench_url) as ask:
        answer = ask.request(method, path, headers={"Origin": origin, **JSON}, content=b"{}")
    assert_refused(answer, 403, "", "requests from pages of")


def test_the_own_page_may_change(workbench_url: str, plain_design: dict[str, Any]) -> None:
    with client(workbench_url) as ask:
        assert ask.post("/api/designs", json=plain_design, headers={"Origin": workbench_url}).status_code == 201


@pytest.mark.parametrize("origin", ["https://evil.example", "null", "http://localhost:1"])
def test_a_socket_from_a_foreign_page_is_refused_in_one_line(workbench: WorkbenchProcess, origin: str) -> None:
    with pytest.raises(InvalidStatus) as raised:
        connect(f"ws://{workbench.host}/live", origin=origin, proxy=None)
    assert raised.value.response.status_code == 403
    assert b"requests from pages of" in raised.value.response.body
    assert raised.value.response.body.count(b"\n") == 0


def test_a_socket_under_a_foreign_name_is_refused(workbench: WorkbenchProcess) -> None:
    host, port = workbench.host.split(":")
    with socket.create_connection((host, int(port)), timeout=30) as plain:
        plain.sendall(
            b"GET /live HTTP/1.1\r\nHost: evil.example\r\nUpgrade: websocket\r\nConnection: Upgrade\r\n"
            b"Sec-WebSocket-Key: dGhlIHNhbXBsZSBub25jZQ==\r\nSec-WebSocket-Version: 13\r\n\r\n"
        )
        assert plain.recv(4096).startswith(b"HTTP/1.1 403 ")


@pytest.mark.parametrize("origin", [None, "own"])
def test_a_socket_from_the_own_page_or_a_script_is_taken(workbench: WorkbenchProcess, origin: str | None) -> None:
    with connect(f"ws://{workbench.host}/live", origin=origin and workbench.url, proxy=None) as live:
        live.send("{}")
        assert b'"ok":false' in live.recv(timeout=30)


# --- bodies that are too large ----------------------------------------------------------------------------------


def test_a_large_body_is_refused_before_it_is_sent(workbench: WorkbenchProcess, plain_design: dict[str, Any]) -> None:
    """Nothing of the 50 MB ever goes out: only its announcement does."""
    status, body = raw(workbench.host, "POST", "/api/assessment", {**JSON, "Content-Length": "50000000"})
    assert (status, body["errors"][0]["what"]) == (413, "the body is too large, at most 2000000 bytes are taken")
    assert_serves(workbench.url, plain_design)


@pytest.mark.parametrize("length", ["-1", "1e3", "9" * 30])
def test_a_length_that_is_none_is_refused(workbench: WorkbenchProcess, length: str) -> None:
    host, port = workbench.host.split(":")
    with socket.create_connection((host, int(port)), timeout=30) as plain:
        plain.sendall(f"POST /api/assessment HTTP/1.1\r\nHost: {host}\r\nContent-Length: {length}\r\n\r\n".encode())
        assert plain.recv(4096).split()[1] in (b"400", b"413")


def test_fifty_megabytes_sent_at_once_are_refused(workbench_url: str, plain_design: dict[str, Any]) -> None:
    with client(workbench_url) as ask:
        answer = ask.post("/api/assessment", content=b"[" * 50_000_000, headers=JSON)
    assert_refused(answer, 413, "", "the body is too large")
    assert_serves(workbench_url, plain_design)


def test_a_large_body_in_chunks_is_refused(workbench: WorkbenchProcess, plain_design: dict[str, Any]) -> None:
    """Without an announced length the limit holds all the same: the answer comes with the rest still unsent."""
    host, port = workbench.host.split(":")
    with socket.create_connection((host, int(port)), timeout=30) as plain:
        plain.sendall(
            f"POST /api/designs HTTP/1.1\r\nHost: {host}\r\nContent-Type: application/json\r\n"
            "Transfer-Encoding: chunked\r\n\r\n".encode()
        )
        for _ in range(40):
            plain.sendall(b"10000\r\n" + b" " * 0x10000 + b"\r\n")
        answer = b""
        while b"the body is too large" not in answer:  # headers and body may come separately
            received = plain.recv(65536)
            assert received, answer
            answer += received
    assert answer.startswith(b"HTTP/1.1 413 ")
    assert_serves(workbench.url, plain_design)


def test_a_client_that_leaves_in_the_middle_harms_nobody(
    workbench: WorkbenchProcess, plain_design: dict[str, Any]
) -> None:
    host, port = workbench.host.split(":")
    logged = workbench.output
    for _ in range(3):
        with socket.create_connection((host, int(port)), timeout=30) as plain:
            plain.sendall(
                f"POST /api/designs HTTP/1.1\r\nHost: {host}\r\nContent-Type: application/json\r\n"
                "Content-Length: 1000\r\n\r\n{".encode()
            )
    assert_serves(workbench.url, plain_design)
    assert workbench.output == logged
