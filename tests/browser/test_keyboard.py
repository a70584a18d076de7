"""The same moves from the keyboard: steps, ends, Escape, an exact number."""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import Any

import pytest
from playwright.sync_api import Page, expect

from tests.browser.hands import has_value, marker, settled
from tests.browser.saved import row, saved_design

Open = Callable[..., Page]


def test_arrows_step_coarse_and_fine(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    zero = marker(page, "lead zero")
    zero.focus()
    page.keyboard.press("ArrowRight")
    has_value(zero, 4.0 * 10 ** (1 / 40))
    page.keyboard.press("ArrowDown")
    page.keyboard.press("Shift+ArrowUp")
    has_value(zero, 4.0 * 10 ** (1 / 400))
    page.keyboard.press("Shift+ArrowLeft")
    page.keyboard.press("PageUp")
    has_value(zero, 4.0 * 10 ** (1 / 4))
    expect(zero).to_have_attribute("aria-valuetext", "7.11 rad/s")


def test_home_and_end_go_to_what_is_shown(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    zero = marker(page, "lead zero")
    zero.focus()
    least, most = (float(zero.get_attribute(f"aria-value{end}") or "nan") for end in ("min", "max"))
    page.keyboard.press("Home")
    has_value(zero, least, 1e-4)
    page.keyboard.press("End")
    # Beyond its pole the stage is a lag, and is called so.
    has_value(marker(page, "lag zero"), most, 1e-4)
    page.keyboard.press("Escape")
    has_value(zero, 4.0)


def test_a_run_of_keys_is_one_step_of_the_history(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    zero = marker(page, "lead zero")
    zero.focus()
    for _ in range(5):
        page.keyboard.press("ArrowLeft")
    expect(page.locator("#charts .stage")).to_contain_class("is-held")
    settled(page)
    moved = saved_design(page)["compensator"]["stages"][0]["zero_rad_s"]
    assert moved == pytest.approx(4.0 * 10 ** (-5 / 40), rel=1e-5)
    page.keyboard.press("Control+z")
    assert saved_design(page) == bench_design


def test_escape_puts_keys_back(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    zero = marker(page, "lead zero")
    zero.focus()
    page.keyboard.press("ArrowLeft")
    page.keyboard.press("ArrowLeft")
    page.keyboard.press("Escape")
    has_value(zero, 4.0)
    assert saved_design(page) == bench_design


def test_enter_types_the_number_exactly(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    zero = marker(page, "lead zero")
    zero.focus()
    page.keyboard.press("Enter")
    field = page.locator(".typing input")
    expect(field).to_be_focused()
    expect(field).to_have_value("4")
    page.keyboard.type("3.1234567")
    page.keyboard.press("Enter")
    expect(page.locator(".typing")).to_have_count(0)
    expect(zero).to_be_focused()
    assert saved_design(page)["compensator"]["stages"][0]["zero_rad_s"] == 3.1234567


def test_a_typed_number_that_cannot_be_is_refused_beside_the_field(
    open_design: Open, bench_design: dict[str, Any]
) -> None:
    page = open_design(bench_design)
    marker(page, "lead zero").focus()
    page.keyboard.press("Enter")
    page.keyboard.type("-2")
    page.keyboard.press("Enter")
    expect(page.locator(".typing [role=alert]")).to_contain_text("must be greater than 0")
    page.keyboard.press("Escape")
    expect(page.locator(".typing")).to_have_count(0)
    assert saved_design(page) == bench_design


def test_a_frequency_is_typed_in_the_unit_shown(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    page.get_by_role("button", name="frequencies in Hz").click()
    zero = marker(page, "lead zero")
    expect(zero).to_have_attribute("aria-valuetext", "0.637 Hz")
    zero.focus()
    page.keyboard.press("Enter")
    page.keyboard.type("1")
    page.keyboard.press("Enter")
    assert saved_design(page)["compensator"]["stages"][0]["zero_rad_s"] == pytest.approx(2 * math.pi, rel=1e-12)


def test_the_gain_takes_a_typed_sign(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    marker(page, "gain").focus()
    page.keyboard.press("Enter")
    page.keyboard.type("-2.5")
    page.keyboard.press("Enter")
    assert saved_design(page)["compensator"]["gain"] == -2.5
    expect(row(page, 0)).to_contain_text("unstable")


def test_the_crossover_is_typed(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    grip = marker(page, "crossover, by the gain")
    grip.focus()
    page.keyboard.press("Enter")
    page.keyboard.type("12")
    page.keyboard.press("Enter")
    settled(page)
    expect(grip).to_have_attribute("aria-valuetext", "12.0 rad/s")
    told = page.request.post("/api/assessment", data=saved_design(page)).json()
    assert told["cases"][0]["gain_crossovers"][0]["rad_s"] == pytest.approx(12, rel=1e-9)


def test_every_handle_is_a_named_slider_with_its_value_in_words(
    open_design: Open, bench_design: dict[str, Any]
) -> None:
    page = open_design(bench_design)
    handles = page.locator("#charts .handle").all()
    assert len(handles) >= 8
    names = [one.get_attribute("aria-label") for one in handles]
    assert all(names)
    assert len(set(names)) == len(names)
    for one in handles:
        assert one.get_attribute("role") == "slider"
        assert one.get_attribute("tabindex") == "0"
        assert one.get_attribute("aria-valuetext")
        least, now, most = (float(one.get_attribute(f"aria-value{part}") or "nan") for part in ("min", "now", "max"))
        assert least <= now <= most


def test_the_title_is_a_field(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    title = page.get_by_label("title of the design")
    title.fill("Gantry arm, second build")
    page.keyboard.press("Enter")
    expect(page).to_have_title("Gantry arm, second build · Loopwright")
    assert saved_design(page)["title"] == "Gantry arm, second build"
