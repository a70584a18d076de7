"""Taking hold of things on the charts, as a hand does."""

from __future__ import annotations

import json
import math
import time
from typing import Any

from playwright.sync_api import Locator, Page, expect


def marker(page: Page, name: str) -> Locator:
    """A marker on the gain curve, or another handle that is there once."""
    return page.get_by_role("slider", name=name, exact=True)


def rail_handle(page: Page, name: str) -> Locator:
    """A handle on the rail."""
    return page.get_by_role("slider", name=f"{name}, on the rail", exact=True)


def middle(handle: Locator) -> tuple[float, float]:
    """The middle of a handle on the page, in px."""
    box = handle.bounding_box()
    assert box is not None, f"{handle} is not on the screen"
    return box["x"] + box["width"] / 2, box["y"] + box["height"] / 2


def value(handle: Locator) -> float:
    """The value that a handle tells."""
    return float(handle.get_attribute("aria-valuenow") or math.nan)


def has_value(handle: Locator, want: float, rel: float = 1e-5) -> None:
    """Wait until a handle tells this value; it is drawn with the next animation frame."""
    deadline = time.monotonic() + 10
    while not math.isclose(value(handle), want, rel_tol=rel):
        assert time.monotonic() < deadline, f"{value(handle)} is not {want}"
        handle.page.wait_for_timeout(20)


def changed_value(handle: Locator, before: float) -> float:
    """Wait until a handle tells another value than before; gives it."""
    deadline = time.monotonic() + 10
    while (now := value(handle)) == before:
        assert time.monotonic() < deadline, f"still {before}"
        handle.page.wait_for_timeout(20)
    return now


def take(page: Page, handle: Locator) -> tuple[float, float]:
    """Close the hand on a handle; gives where."""
    x, y = middle(handle)
    page.mouse.move(x, y)
    page.mouse.down()
    return x, y


def pull(page: Page, handle: Locator, dx: float, dy: float = 0, steps: int = 12) -> None:
    """Take a handle, move it and let go."""
    x, y = take(page, handle)
    page.mouse.move(x + dx, y + dy, steps=steps)
    page.mouse.up()


def px_per_decade(page: Page, handle: Locator) -> float:
    """From a trial move that is put back."""
    before = value(handle)
    x, y = take(page, handle)
    page.mouse.move(x + 40, y)
    after = changed_value(handle, before)
    page.keyboard.press("Escape")
    page.mouse.up()
    settled(page)
    return 40 / math.log10(after / before)


def settled(page: Page) -> None:
    """Wait until nothing is held, nothing is on its way and Plotly's own drawing stands alone."""
    expect(page.locator("html")).to_have_attribute("data-live", "up to date")
    expect(page.locator(".stage.is-held")).to_have_count(0)
    expect(page.locator("canvas.live-curves:not([hidden])")).to_have_count(0)
    page.evaluate("() => new Promise((done) => requestAnimationFrame(() => requestAnimationFrame(done)))")


def nominal_path(page: Page) -> str:
    """The nominal gain curve as Plotly has drawn it."""
    return page.locator('#charts .figure [class*="tracenominal-0"] path.js-line').get_attribute("d") or ""


def pace(page: Page) -> dict[str, Any]:
    """The page's own measurement of the last drag."""
    page.wait_for_function("() => document.documentElement.dataset.pace")
    page.wait_for_timeout(600)
    return json.loads(page.evaluate("() => document.documentElement.dataset.pace"))
