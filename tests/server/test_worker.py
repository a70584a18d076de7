"""Computation in processes of its own: stopped when it takes too long, replaced when it dies."""

from __future__ import annotations

import asyncio
import json
import logging
import os
import signal
import time
from collections.abc import Callable, Iterator
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path
from typing import Any

import pytest
from websockets.sync.client import connect

from engine.errors import DesignError
from server.error_shape import RefusedError
from server.lane import Lane
from server.worker import TooLongError, Worker
from tests.server.asking import assert_refused, assert_serves, client
from tests.server.frames import decode
from tests.workbench_process import WorkbenchProcess, has_ended

_LONG_S = 60.0


def _doubled(number: int) -> int:
    return 2 * number


def _process_id() -> int:
    return os.getpid()


def _sleep() -> None:
    time.sleep(600)


def _refuse() -> None:
    raise DesignError("a.b", "is wrong")


def _fail() -> None:
    raise ZeroDivisionError("inside")


def _die() -> None:
    os.kill(os.getpid(), signal.SIGKILL)


@pytest.fixture(scope="module")
def kept() -> Iterator[Worker]:
    made = Worker()
    yield made
    made.stop()


def test_it_computes_in_one_other_process(kept: Worker) -> None:
    assert kept.call(_doubled, (21,), _LONG_S) == 42
    first, second = kept.call(_process_id, (), _LONG_S), kept.call(_process_id, (), _LONG_S)
    assert first == second != os.getpid()


def test_a_fault_comes_back_as_it_was_raised(kept: Worker) -> None:
    with pytest.raises(DesignError) as raised:
        kept.call(_refuse, (), _LONG_S)
    assert [(fault.where, fault.what) for fault in raised.value.faults] == [("a.b", "is wrong")]


def test_a_surprise_is_logged_and_not_told(kept: Worker, caplog: pytest.LogCaptureFixture) -> None:
    with pytest.raises(RefusedError) as raised:
        kept.call(_fail, (), _LONG_S)
    assert raised.value.status == 500
    assert "inside" not in str(raised.value)
    assert "ZeroDivisionError: inside" in caplog.text


def test_what_takes_too_long_is_ended_and_the_next_is_computed(kept: Worker) -> None:
    before = kept.call(_process_id, (), _LONG_S)
    with pytest.raises(TooLongError, match=r"takes longer than 0.2 s"):
        kept.call(_sleep, (), 0.2)
    with pytest.raises(ProcessLookupError):
        os.kill(before, 0)
    assert kept.call(_process_id, (), _LONG_S) != before


def test_a_worker_that_dies_is_replaced(kept: Worker, caplog: pytest.LogCaptureFixture) -> None:
    caplog.set_level(logging.ERROR)
    with pytest.raises(RefusedError):
        kept.call(_die, (), _LONG_S)
    assert "a worker ended in the middle of its work" in caplog.text
    assert kept.call(_doubled, (4,), _LONG_S) == 8


def test_a_lane_refuses_what_would_wait_too_long() -> None:
    lane = Lane("test", 1, 30.0)

    async def crowd() -> list[object]:
        return await asyncio.gather(*(lane.run(_doubled, number) for number in range(70)), return_exceptions=True)

    try:
        # In a thread of its own: where browser tests ran before, this one has an event loop already.
        with ThreadPoolExecutor(1) as thread:
            results = thread.submit(lambda: asyncio.run(crowd())).result()
    finally:
        lane.close()
    assert results[:64] == [2 * number for number in range(64)]
    assert all(isinstance(result, RefusedError) and result.status == 503 for result in results[64:])


def _endless(design: dict[str, Any]) -> dict[str, Any]:
    """Within every limit, and far more work than three seconds."""
    poles = [-(1.1 ** (number - 30)) for number in range(60)]
    design["plant_cases"] = [
        {
            "name": f"case {number}",
            "model": {"kind": "factored", "gain": 1.0 + number, "poles": poles, "dead_time_s": 0.01},
        }
        for number in range(32)
    ]
    design["requirements"] = [{"measure": "sensitivity_db", "at_most": 6 + number, "over_rad_s": [0.01, 1000 + number]}
                              for number in range(64)]  # fmt: skip
    return design


def test_a_design_that_takes_too_long_is_refused_and_the_server_serves(
    launch_workbench: Callable[..., WorkbenchProcess], plain_design: dict[str, Any]
) -> None:
    started = launch_workbench(LOOPWRIGHT_MAX_SECONDS="3")
    endless = _endless(json.loads(json.dumps(plain_design)))
    assert_serves(started.url, plain_design)
    with client(started.url) as ask:
        assert_refused(
            ask.post("/api/assessment", json=endless), 422, "", "takes longer than 3 s to compute; use fewer"
        )
    with connect(f"ws://{started.host}/live", proxy=None) as live:
        live.send(json.dumps({"seq": 3, "design": endless}))
        header, _ = decode(live.recv(timeout=60))
        assert (header["seq"], header["status"]) == (3, 422)
        assert "takes longer than 3 s" in header["errors"][0]["what"]
    assert_serves(started.url, plain_design)


@pytest.mark.skipif(not Path("/proc").is_dir(), reason="processes are looked up in /proc")
def test_a_server_that_is_killed_leaves_no_worker_behind(
    launch_workbench: Callable[..., WorkbenchProcess], plain_design: dict[str, Any]
) -> None:
    started = launch_workbench()
    assert_serves(started.url, plain_design)
    workers = started.children()
    assert len(workers) >= 2
    started.kill()
    deadline = time.monotonic() + 30
    while not all(has_ended(worker) for worker in workers):
        assert time.monotonic() < deadline
        time.sleep(0.05)
