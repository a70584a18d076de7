"""Pages of a real Chromium on a real server; each test looks at its own browser context."""

from __future__ import annotations

import base64
import json
import zlib
from collections.abc import Callable, Iterator
from typing import Any

import pytest
from playwright.sync_api import Browser, BrowserContext, ConsoleMessage, Page, Request, sync_playwright

from tests.browser_place import browser_executable

_QUIET = [
    "--no-sandbox",
    "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
    "--disable-default-apps",
]
# The browser itself logs every answer of 400 and above; a refusal that a test asks for is not an error of the page.
_LOGGED_REFUSAL = "Failed to load resource: the server responded with a status of 4"


@pytest.fixture(scope="session")
def chromium() -> Iterator[Browser]:
    """One browser process for all tests; contexts share nothing."""
    place = browser_executable()
    assert place, "no Chromium or Chrome was found: install one, or name it in LOOPWRIGHT_BROWSER"
    with sync_playwright() as play:
        browser = play.chromium.launch(executable_path=place, args=_QUIET)
        yield browser
        browser.close()


class Visit:
    """A browser context on one server, with what went wrong in it."""

    def __init__(self, browser: Browser, url: str, **options: Any) -> None:
        self.url = url
        self.troubles: list[str] = []
        options = {"viewport": {"width": 1280, "height": 900}, "accept_downloads": True, "base_url": url, **options}
        self.context: BrowserContext = browser.new_context(**options)
        self.context.set_default_timeout(15_000)

    def open(self, path: str = "/", *, design: dict[str, Any] | None = None) -> Page:
        """A page at `path`, or on `design`, once the first verdict stands in the ledger."""
        page = self.context.new_page()
        page.on("console", self._heard)
        page.on("pageerror", lambda error: self.troubles.append(f"page error: {error}"))
        page.on("request", self._asked)
        page.goto(f"{self.url}/#{design_fragment(design)}" if design else f"{self.url}{path}")
        page.locator("#ledger[data-verdict]:not([data-verdict=''])").wait_for()
        return page

    def _heard(self, message: ConsoleMessage) -> None:
        if message.type in ("error", "warning") and not message.text.startswith(_LOGGED_REFUSAL):
            self.troubles.append(f"console {message.type}: {message.text}")

    def _asked(self, request: Request) -> None:
        if not request.url.startswith((self.url, "data:", "blob:")):
            self.troubles.append(f"asked another host: {request.url}")


@pytest.fixture
def visit(chromium: Browser, workbench_url: str) -> Iterator[Callable[..., Visit]]:
    """`visit(color_scheme="dark")` is a fresh browser context; at the end none of them may have had trouble."""
    visits: list[Visit] = []

    def begin(url: str = workbench_url, **options: Any) -> Visit:
        visits.append(Visit(chromium, url, **options))
        return visits[-1]

    yield begin
    troubles = [trouble for one in visits for trouble in one.troubles]
    for one in visits:
        one.context.close()
    assert not troubles


@pytest.fixture
def open_design(visit: Callable[..., Visit]) -> Callable[..., Page]:
    """`open_design(design, color_scheme="dark")`: a page of a fresh context on that design."""
    return lambda design, **options: visit(**options).open(design=design)


def design_fragment(design: dict[str, Any]) -> str:
    """The fragment that carries a design: raw deflate (RFC 1951) in base64url without padding (RFC 4648)."""
    packer = zlib.compressobj(9, zlib.DEFLATED, -15)
    packed = packer.compress(json.dumps(design).encode()) + packer.flush()
    return "design=" + base64.urlsafe_b64encode(packed).decode().rstrip("=")


@pytest.fixture
def bench_design() -> dict[str, Any]:
    """Three cases, two awake stages and one resting; one requirement is missed.

    By hand: 60/(s(s+2)) with unity gain and a lead crosses near 10 rad/s; 80° of phase margin cannot be had there.
    """
    return {
        "format": "loopwright-design/1",
        "title": "Gantry arm",
        "signals": {"output": {"name": "arm angle", "unit": "rad"}, "effort": {"name": "drive", "unit": "V"}},
        "plant_cases": [
            {"name": "empty", "model": {"kind": "factored", "gain": 60, "poles": [0, -2]}},
            {"name": "loaded", "model": {"kind": "expression", "text": "45/(s*(s+1.5))"}},
            {"name": "worn belt", "model": {"kind": "polynomial", "numerator": [50], "denominator": [1, 2, 0]}},
        ],
        "compensator": {
            "gain": 1.5,
            "stages": [
                {"kind": "lead_lag", "zero_rad_s": 4.0, "pole_rad_s": 60.0},
                {"kind": "proportional_integral", "corner_rad_s": 0.3, "name": "hold"},
                {"kind": "notch", "centre_rad_s": 180.0, "zero_damping": 0.05, "pole_damping": 0.5, "enabled": False},
            ],
        },
        "requirements": [
            {"measure": "phase_margin_deg", "at_least": 80, "reason": "asked for by the line's builder"},
            {"measure": "crossover_rad_s", "at_least": 2, "at_most": 60},
            {"measure": "peak_sensitivity", "at_most": 2.0, "rank": "should"},
            {"measure": "loop_gain_db", "at_most": -10, "over_rad_s": [150, 400]},
        ],
    }
