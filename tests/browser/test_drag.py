"""Taking hold of corners, dampings, notches, gain and crossover with a pointer."""

from __future__ import annotations

import math
import re
from collections.abc import Callable
from typing import Any

import pytest
from playwright.sync_api import Page, expect

from tests.browser.hands import (
    has_value,
    marker,
    middle,
    nominal_path,
    pace,
    pull,
    px_per_decade,
    rail_handle,
    settled,
    take,
    value,
)
from tests.browser.saved import row, saved_design

Open = Callable[..., Page]


@pytest.fixture
def shapes_design(bench_design: dict[str, Any]) -> dict[str, Any]:
    """With something of every kind to hold."""
    bench_design["compensator"]["stages"] = [
        {"kind": "lead_lag", "zero_rad_s": 4.0, "pole_rad_s": 60.0},
        {"kind": "complex_poles", "natural_rad_s": 300.0, "damping": 0.5},
        {"kind": "notch", "centre_rad_s": 25.0, "zero_damping": 0.1, "pole_damping": 0.4},
        {"kind": "integrator", "enabled": False},
        {"kind": "rational", "zeros": [[-3, 4], [-3, -4]], "poles": [-5, -5], "gain": 1.0, "enabled": False},
    ]
    return bench_design


def test_a_drag_moves_readings_while_held_and_is_one_step(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    zero = marker(page, "lead zero")
    told = row(page, 0).locator(".requirement-worst")
    before = told.inner_text()
    x, y = take(page, zero)
    page.mouse.move(x - 60, y, steps=10)
    expect(told).not_to_have_text(before)
    page.wait_for_timeout(150)
    held = value(zero)
    assert held < 4.0
    expect(page.locator("#charts .stage")).to_have_class(re.compile("is-held"))
    expect(page.locator("canvas.live-curves").first).to_be_visible()
    flag = page.locator(".flag")
    expect(flag).to_contain_text("lead zero")
    expect(flag).to_contain_text("phase margin")
    page.mouse.up()
    settled(page)
    assert saved_design(page)["compensator"]["stages"][0]["zero_rad_s"] == pytest.approx(held, rel=1e-5)
    page.keyboard.press("Control+z")
    expect(told).to_have_text(before)
    assert saved_design(page) == bench_design
    page.keyboard.press("Control+Shift+z")
    expect(told).not_to_have_text(before)
    assert saved_design(page)["compensator"]["stages"][0]["zero_rad_s"] == pytest.approx(held, rel=1e-5)


def test_the_marker_stays_under_the_pointer(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    pole = marker(page, "lead pole")
    x, y = take(page, pole)
    page.mouse.move(x + 50, y, steps=5)
    page.wait_for_timeout(250)
    assert middle(pole)[0] == pytest.approx(x + 50, abs=1.5)
    page.mouse.up()


def test_escape_puts_back(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    zero = marker(page, "lead zero")
    x, y = take(page, zero)
    page.mouse.move(x + 80, y, steps=6)
    page.keyboard.press("Escape")
    # The hand is still closed; what it does now moves nothing.
    page.mouse.move(x + 120, y, steps=3)
    page.mouse.up()
    has_value(zero, 4.0)
    assert saved_design(page) == bench_design
    expect(page.get_by_role("button", name=re.compile("^undo"))).to_be_disabled()


def test_a_click_without_a_move_is_no_step(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    take(page, marker(page, "lead zero"))
    page.mouse.up()
    expect(page.get_by_role("button", name=re.compile("^undo"))).to_be_disabled()


def test_shift_makes_fine_moves(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    zero = marker(page, "lead zero")
    per_decade = px_per_decade(page, zero)
    x, y = take(page, zero)
    page.keyboard.down("Shift")
    page.mouse.move(x + 60, y, steps=6)
    page.keyboard.up("Shift")
    page.mouse.up()
    settled(page)
    assert math.log10(value(zero) / 4.0) * per_decade == pytest.approx(6, abs=0.2)


def test_the_bar_keeps_the_ratio(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    pull(page, marker(page, "lead, both corners"), -70)
    lead = saved_design(page)["compensator"]["stages"][0]
    assert lead["zero_rad_s"] < 4.0
    assert lead["pole_rad_s"] / lead["zero_rad_s"] == pytest.approx(15.0, rel=1e-5)


def test_rail_and_marker_move_together(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    pull(page, rail_handle(page, "lead zero"), 45)
    settled(page)
    assert value(marker(page, "lead zero")) == value(rail_handle(page, "lead zero")) > 4.0
    assert middle(marker(page, "lead zero"))[0] == pytest.approx(middle(rail_handle(page, "lead zero"))[0], abs=1)


def test_the_gain_lane_sets_the_gain_and_keeps_its_sign(open_design: Open, bench_design: dict[str, Any]) -> None:
    bench_design["compensator"]["gain"] = -1.5
    for case in bench_design["plant_cases"]:
        case["model"] = {"kind": "factored", "gain": -60, "poles": [0, -2]}
    page = open_design(bench_design)
    pull(page, marker(page, "gain"), 30)
    assert saved_design(page)["compensator"]["gain"] < -1.5


def test_the_crossover_grip_lets_the_gain_follow(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    grip = marker(page, "crossover, by the gain")
    per_decade = px_per_decade(page, grip)
    before = value(grip)
    pull(page, grip, 50, steps=20)
    settled(page)
    wanted = before * 10 ** (50 / per_decade)
    # The last move is answered after the hand has opened: then the gain and the crossover agree with it.
    expect(grip).not_to_have_attribute("aria-valuenow", str(before))
    assert value(grip) == pytest.approx(wanted, rel=2e-3)
    design = saved_design(page)
    told = page.request.post("/api/assessment", data=design).json()
    assert told["cases"][0]["gain_crossovers"][0]["rad_s"] == pytest.approx(value(grip), rel=1e-5)
    page.keyboard.press("Control+z")
    settled(page)
    assert saved_design(page) == bench_design


def test_damping_width_and_depth_have_handles_of_their_own(open_design: Open, shapes_design: dict[str, Any]) -> None:
    page = open_design(shapes_design)
    pull(page, marker(page, "pair of poles damping"), 0, -12)
    pull(page, marker(page, "notch width as pole damping, right arm"), 20)
    pull(page, marker(page, "notch depth"), 0, 15)
    _, pair, notch, *_ = saved_design(page)["compensator"]["stages"]
    assert pair["damping"] > 0.5
    assert notch["pole_damping"] > 0.4
    # The depth is the ratio of the dampings: wider kept it, deeper lowered it below 1:4.
    assert notch["zero_damping"] / notch["pole_damping"] < 0.249
    assert notch["centre_rad_s"] == 25.0


def test_a_handle_is_at_least_24_px_wide(open_design: Open, shapes_design: dict[str, Any]) -> None:
    # WCAG 2.2, 2.5.8 Target Size (Minimum): 24 by 24 CSS px.
    page = open_design(shapes_design)
    for one in page.locator("#charts .handle:not(.bar-handle)").all():
        box = one.bounding_box()
        assert box
        assert min(box["width"], box["height"]) >= 24, one.get_attribute("aria-label")


def test_the_settled_drawing_is_the_last_state(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    zero = marker(page, "lead zero")
    x, y = take(page, zero)
    # As fast as the browser takes it: most of these moves overtake one another.
    for step in range(120):
        page.mouse.move(x - step, y)
    page.mouse.up()
    settled(page)
    after_drag = nominal_path(page)
    told = row(page, 0).locator(".requirement-worst").inner_text()
    measured = pace(page)
    assert measured["unpainted"] == 0
    assert measured["moves"] > 0
    page.reload()
    page.locator("#ledger[data-verdict]:not([data-verdict=''])").wait_for()
    settled(page)
    expect(row(page, 0).locator(".requirement-worst")).to_have_text(told)
    page.keyboard.press("Control+z")
    settled(page)
    assert nominal_path(page) != after_drag
    page.keyboard.press("Control+Shift+z")
    settled(page)
    assert len(nominal_path(page)) > 100


def test_axes_stand_still_while_held(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    labels = page.locator("#charts .figure .ytick text, #responses .figure .ytick text")
    before = labels.all_text_contents()
    assert len(before) > 10
    x, y = take(page, marker(page, "gain"))
    page.mouse.move(x + 120, y, steps=8)
    page.wait_for_timeout(150)
    assert labels.all_text_contents() == before
    page.mouse.up()


def test_touch_moves_a_marker(visit: Callable[..., Any], bench_design: dict[str, Any]) -> None:
    page = visit(has_touch=True).open(design=bench_design)
    zero = marker(page, "lead zero")
    x, y = middle(zero)
    touch = page.context.new_cdp_session(page)

    def send(kind: str, at: float) -> None:
        points = [] if kind == "touchEnd" else [{"x": at, "y": y}]
        touch.send("Input.dispatchTouchEvent", {"type": kind, "touchPoints": points})

    send("touchStart", x)
    for step in range(1, 9):
        send("touchMove", x + 6 * step)
    send("touchEnd", x + 48)
    settled(page)
    assert value(zero) > 4.5


def test_resting_and_fixed_stages_are_shown_but_not_on_the_curve(
    open_design: Open, shapes_design: dict[str, Any]
) -> None:
    page = open_design(shapes_design)
    lanes = page.locator("#charts .lane-group")
    expect(lanes).to_have_count(6)
    expect(page.locator("#charts .lane-group.is-resting")).to_have_count(2)
    expect(page.locator("#charts .marker")).to_have_count(4)
    expect(page.locator("#charts .fixed")).to_have_count(3)
