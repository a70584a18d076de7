"""What is drawn and where: axes, curves, marks, labels, zoom, units, both grounds, narrow screens."""

from __future__ import annotations

import itertools
import math
import re
from collections.abc import Callable
from typing import Any

import pytest
from playwright.sync_api import Locator, Page, expect

from tests.browser.hands import marker, middle, settled, take
from tests.browser.saved import row, saved_design

Open = Callable[..., Page]


def _ticks(page: Page) -> list[str]:
    return sorted(page.locator("#charts .rail .tick:not(.unit)").all_text_contents(), key=_number)


def _number(text: str) -> float:
    return float(text.replace("−", "-"))


def _nominal_points(page: Page, index: int = 0) -> list[tuple[float, float]]:
    """Plotly's nominal curve in px of the page."""
    return page.evaluate(
        """(index) => {
            const path = document.querySelector(`#charts .figure [class*="tracenominal-${index}"] path.js-line`);
            const box = path.getScreenCTM();
            return [...path.getAttribute("d").matchAll(/(-?[\\d.]+),(-?[\\d.]+)/g)]
                .map(([, x, y]) => [Number(x) + box.e, Number(y) + box.f]);
        }""",
        index,
    )


def test_markers_stand_on_the_curve_that_plotly_draws(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    settled(page)
    points = _nominal_points(page)
    for name in ("lead zero", "lead pole"):
        x, y = middle(marker(page, name))
        left, right = next((a, b) for a, b in itertools.pairwise(points) if a[0] <= x <= b[0])
        on_curve = left[1] + (right[1] - left[1]) * (x - left[0]) / (right[0] - left[0])
        assert y == pytest.approx(on_curve, abs=1.5), name


def test_the_grip_stands_where_the_curve_crosses_0_db(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    settled(page)
    x, y = middle(marker(page, "crossover, by the gain"))
    points = _nominal_points(page)
    crossing = next(a for a, b in itertools.pairwise(points) if a[1] <= y < b[1])
    assert x == pytest.approx(crossing[0], abs=3)


def test_the_grip_leaves_where_there_is_no_single_crossover(open_design: Open, bench_design: dict[str, Any]) -> None:
    bench_design["compensator"]["gain"] = 1e-9
    bench_design["plant_cases"] = [{"name": "lag", "model": {"kind": "factored", "gain": 2, "poles": [-1]}}]
    bench_design["compensator"]["stages"] = []
    page = open_design(bench_design)
    expect(marker(page, "crossover, by the gain")).to_be_hidden()
    expect(marker(page, "gain")).to_be_visible()


def test_hz_is_shown_everywhere_and_stored_nowhere(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    rad_s = marker(page, "lead pole").get_attribute("aria-valuetext")
    page.get_by_role("button", name="frequencies in Hz").click()
    expect(marker(page, "lead pole")).to_have_attribute("aria-valuetext", "9.55 Hz")
    expect(page.locator("#charts .rail .tick.unit")).to_have_text("Hz")
    expect(page.locator("#charts .label-text").first).to_contain_text("Hz")
    assert saved_design(page) == bench_design
    page.reload()
    expect(page.locator("#charts .rail .tick.unit")).to_have_text("Hz")
    page.get_by_role("button", name="frequencies in rad/s").click()
    expect(marker(page, "lead pole")).to_have_attribute("aria-valuetext", rad_s or "")


def test_the_wheel_zooms_about_the_pointer_and_words_undo_it(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    before = _ticks(page)
    zero = middle(marker(page, "lead zero"))
    expect(page.get_by_role("button", name="fit: show all frequencies again")).to_be_hidden()
    page.mouse.move(zero[0], zero[1] + 60)
    page.mouse.wheel(0, -300)
    expect(page.get_by_role("button", name="fit: show all frequencies again")).to_be_visible()
    settled(page)
    assert _ticks(page) != before
    assert middle(marker(page, "lead zero"))[0] == pytest.approx(zero[0], abs=1)
    page.get_by_role("button", name="back to the frequencies shown before").click()
    settled(page)
    assert _ticks(page) == before


def test_the_time_axis_zooms_too(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    ticks = page.locator("#responses .figure .xtick text")
    before = ticks.all_text_contents()
    box = page.locator("#responses .surface").bounding_box()
    assert box
    page.mouse.move(box["x"] + 5, box["y"] + 40)
    page.mouse.wheel(0, -400)
    fit = page.get_by_role("button", name="fit: show all times again")
    expect(fit).to_be_visible()
    settled(page)
    assert ticks.all_text_contents() != before
    fit.click()
    settled(page)
    assert ticks.all_text_contents() == before


def test_a_box_zooms_into_it(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    before = _ticks(page)
    box = page.locator("#charts .surface").bounding_box()
    assert box
    y = box["y"] + box["height"] * 0.9
    page.mouse.move(box["x"] + box["width"] * 0.3, y)
    page.mouse.down()
    page.mouse.move(box["x"] + box["width"] * 0.6, y, steps=4)
    expect(page.locator("#charts .zoom-box")).to_be_visible()
    page.mouse.up()
    expect(page.locator("#charts .zoom-box")).to_be_hidden()
    settled(page)
    shown = [_number(tick) for tick in _ticks(page)]
    all_of_it = [_number(tick) for tick in before]
    assert math.log(shown[-1] / shown[0]) < 0.6 * math.log(all_of_it[-1] / all_of_it[0])
    page.get_by_role("button", name="fit: show all frequencies again").click()
    settled(page)
    assert _ticks(page) == before


def test_the_curves_are_read_under_the_pointer(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    box = page.locator("#charts .surface").bounding_box()
    assert box
    page.mouse.move(box["x"] + box["width"] * 0.35, box["y"] + box["height"] * 0.95)
    flag = page.locator("#charts .reading-flag")
    expect(flag).to_be_visible()
    expect(flag).to_contain_text("empty")
    expect(flag).to_contain_text("dB")
    page.mouse.move(10, 10)
    expect(flag).to_be_hidden()


def test_readings_are_marked_where_they_are_read(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    told = page.request.post("/api/assessment", data=bench_design).json()["requirements"][0]
    label = page.locator("#charts .mark-label", has_text="phase margin")
    expect(label).to_contain_text(f"{told['reading']['value']:.1f}°")
    expect(label).to_have_class(re.compile("short"))
    row(page, 2).hover()
    expect(page.locator("#charts .mark-label", has_text="peak sensitivity")).to_be_visible()
    label.hover()
    expect(row(page, 0)).to_contain_class("is-focused")


def test_labels_cover_neither_one_another_nor_a_handle(visit: Callable[..., Any]) -> None:
    here = visit()
    names = [demo["name"] for demo in here.open().request.get("/api/demos").json()]
    for name in names:
        page = here.context.new_page()
        design = page.request.get(f"{here.url}/api/demos/{name}").json()
        page.close()
        page = here.open(design=design.get("design", design))
        settled(page)
        labels = _boxes(page.locator("#charts .mark-label .label-ground"))
        handles = _boxes(page.locator("#charts .marker .glyph, #charts .crossover-grip .grip-disc"))
        for one, other in itertools.combinations(labels, 2):
            assert _overlap(one, other) < 4, f"{name}: two labels"
        for one, other in itertools.product(labels, handles):
            assert _overlap(one, other) < 60, f"{name}: a label on a handle"
        page.close()


def _boxes(those: Locator) -> list[dict[str, float]]:
    return [box for one in those.all() if (box := one.bounding_box())]


def _overlap(one: dict[str, float], other: dict[str, float]) -> float:
    wide = min(one["x"] + one["width"], other["x"] + other["width"]) - max(one["x"], other["x"])
    high = min(one["y"] + one["height"], other["y"] + other["height"]) - max(one["y"], other["y"])
    return max(0.0, wide) * max(0.0, high)


def test_an_unstable_loop_is_called_so_on_the_plots(open_design: Open, bench_design: dict[str, Any]) -> None:
    bench_design["compensator"] = {"gain": 200.0, "stages": [{"kind": "real_pole", "corner_rad_s": 1.0}]}
    page = open_design(bench_design)
    for root in ("#charts", "#responses"):
        expect(page.locator(f"{root} .unstable")).to_contain_text("unstable on every case")


def test_signals_and_units_stand_on_the_responses(open_design: Open, bench_design: dict[str, Any]) -> None:
    bench_design["actuator"] = {"low": -24, "high": 24}
    page = open_design(bench_design)
    titles = page.locator("#responses .response-title")
    expect(titles.nth(0)).to_contain_text("rad")
    expect(titles.nth(1)).to_contain_text("step of 1 V")
    expect(titles.nth(2)).to_contain_text("limits −24 and 24")
    page.get_by_role("button", name="command: ramp", exact=True).click()
    settled(page)
    assert saved_design(page)["scenario"]["command"]["shape"] == "ramp"
    expect(page.get_by_role("button", name="command: ramp", exact=True)).to_have_attribute("aria-pressed", "true")


def test_pin_keeps_a_reference_on_every_chart(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    page.get_by_role("button", name="pin", exact=True).click()
    expect(page.locator('#charts .figure [class*="tracepinned"]')).to_have_count(2)
    expect(page.locator('#responses .figure [class*="tracepinned"]')).to_have_count(3)
    expect(page.locator("#charts .curve-key")).to_contain_text("pinned")
    page.get_by_role("button", name="pinned", exact=True).click()
    expect(page.locator('.figure [class*="tracepinned"]')).to_have_count(0)


def test_plotlys_own_look_is_off(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    expect(page.locator(".modebar-btn")).to_have_count(0)
    box = page.locator("#charts .surface").bounding_box()
    assert box
    page.mouse.move(box["x"] + 200, box["y"] + box["height"] - 8)
    expect(page.locator(".hoverlayer .hovertext")).to_have_count(0)


@pytest.mark.parametrize("ground", ["light", "dark"])
def test_text_and_outlines_have_contrast_on_the_ground(
    open_design: Open, bench_design: dict[str, Any], ground: str
) -> None:
    # WCAG 2.2: 1.4.3 (text 4.5:1) and 1.4.11 (outlines and curves 3:1).
    page = open_design(bench_design, color_scheme=ground)
    token = _tokens(page)
    for text in ("ink", "soft", "corner", "room-text", "short-text", "loop", "worst"):
        for under in ("paper", "sheet"):
            assert _contrast(token[text], token[under]) >= 4.5, f"{text} on {under}"
    for text in ("ink", "soft"):
        assert _contrast(token[text], token["well"]) >= 4.5, f"{text} on well"
    assert _contrast(token["flag-ink"], token["flag-ground"]) >= 4.5
    assert _contrast(token["flag-soft"], token["flag-ground"]) >= 4.5
    assert _contrast(token["strong-ink"], token["strong"]) >= 4.5
    for line in ("outline", "corner", "loop", "worst", "pinned", "ghost", "room", "short", "focus"):
        assert _contrast(token[line], token["paper"]) >= 3, line
    assert _contrast(token["corner"], token["well"]) >= 3
    assert _contrast(token["outline"], token["sheet"]) >= 3


def _tokens(page: Page) -> dict[str, str]:
    names = [
        "paper",
        "sheet",
        "well",
        "ink",
        "soft",
        "outline",
        "loop",
        "worst",
        "pinned",
        "ghost",
        "corner",
        "room",
        "room-text",
        "short",
        "short-text",
        "focus",
        "flag-ground",
        "flag-ink",
        "flag-soft",
        "strong",
        "strong-ink",
    ]
    return page.evaluate(
        """(names) => {
            const style = getComputedStyle(document.documentElement);
            return Object.fromEntries(names.map((name) => [name, style.getPropertyValue(`--${name}`).trim()]));
        }""",
        names,
    )


def _contrast(one: str, other: str) -> float:
    # WCAG 2.2, definitions of contrast ratio and relative luminance.
    def luminance(colour: str) -> float:
        parts = [int(colour[at : at + 2], 16) / 255 for at in (1, 3, 5)]
        linear = [part / 12.92 if part <= 0.04045 else ((part + 0.055) / 1.055) ** 2.4 for part in parts]
        return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]

    light, dark = sorted((luminance(one), luminance(other)), reverse=True)
    return (light + 0.05) / (dark + 0.05)


def test_the_ground_follows_the_system_until_chosen(visit: Callable[..., Any], bench_design: dict[str, Any]) -> None:
    page = visit(color_scheme="light").open(design=bench_design)
    expect(page.locator("html")).to_have_attribute("data-theme", "light")
    page.emulate_media(color_scheme="dark")
    expect(page.locator("html")).to_have_attribute("data-theme", "dark")
    page.get_by_role("button", name="light ground").click()
    expect(page.locator("html")).to_have_attribute("data-theme", "light")
    page.reload()
    expect(page.locator("html")).to_have_attribute("data-theme", "light")


@pytest.mark.parametrize("size", [(1280, 800), (1920, 1080), (900, 1000), (420, 900)])
def test_nothing_runs_off_the_side(
    visit: Callable[..., Any], bench_design: dict[str, Any], size: tuple[int, int]
) -> None:
    page = visit(viewport={"width": size[0], "height": size[1]}).open(design=bench_design)
    settled(page)
    assert page.evaluate("() => document.documentElement.scrollWidth") <= size[0]
    if size[0] >= 1280:
        # One screen holds it all; the drawer and the ledger scroll in themselves.
        assert page.evaluate("() => document.documentElement.scrollHeight") <= size[1]
    for root in ("#charts", "#responses"):
        beyond = page.evaluate(
            "(root) => [root].map((it) => it.scrollWidth - it.clientWidth)[0]", page.query_selector(root)
        )
        assert beyond <= 0, root


def test_a_long_rail_is_all_there(open_design: Open, bench_design: dict[str, Any]) -> None:
    bench_design["compensator"]["stages"] = [
        {"kind": "real_pole", "corner_rad_s": 500.0 + 40 * index, "name": f"filter {index + 1}"} for index in range(9)
    ]
    page = open_design(bench_design)
    expect(page.locator("#charts .lane-group")).to_have_count(10)
    last = marker(page, "filter 9")
    last.focus()
    page.keyboard.press("ArrowRight")
    settled(page)
    moved = saved_design(page)["compensator"]["stages"][8]["corner_rad_s"]
    assert moved == pytest.approx(820 * 10 ** (1 / 40), rel=1e-5)


def test_markers_that_would_cover_each_other_are_lifted_apart(open_design: Open, bench_design: dict[str, Any]) -> None:
    bench_design["compensator"]["stages"] = [
        {"kind": "real_zero", "corner_rad_s": 20.0, "name": "first"},
        {"kind": "real_pole", "corner_rad_s": 20.5, "name": "second"},
    ]
    page = open_design(bench_design)
    (x1, y1), (x2, y2) = middle(marker(page, "first")), middle(marker(page, "second"))
    assert math.hypot(x1 - x2, y1 - y2) >= 24


def test_reduced_motion_is_respected(visit: Callable[..., Any], bench_design: dict[str, Any]) -> None:
    page = visit(reduced_motion="reduce").open(design=bench_design)
    lasts = page.evaluate("() => getComputedStyle(document.querySelector('#status')).transitionDuration")
    assert set(lasts.split(", ")) == {"0s"}


def test_a_held_handle_flies_its_flag_clear_of_itself(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    x, y = take(page, marker(page, "lead pole"))
    page.mouse.move(x + 30, y, steps=4)
    flag = page.locator("#charts .flag .flag-ground").bounding_box()
    glyph = page.locator("#charts .marker.x .glyph").first.bounding_box()
    assert flag
    assert glyph
    assert _overlap(flag, glyph) == 0
    page.mouse.up()
