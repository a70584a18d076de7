"""How long a move of the hand takes to reach the screen: real Chromium, a local server, five plant cases.

Run: python -m tests.bench.bench_drag [--seconds 6] [--rate 60]

A marker of the benchmark axis (tests.bench.live_designs: order 12, two modes of damping 0.005) is dragged to and fro
for some seconds. The page measures itself: pointer event to painted frame, superseded moves counted until the frame
that overtook them. Beside it, in the same run, stand the server's own time for one assessment and the time of an
empty animation frame, since headless Chromium on few cores shares them with the server.
"""

from __future__ import annotations

import argparse
import itertools
import json
import math
import re
import statistics
import tempfile
import time
from pathlib import Path
from typing import Any

from playwright.sync_api import Page, sync_playwright

from tests.bench.live_designs import live_design
from tests.browser.conftest import design_fragment
from tests.browser_place import browser_executable
from tests.workbench_process import WorkbenchProcess

ARGUMENTS = ["--no-sandbox", "--disable-background-networking", "--disable-component-update", "--no-first-run"]
REACH_PX = 60


def drag(page: Page, seconds: float, rate_hz: float) -> None:
    """Move the lead's zero to and fro on a sine, as evenly as this process can."""
    handle = page.get_by_role("slider", name=re.compile("lead.*zero|zero.*lead")).first
    box = handle.bounding_box()
    assert box is not None
    x, y = box["x"] + box["width"] / 2, box["y"] + box["height"] / 2
    page.mouse.move(x, y)
    page.mouse.down()
    start = time.perf_counter()
    step = 0
    while (now := time.perf_counter() - start) < seconds:
        page.mouse.move(x + REACH_PX * math.sin(2 * math.pi * now / 2.0), y)
        step += 1
        time.sleep(max(0.0, start + step / rate_hz - time.perf_counter()))
    page.mouse.up()


def empty_frame_ms(page: Page) -> float:
    """Median time between two animation frames with nothing to do."""
    stamps = page.evaluate(
        """() => new Promise((done) => {
            const seen = [];
            const tick = (now) => { seen.push(now); seen.length < 90 ? requestAnimationFrame(tick) : done(seen); };
            requestAnimationFrame(tick);
        })"""
    )
    return statistics.median(b - a for a, b in itertools.pairwise(stamps))


def measure(url: str, seconds: float, rate_hz: float, width: int) -> dict[str, Any]:
    """One drag on a fresh page; the page's own read-out and the surroundings."""
    with sync_playwright() as playwright:
        browser = playwright.chromium.launch(executable_path=browser_executable(), args=ARGUMENTS)
        page = browser.new_page(viewport={"width": width, "height": 900})
        page.goto(f"{url}/#{design_fragment(live_design(0))}")
        page.locator("#ledger[data-verdict]:not([data-verdict=''])").wait_for()
        page.wait_for_timeout(1500)
        frame_ms = empty_frame_ms(page)
        drag(page, seconds, rate_hz)
        page.wait_for_timeout(900)
        pace = json.loads(page.evaluate("document.documentElement.dataset.pace"))
        browser.close()
    return {"width_px": width, **pace, "empty_frame_ms": round(frame_ms, 2)}


def main() -> None:
    """Print the figures as JSON, a line a run."""
    options = argparse.ArgumentParser(description=__doc__)
    options.add_argument("--seconds", type=float, default=6.0)
    options.add_argument("--rate", type=float, default=60.0, help="pointer moves a second")
    chosen = options.parse_args()
    with tempfile.TemporaryDirectory() as folder:
        workbench = WorkbenchProcess(Path(folder, "store.sqlite"))
        try:
            for width in (1280, 1920):
                print(json.dumps(measure(workbench.url, chosen.seconds, chosen.rate, width)))
        finally:
            workbench.stop()


if __name__ == "__main__":
    main()
