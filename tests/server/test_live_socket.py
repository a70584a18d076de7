"""The live socket: one frame a request, the newest wins, every failure is a frame."""

from __future__ import annotations

import contextlib
import json
import threading
import time
from collections.abc import Callable, Iterator
from typing import Any

import numpy as np
import pytest
from websockets.exceptions import ConnectionClosed, InvalidStatus
from websockets.sync.client import ClientConnection, connect

from engine.design.assess import CURVES
from engine.design.limits import Limits
from server.live_answer import answer_to
from tests.server.asking import assert_serves, client
from tests.server.frames import decode
from tests.workbench_process import WorkbenchProcess

_TIMEOUT_S = 30


@pytest.fixture
def live(workbench: WorkbenchProcess) -> Iterator[ClientConnection]:
    with connect(f"ws://{workbench.host}/live", origin=workbench.url, proxy=None) as made:
        yield made


def _ask(live: ClientConnection, **message: Any) -> tuple[dict[str, Any], dict[str, Any]]:
    live.send(json.dumps(message))
    return decode(live.recv(timeout=_TIMEOUT_S))


def test_a_frame_carries_the_assessment_and_the_curves(
    live: ClientConnection, workbench: WorkbenchProcess, plain_design: dict[str, Any]
) -> None:
    header, arrays = _ask(live, seq=7, design=plain_design)
    with client(workbench.url) as ask:
        expected = ask.post("/api/assessment?curves=true", json=plain_design).json()
    curves = expected.pop("curves")
    assert (header["seq"], header["ok"]) == (7, True)
    assert header["assessment"] == expected
    assert header["assess_ms"] > 0
    assert "gain" not in header
    assert len(header["design_sha256"]) == 64
    assert list(arrays) == list(CURVES)
    for name, array in arrays.items():
        exact = np.array(curves[name], dtype=np.float64)  # None becomes NaN
        # float32 has 24 bits: 2^-24 relative when rounded to nearest.
        np.testing.assert_allclose(array, exact, rtol=2.0**-24, atol=1e-37)


def test_the_frame_is_not_compressed(live: ClientConnection) -> None:
    assert live.response is not None
    assert "Sec-WebSocket-Extensions" not in live.response.headers


def test_an_aim_sets_the_gain_and_keeps_its_sign(live: ClientConnection, plain_design: dict[str, Any]) -> None:
    header, _ = _ask(live, seq=1, design=plain_design, aim={"crossover_rad_s": 3.0})
    plain_design["compensator"]["gain"] = header["gain"]
    assert header["gain"] > 0
    crossings = header["assessment"]["cases"][0]["gain_crossovers"]
    np.testing.assert_allclose([at["rad_s"] for at in crossings], [3.0], rtol=1e-12)
    again, _ = _ask(live, seq=2, design=plain_design)
    assert again["assessment"] == header["assessment"]
    assert again["design_sha256"] == header["design_sha256"]
    plain_design["compensator"]["gain"] = -1.0
    negative, _ = _ask(live, seq=3, design=plain_design, aim={"crossover_rad_s": 3.0})
    assert negative["gain"] == -header["gain"]


@pytest.mark.parametrize("aim", [{"crossover_rad_s": 0}, {"crossover_rad_s": -1}, {"crossover_rad_s": "x"},
                                 {"crossover_rad_s": True}, {"crossover_rad_s": None}])  # fmt: skip
def test_an_aim_that_is_none_is_refused(live: ClientConnection, plain_design: dict[str, Any], aim: Any) -> None:
    header, _ = _ask(live, seq=1, design=plain_design, aim=aim)
    assert header["errors"][0]["where"] == "aim.crossover_rad_s"


def test_an_aim_where_the_loop_is_zero_is_refused(live: ClientConnection, plain_design: dict[str, Any]) -> None:
    plain_design["plant_cases"][0]["model"] = {"kind": "expression", "text": "(s^2+9)/(s*(s+1)^2)"}
    header, _ = _ask(live, seq=1, design=plain_design, aim={"crossover_rad_s": 3.0})
    assert header["errors"][0]["where"] == "aim.crossover_rad_s"
    assert "no gain makes the loop cross" in header["errors"][0]["what"]


@pytest.mark.parametrize(
    ("message", "seq", "where"),
    [
        ("", None, ""),
        ("{", None, ""),
        ("[]", None, ""),
        (b"\xff\xfe", None, ""),
        ('{"seq": 3}', 3, "design"),
        ('{"seq": 3, "design": {}, "more": 1}', 3, "more"),
        ('{"seq": 3, "design": []}', 3, ""),
        ('{"seq": -1, "design": {}}', None, "seq"),
        ('{"seq": 1.5, "design": {}}', None, "seq"),
        ('{"seq": true, "design": {}}', None, "seq"),
        ('{"seq": NaN, "design": {}}', None, "seq"),
        ('{"seq": 1e99, "design": {}}', None, "seq"),
        ('{"seq": 3, "design": {"format": "x"}}', 3, "format"),
        ('{"seq": 3, "design": ' + "[" * 100_000, None, ""),
    ],
)
def test_a_wrong_message_is_a_frame_and_the_line_stays(
    live: ClientConnection, plain_design: dict[str, Any], message: str | bytes, seq: int | None, where: str
) -> None:
    live.send(message)
    header, arrays = decode(live.recv(timeout=_TIMEOUT_S))
    assert (header["seq"], header["ok"], header["status"], arrays) == (seq, False, 422, {})
    assert where in [error["where"] for error in header["errors"]]
    assert _ask(live, seq=5, design=plain_design)[0]["ok"] is True


