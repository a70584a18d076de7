"""Fixtures for every test: a real server, and designs to give it."""

from __future__ import annotations

import copy
import json
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import pytest

from tests.workbench_process import CLONE, WorkbenchProcess

# By hand: 2.5/(s(s+1)) with the lead crosses 0 dB near 2 rad/s with ample phase; two cases, everything met.
_PLAIN_DESIGN = {
    "format": "loopwright-design/1",
    "title": "Bench axis",
    "signals": {"output": {"name": "angle", "unit": "rad"}, "effort": {"name": "drive", "unit": "V"}},
    "plant_cases": [
        {"name": "empty", "model": {"kind": "factored", "gain": 2.5, "poles": [0, -1]}},
        {"name": "loaded", "model": {"kind": "expression", "text": "2/(s*(s+0.8))"}},
    ],
    "compensator": {"gain": 1.0, "stages": [{"kind": "lead_lag", "zero_rad_s": 1.2, "pole_rad_s": 12.0}]},
    "requirements": [
        {"measure": "phase_margin_deg", "at_least": 45, "reason": "room for ageing"},
        {"measure": "peak_sensitivity", "at_most": 1.9},
        {"measure": "crossover_rad_s", "at_least": 0.5},
    ],
}


@pytest.fixture
def plain_design() -> dict[str, Any]:
    """A small design that meets its sheet; each test gets its own to change."""
    return copy.deepcopy(_PLAIN_DESIGN)


def demo_files() -> list[Path]:
    """The designs that ship, for parametrizing."""
    return sorted(path for path in (CLONE / "demo_plants").glob("*.json") if path.stem != "index")


@pytest.fixture(params=demo_files(), ids=lambda path: path.stem)
def demo_design(request: pytest.FixtureRequest) -> dict[str, Any]:
    """Each demo in turn."""
    return json.loads(request.param.read_text(encoding="utf-8"))


@pytest.fixture(scope="session")
def workbench(tmp_path_factory: pytest.TempPathFactory) -> Iterator[WorkbenchProcess]:
    """One server for all tests that leave it as it was; designs that they share stay in its store."""
    process = WorkbenchProcess(tmp_path_factory.mktemp("store") / "links.sqlite")
    yield process
    process.stop()


@pytest.fixture(scope="session")
def workbench_url(workbench: WorkbenchProcess) -> str:
    """Its address, without a slash at the end."""
    return workbench.url


@pytest.fixture
def launch_workbench(tmp_path: Path) -> Iterator[Callable[..., WorkbenchProcess]]:
    """Start servers of one's own: `launch_workbench(port=…, LOOPWRIGHT_…="…")`; they end with the test."""
    running: list[WorkbenchProcess] = []

    def launch(port: int = 0, store: Path | None = None, **environment: str) -> WorkbenchProcess:
        running.append(WorkbenchProcess(store or tmp_path / "links.sqlite", port, **environment))
        return running[-1]

    yield launch
    for process in running:
        process.kill()
