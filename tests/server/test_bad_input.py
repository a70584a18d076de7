"""Bad input at every entrance: one clear line naming the field, and the server goes on serving.

Each test has a timeout for its answer; none measures time.
"""

from __future__ import annotations

import json
import subprocess
import sys
from typing import Any

import httpx
import pytest
from websockets.sync.client import connect

from tests.server.asking import JSON, assert_refused, assert_serves, client
from tests.server.faulty_designs import BODIES, FAULTY, Faulty, literal_faults
from tests.server.frames import decode
from tests.workbench_process import CLONE, WorkbenchProcess

_QUICKLY_S = 10


@pytest.fixture(scope="module")
def ask(workbench_url: str) -> httpx.Client:
    with client(workbench_url) as made:
        made.timeout = _QUICKLY_S
        yield made


@pytest.mark.parametrize("faulty", FAULTY, ids=lambda faulty: faulty.name)
def test_a_spoiled_design_is_refused_by_its_field(
    ask: httpx.Client, workbench: WorkbenchProcess, plain_design: dict[str, Any], faulty: Faulty
) -> None:
    body = json.dumps(faulty.spoiled(plain_design))
    for path in ("/api/assessment", "/api/designs", "/api/exports/transfer-function"):
        error = assert_refused(ask.post(path, content=body, headers=JSON), 422, faulty.where, faulty.what)
    with connect(f"ws://{workbench.host}/live", proxy=None) as live:
        live.send(f'{{"seq": 4, "design": {body}}}')
        header, _ = decode(live.recv(timeout=_QUICKLY_S))
    assert (header["ok"], header["status"]) == (False, 422)
    assert header["errors"][0]["what"] == error["what"]
    # What is wrong with the JSON itself is found before the design is taken out of the message.
    assert header["errors"][0]["where"] == ("design." if header["seq"] is None else "") + error["where"]


@pytest.mark.parametrize(("name", "body", "what"), BODIES, ids=[name for name, _, _ in BODIES])
def test_a_body_that_is_no_design_is_refused(ask: httpx.Client, name: str, body: bytes, what: str) -> None:
    for path in ("/api/assessment", "/api/designs", "/api/exports/curves"):
        assert_refused(ask.post(path, content=body, headers=JSON), 422, "", what)
    for path in ("/api/models", "/api/stages"):
        assert_refused(ask.post(path, content=body, headers=JSON), 422, "")


def test_literals_that_json_does_not_have(ask: httpx.Client, plain_design: dict[str, Any]) -> None:
    for name, body, where in literal_faults(plain_design):
        error = assert_refused(ask.post("/api/assessment", content=body, headers=JSON), 422, where)
        assert name == "twice" or "must be a finite number" in error["what"]


def test_after_all_that_the_server_serves_and_has_logged_nothing(
    ask: httpx.Client, workbench: WorkbenchProcess, plain_design: dict[str, Any]
) -> None:
    for faulty in FAULTY:
        ask.post("/api/assessment", content=json.dumps(faulty.spoiled(plain_design)), headers=JSON)
    assert_serves(workbench.url, plain_design)
    assert "Traceback" not in workbench.output


@pytest.mark.parametrize("faulty", FAULTY[::6], ids=lambda faulty: faulty.name)
def test_the_command_says_the_same_in_one_line(plain_design: dict[str, Any], faulty: Faulty) -> None:
    done = subprocess.run(
        [sys.executable, "-m", "server", "check", "-"], cwd=CLONE, input=json.dumps(faulty.spoiled(plain_design)),
        capture_output=True, text=True, timeout=60,
    )  # fmt: skip
    assert (done.returncode, done.stdout) == (2, "")
    assert done.stderr.startswith(f"loopwright: standard input: {faulty.where}")
    assert done.stderr.count("\n") == 1


def test_more_mistakes_than_one_are_all_listed(ask: httpx.Client, plain_design: dict[str, Any]) -> None:
    plain_design["compensator"]["stages"][0]["pole_rad_s"] = -3
    plain_design["plant_cases"][0]["model"]["gain"] = "x"
    answer = ask.post("/api/assessment", json=plain_design)
    assert_refused(answer, 422)
    assert {error["where"] for error in answer.json()["errors"]} == {
        "compensator.stages[0].pole_rad_s", "plant_cases[0].model.gain"
    }  # fmt: skip