def test_of_many_messages_at_once_only_the_newest_counts(live: ClientConnection, plain_design: dict[str, Any]) -> None:
    count = 400
    for seq in range(1, count + 1):
        plain_design["compensator"]["gain"] = 1 + seq / count
        live.send(json.dumps({"seq": seq, "design": plain_design}))
    answered = []
    while not answered or answered[-1] != count:
        header, _ = decode(live.recv(timeout=_TIMEOUT_S))
        assert header["ok"] is True
        answered.append(header["seq"])
    assert answered == sorted(set(answered))  # never an older one after a newer
    # Each answer takes longer than reading a message: most of them must have been passed over.
    assert len(answered) < count / 2
    with pytest.raises(TimeoutError):
        live.recv(timeout=0.3)


def test_a_failure_is_passed_over_like_any_other(live: ClientConnection, plain_design: dict[str, Any]) -> None:
    for seq in range(1, 101):
        live.send(json.dumps({"seq": seq, "design": plain_design if seq % 2 == 0 else {"format": "x"}}))
    while True:
        header, _ = decode(live.recv(timeout=_TIMEOUT_S))
        if header["seq"] == 100:
            break
    assert header["ok"] is True


def test_other_requests_are_served_while_a_hand_moves(
    live: ClientConnection, workbench: WorkbenchProcess, plain_design: dict[str, Any]
) -> None:
    stop = threading.Event()

    def drag() -> None:
        seq = 0
        while not stop.is_set():
            seq += 1
            _ask(live, seq=seq, design=plain_design)

    hand = threading.Thread(target=drag)
    hand.start()
    try:
        with client(workbench.url) as ask:
            for _ in range(20):
                assert ask.get("/healthz").status_code == 200
    finally:
        stop.set()
        hand.join()


def test_two_pages_do_not_mix(workbench: WorkbenchProcess, plain_design: dict[str, Any]) -> None:
    with (
        connect(f"ws://{workbench.host}/live", proxy=None) as one,
        connect(f"ws://{workbench.host}/live", proxy=None) as other,
    ):
        one.send(json.dumps({"seq": 1, "design": plain_design}))
        other.send(json.dumps({"seq": 1, "design": {**plain_design, "plant_cases": plain_design["plant_cases"][:1]}}))
        assert len(decode(one.recv(timeout=_TIMEOUT_S))[0]["assessment"]["cases"]) == 2
        assert len(decode(other.recv(timeout=_TIMEOUT_S))[0]["assessment"]["cases"]) == 1


def test_a_page_that_leaves_in_the_middle_harms_nobody(
    workbench: WorkbenchProcess, plain_design: dict[str, Any]
) -> None:
    before = workbench.output
    for _ in range(5):
        with contextlib.suppress(OSError), connect(f"ws://{workbench.host}/live", proxy=None) as gone:
            for seq in range(20):
                gone.send(json.dumps({"seq": seq, "design": plain_design}))
            gone.socket.close()
    assert_serves(workbench.url, plain_design)
    time.sleep(0.2)
    assert workbench.output == before


def test_a_large_message_is_told_and_a_huge_one_ends_the_line(
    workbench: WorkbenchProcess, plain_design: dict[str, Any]
) -> None:
    with connect(f"ws://{workbench.host}/live", proxy=None) as live:
        live.send(" " * 3_000_000)
        header, _ = decode(live.recv(timeout=_TIMEOUT_S))
        assert (header["ok"], header["status"]) == (False, 413)
        assert "at most 2000000 bytes" in header["errors"][0]["what"]
        assert _ask(live, seq=1, design=plain_design)[0]["ok"] is True
        with contextlib.suppress(ConnectionClosed):  # the other end closes while this one still sends
            live.send(" " * 50_000_000)
        with pytest.raises(ConnectionClosed):
            live.recv(timeout=_TIMEOUT_S)
    assert_serves(workbench.url, plain_design)


def test_more_connections_than_the_limit_are_refused_in_one_line(
    launch_workbench: Callable[..., WorkbenchProcess], plain_design: dict[str, Any]
) -> None:
    started = launch_workbench(LOOPWRIGHT_MAX_SOCKETS="2")
    address = f"ws://{started.host}/live"
    with connect(address, proxy=None) as first, connect(address, proxy=None):
        with pytest.raises(InvalidStatus) as raised:
            connect(address, proxy=None)
        assert raised.value.response.status_code == 503
        assert b"live connections are taken" in raised.value.response.body
        assert _ask(first, seq=1, design=plain_design)[0]["ok"] is True
    deadline = time.monotonic() + _TIMEOUT_S
    while True:  # the places are free again as soon as the server has seen the others go
        try:
            with connect(address, proxy=None):
                break
        except InvalidStatus:
            assert time.monotonic() < deadline


def test_a_surprise_is_a_frame_and_a_line_in_the_log(
    plain_design: dict[str, Any], monkeypatch: pytest.MonkeyPatch, caplog: pytest.LogCaptureFixture
) -> None:
    def broken(_: object) -> None:
        raise ZeroDivisionError("inside")

    monkeypatch.setattr("server.live_answer.assess_with_arrays", broken)
    header, _ = decode(answer_to(json.dumps({"seq": 9, "design": plain_design}), 10**6, Limits()))
    assert (header["seq"], header["status"]) == (9, 500)
    assert "inside" not in header["errors"][0]["what"]
    assert "ZeroDivisionError" in caplog.text
