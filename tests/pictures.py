"""The README's picture of the screen: the landing demo in a real Chromium, its marker held halfway.

Run: python -m tests.pictures [--out FILE] [--dark] [--width 1440] [--height 900]
"""

from __future__ import annotations

import argparse
import json
import math
import tempfile
from pathlib import Path

from playwright.sync_api import Locator, Page, sync_playwright

from tests.browser_place import browser_executable
from tests.workbench_process import CLONE, WorkbenchProcess

PICTURE = CLONE / "web" / "pictures" / "workbench.png"
HANDLE = "lead zero"
"""What the page calls the handle that meets the landing demo."""
OTHER_HANDLE = "lead pole"
HELD_AT_RAD_S = 8.0
_QUIET = ["--no-sandbox", "--no-first-run", "--disable-background-networking", "--disable-component-update"]


def main() -> None:
    """Start a server and a browser, hold the marker, write the picture."""
    parser = argparse.ArgumentParser(description="Write the README's picture of the screen.")
    parser.add_argument("--out", type=Path, default=PICTURE, help="file to write")
    parser.add_argument("--dark", action="store_true", help="the dark ground")
    parser.add_argument("--width", type=int, default=1440)
    parser.add_argument("--height", type=int, default=900)
    chosen = parser.parse_args()
    place = browser_executable()
    if place is None:
        raise SystemExit("no Chromium or Chrome was found: install one, or name it in LOOPWRIGHT_BROWSER")
    chosen.out.parent.mkdir(parents=True, exist_ok=True)
    with tempfile.TemporaryDirectory() as folder, sync_playwright() as play:
        workbench = WorkbenchProcess(Path(folder) / "links.sqlite")
        try:
            browser = play.chromium.launch(executable_path=place, args=_QUIET)
            page = browser.new_page(
                viewport={"width": chosen.width, "height": chosen.height},
                color_scheme="dark" if chosen.dark else "light",
            )
            page.goto(workbench.url)
            page.locator("#ledger[data-verdict]:not([data-verdict=''])").wait_for()
            hold(page, HELD_AT_RAD_S)
            page.screenshot(path=chosen.out)
            browser.close()
        finally:
            workbench.stop()
    print(f"{chosen.out.name}: {chosen.out.stat().st_size // 1000} kB")


def hold(page: Page, rad_s: float) -> None:
    """Take hold of the marker on the magnitude curve and move it to `rad_s`; it stays held."""
    handle = page.get_by_role("slider", name=HANDLE, exact=True)
    other = page.get_by_role("slider", name=OTHER_HANDLE, exact=True)
    (x, y), (other_x, _) = middle(handle), middle(other)
    # The scale is logarithmic, and two handles of known values give it.
    per_pixel = math.log(value(other) / value(handle)) / (other_x - x)
    page.mouse.move(x, y)
    page.mouse.down()
    page.mouse.move(x + math.log(rad_s / value(handle)) / per_pixel, y, steps=12)
    page.wait_for_timeout(800)


def middle(handle: Locator) -> tuple[float, float]:
    """The middle of a handle on the page, in pixels."""
    box = handle.bounding_box()
    if box is None:
        raise SystemExit(f"the handle {HANDLE!r} is not on the screen")
    return box["x"] + box["width"] / 2, box["y"] + box["height"] / 2


def value(handle: Locator) -> float:
    """The value that a handle tells."""
    told: float = json.loads(handle.get_attribute("aria-valuenow") or "0")
    return told


if __name__ == "__main__":
    main()
