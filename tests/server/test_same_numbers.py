"""One design, four entrances, one set of digits."""

from __future__ import annotations

import json
import subprocess
import sys
from typing import Any

import numpy as np
from websockets.sync.client import connect

from engine.design.assess import assess
from engine.design.parse import parse_design
from engine.design.transfer_function import hand_over
from tests.server.asking import client
from tests.server.frames import decode
from tests.workbench_process import CLONE, WorkbenchProcess


def test_every_entrance_gives_the_same_digits(workbench: WorkbenchProcess, demo_design: dict[str, Any]) -> None:
    expected = json.loads(json.dumps(assess(parse_design(demo_design), curves=True)))
    with client(workbench.url) as ask:
        by_http = ask.post("/api/assessment?curves=true", json=demo_design).json()
        ticket = ask.post("/api/designs", json=demo_design).json()
        stored = ask.get(f"/api/designs/{ticket['token']}").json()["design"]
        by_link = ask.post("/api/assessment?curves=true", json=stored).json()
    with connect(f"ws://{workbench.host}/live", proxy=None) as live:
        live.send(json.dumps({"seq": 1, "design": demo_design}))
        header, arrays = decode(live.recv(timeout=30))
    command = [sys.executable, "-m", "server", "check", "-", "--json", "--curves"]
    done = subprocess.run(command, cwd=CLONE, input=json.dumps(demo_design), capture_output=True, text=True, timeout=60)

    assert by_http == expected
    assert by_link == expected
    assert json.loads(done.stdout) == expected
    curves = expected.pop("curves")
    assert header["assessment"] == expected
    for name, array in arrays.items():
        # Rounded to float32, and nothing else.
        np.testing.assert_array_equal(array, np.array(curves[name], dtype=np.float64).astype(np.float32))


def test_the_file_handed_over_is_the_same_everywhere(workbench: WorkbenchProcess, demo_design: dict[str, Any]) -> None:
    expected = json.loads(json.dumps(hand_over(parse_design(demo_design))))
    with client(workbench.url) as ask:
        assert ask.post("/api/exports/transfer-function", json=demo_design).json() == expected
    command = [sys.executable, "-m", "server", "export", "-", "--as", "transfer-function"]
    done = subprocess.run(command, cwd=CLONE, input=json.dumps(demo_design), capture_output=True, text=True, timeout=60)
    assert json.loads(done.stdout) == expected
