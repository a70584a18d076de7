"""The live path and the work in progress: a server that goes away, a reload, two tabs, links, many moves."""

from __future__ import annotations

import json
import re
from collections.abc import Callable
from typing import Any

from playwright.sync_api import expect

from tests.browser.conftest import Visit
from tests.browser.hands import has_value, marker, pace, pull, settled, take
from tests.browser.saved import row, saved_design
from tests.workbench_process import WorkbenchProcess

Begin = Callable[..., Visit]


def test_first_visit_opens_a_demo_that_is_not_yet_met(visit: Begin) -> None:
    page = visit().open()
    landing = next(demo for demo in page.request.get("/api/demos").json() if demo["landing"])
    expect(page.get_by_label("title of the design")).to_have_value(landing["title"])
    expect(page.locator("#ledger")).to_have_attribute("data-verdict", "not met")


def test_one_drag_of_one_marker_meets_the_landing_demo(visit: Begin) -> None:
    page = visit().open()
    zero = marker(page, "lead zero")
    x, y = take(page, zero)
    for step in range(1, 60):
        page.mouse.move(x - 2 * step, y)
        page.wait_for_timeout(30)
        if page.locator("#ledger").get_attribute("data-verdict") == "met":
            break
    page.mouse.up()
    settled(page)
    expect(page.locator("#ledger")).to_have_attribute("data-verdict", "met")


def test_a_server_that_goes_away_and_comes_back(
    visit: Begin, launch_workbench: Callable[..., WorkbenchProcess], bench_design: dict[str, Any]
) -> None:
    server = launch_workbench()
    here = visit(server.url)
    page = here.open(design=bench_design)
    server.kill()
    status = page.get_by_role("status").filter(has_text="The server does not answer")
    expect(status).to_be_visible()
    # Work goes on: moves, exact numbers and undo need no server.
    zero = marker(page, "lead zero")
    pull(page, zero, -50)
    moved = saved_design(page)["compensator"]["stages"][0]["zero_rad_s"]
    assert moved < 4.0
    has_value(zero, moved)
    told = row(page, 0).locator(".requirement-worst").inner_text()
    server.start_again()
    expect(page.get_by_role("status").filter(has_text="The server is back")).to_be_visible()
    settled(page)
    expect(row(page, 0).locator(".requirement-worst")).not_to_have_text(told)
    has_value(zero, moved)
    # The browser itself logs each attempt to connect; nothing else may have gone wrong.
    assert all("WebSocket connection to" in trouble for trouble in here.troubles), here.troubles
    here.troubles.clear()


def test_the_work_survives_a_reload_with_its_history(visit: Begin, bench_design: dict[str, Any]) -> None:
    page = visit().open(design=bench_design)
    pull(page, marker(page, "lead zero"), -40)
    settled(page)
    pull(page, marker(page, "lead pole"), 30)
    settled(page)
    before = saved_design(page)
    page.get_by_role("button", name="pin", exact=True).click()
    page.reload()
    page.locator("#ledger[data-verdict]:not([data-verdict=''])").wait_for()
    settled(page)
    assert saved_design(page) == before
    expect(page.get_by_role("button", name="pinned", exact=True)).to_have_attribute("aria-pressed", "true")
    expect(page.locator('#charts .figure [class*="tracepinned"]')).not_to_have_count(0)
    page.keyboard.press("Control+z")
    page.keyboard.press("Control+z")
    assert saved_design(page) == bench_design


def test_a_reload_in_mid_drag_goes_back_to_before_it(visit: Begin, bench_design: dict[str, Any]) -> None:
    page = visit().open(design=bench_design)
    x, y = take(page, marker(page, "lead zero"))
    page.mouse.move(x - 60, y, steps=5)
    page.reload()
    page.locator("#ledger[data-verdict]:not([data-verdict=''])").wait_for()
    assert saved_design(page) == bench_design


def test_a_closed_tab_loses_nothing(visit: Begin) -> None:
    here = visit()
    page = here.open()
    pull(page, marker(page, "lead zero"), -40)
    settled(page)
    before = saved_design(page)
    page.close()
    again = here.open()
    assert saved_design(again) == before


def test_two_tabs_do_not_overwrite_each_other(visit: Begin) -> None:
    here = visit()
    first = here.open()
    pull(first, marker(first, "lead zero"), -40)
    settled(first)
    one = saved_design(first)
    second = here.open()
    landing = saved_design(second)
    assert landing != one
    pull(second, marker(second, "lead pole"), 40)
    settled(second)
    two = saved_design(second)
    for page, want in ((first, one), (second, two)):
        page.reload()
        page.locator("#ledger[data-verdict]:not([data-verdict=''])").wait_for()
        assert saved_design(page) == want


def test_a_link_that_leads_nowhere_says_so_and_opens_the_demo(visit: Begin) -> None:
    page = visit().open("/d/no-such-design-here")
    expect(page.get_by_role("status").filter(has_text="leads to no design")).to_be_visible()


def test_a_cut_off_fragment_says_so(visit: Begin) -> None:
    page = visit().open("/#design=bVPbktowDP0V")
    expect(page.get_by_role("status").filter(has_text="cut off")).to_be_visible()


def test_a_reload_on_a_link_keeps_the_work_and_not_the_original(visit: Begin, bench_design: dict[str, Any]) -> None:
    here = visit()
    page = here.context.new_page()
    made = page.request.post(f"{here.url}/api/designs", data=bench_design).json()
    page.close()
    page = here.open(f"/d/{made['token']}")
    assert saved_design(page) == bench_design
    pull(page, marker(page, "lead zero"), -40)
    settled(page)
    changed = saved_design(page)
    page.reload()
    page.locator("#ledger[data-verdict]:not([data-verdict=''])").wait_for()
    assert saved_design(page) == changed
    shared = page.request.get(f"/api/designs/{made['token']}").json()["design"]
    assert shared["compensator"] == bench_design["compensator"]


def test_a_refused_design_says_where_and_keeps_the_last_curves(visit: Begin, bench_design: dict[str, Any]) -> None:
    here = visit()
    page = here.open(design=bench_design)
    shown = page.locator('#charts .figure [class*="tracenominal-0"] path.js-line').get_attribute("d")
    bad = json.loads(json.dumps(bench_design))
    bad["compensator"]["stages"][0]["pole_rad_s"] = -3
    page.evaluate(
        """async (design) => {
            const { encodeFragment } = await import("/static/app/fragment.js");
            location.hash = await encodeFragment(design);
        }""",
        bad,
    )
    page.reload()
    expect(page.get_by_role("status").filter(has_text="pole_rad_s")).to_be_visible()
    assert shown


def test_never_more_than_one_request_is_on_its_way(visit: Begin, bench_design: dict[str, Any]) -> None:
    page = visit().open(design=bench_design)
    open_requests: list[int] = []
    most: list[int] = [0]
    page.evaluate("() => 0")

    def watch(socket: Any) -> None:
        def sent(_frame: Any) -> None:
            open_requests.append(1)
            most[0] = max(most[0], len(open_requests))

        socket.on("framesent", sent)
        socket.on("framereceived", lambda _frame: open_requests.pop())

    page.on("websocket", watch)
    page.reload()
    page.locator("#ledger[data-verdict]:not([data-verdict=''])").wait_for()
    x, y = take(page, marker(page, "lead zero"))
    for step in range(60):
        page.mouse.move(x - step, y)
    page.mouse.up()
    settled(page)
    assert most[0] == 1
    assert not open_requests


def test_the_page_measures_its_own_pace(visit: Begin, bench_design: dict[str, Any]) -> None:
    page = visit().open(design=bench_design)
    x, y = take(page, marker(page, "lead zero"))
    for step in range(40):
        page.mouse.move(x - step, y)
        page.wait_for_timeout(16)
    page.mouse.up()
    settled(page)
    read_out = pace(page)
    assert read_out["unpainted"] == 0
    assert 0 < read_out["paints"] <= read_out["moves"] <= 40
    assert read_out["superseded"] == read_out["moves"] - read_out["paints"]
    assert 0 < read_out["p50_ms"] <= read_out["p95_ms"] <= read_out["worst_ms"]


def test_undo_and_redo_are_named(visit: Begin, bench_design: dict[str, Any]) -> None:
    page = visit().open(design=bench_design)
    pull(page, marker(page, "lead zero"), -40)
    undo = page.get_by_role("button", name="undo: move lead zero")
    expect(undo).to_be_enabled()
    undo.click()
    expect(page.get_by_role("button", name="redo: move lead zero")).to_be_enabled()
    expect(page.get_by_role("button", name=re.compile("^undo"))).to_be_disabled()
    assert saved_design(page) == bench_design
