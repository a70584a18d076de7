"""The drawer: stages as sentences, the scenario, all readings now and as pinned."""

from __future__ import annotations

import re
from collections.abc import Callable
from typing import Any

import pytest
from playwright.sync_api import Page, expect

from tests.browser.saved import open_tab, row, saved_design, stage

Open = Callable[..., Page]


def test_stages_read_as_sentences_with_the_engines_figures(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    # By hand: ratio 15 gives asin(14/16) = 61.0° at √(4·60) = 15.5 rad/s and 20·log10 15 = 23.5 dB.
    expect(stage(page, 0)).to_contain_text(
        "lead from o4.00 to x60.0 rad/s gives +61.0° at 15.5 rad/s, and 23.5 dB more effort"
    )
    expect(stage(page, 1)).to_contain_text(
        re.compile(r"hold, proportional-integral below o0.300 rad/s, costs [\d.]+° at the")
    )
    # By hand: 20·log10(0.5/0.05) = 20 dB.
    expect(stage(page, 2)).to_contain_text("notch at 180 rad/s, damping 0.0500 over 0.500, 20.0 dB deep")
    expect(stage(page, 2)).to_contain_text("resting")
    expect(page.locator(".gain-row")).to_contain_text(re.compile(r"gain 1.50 gives crossover [\d.]+ to [\d.]+ rad/s"))


def test_a_number_in_a_sentence_is_typed_and_judged(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    zero = stage(page, 0).get_by_role("button", name="zero of lead, rad/s: 4.00, change")
    zero.click()
    page.keyboard.type("-3")
    page.keyboard.press("Enter")
    expect(stage(page, 0).get_by_role("alert")).to_have_text("must be greater than 0, is -3")
    page.keyboard.press("Control+a")
    page.keyboard.type("20")
    page.keyboard.press("Enter")
    expect(stage(page, 0)).to_contain_text("gives +30.0° at 34.6 rad/s")  # by hand: ratio 3
    assert saved_design(page)["compensator"]["stages"][0]["zero_rad_s"] == 20
    stage(page, 0).get_by_role("button", name="zero of lead").click()
    page.keyboard.type("120")
    page.keyboard.press("Enter")
    expect(stage(page, 0)).to_contain_text("lag from x60.0 to o120 rad/s")
    page.keyboard.press("Control+z")
    page.keyboard.press("Control+z")
    expect(stage(page, 0)).to_contain_text("lead from o4.00")
    assert saved_design(page) == bench_design


def test_the_gain_is_typed(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    gain = page.get_by_role("button", name="gain of the compensator")
    gain.click()
    page.keyboard.type("0")
    page.keyboard.press("Enter")
    expect(page.locator(".gain-row").get_by_role("alert")).to_have_text("must not be 0")
    page.keyboard.press("Control+a")
    page.keyboard.type("2,5e0")
    page.keyboard.press("Enter")
    expect(page.locator(".gain-row")).to_contain_text("gain 2.50 gives crossover")
    assert saved_design(page)["compensator"]["gain"] == 2.5


def _kinds(page: Page) -> list[str]:
    return [one["kind"] for one in saved_design(page)["compensator"]["stages"]]


def test_stages_move_by_button_by_key_and_by_drag(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    stage(page, 0).get_by_role("button", name="move lead down").click()
    assert _kinds(page) == ["proportional_integral", "lead_lag", "notch"]
    stage(page, 1).get_by_role("button", name="move lead: drag").focus()
    page.keyboard.press("ArrowDown")
    assert _kinds(page) == ["proportional_integral", "notch", "lead_lag"]
    page.keyboard.press("ArrowUp")  # the grip kept the focus on its way
    assert _kinds(page) == ["proportional_integral", "lead_lag", "notch"]
    grip = stage(page, 2).get_by_role("button", name="move notch: drag").bounding_box()
    target = stage(page, 0).bounding_box()
    page.mouse.move(grip["x"] + 8, grip["y"] + 12)
    page.mouse.down()
    page.mouse.move(grip["x"] + 8, target["y"] + 4, steps=6)
    page.mouse.up()
    assert _kinds(page) == ["notch", "proportional_integral", "lead_lag"]
    for _ in range(4):
        page.keyboard.press("Control+z")
    assert _kinds(page) == ["lead_lag", "proportional_integral", "notch"]


def test_stages_rest_wake_copy_rename_and_go(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    before = row(page, 0).locator(".requirement-worst").inner_text()
    stage(page, 0).get_by_role("button", name="rest lead").click()
    expect(stage(page, 0)).to_contain_text("resting")
    expect(row(page, 0).locator(".requirement-worst")).not_to_have_text(before)
    stage(page, 0).get_by_role("button", name="wake lead").click()
    expect(row(page, 0).locator(".requirement-worst")).to_have_text(before)
    assert saved_design(page) == bench_design

    stage(page, 0).hover()
    stage(page, 0).get_by_role("button", name="rename lead").click()
    page.keyboard.type("arm damping")
    page.keyboard.press("Enter")
    expect(stage(page, 0)).to_contain_text("arm damping, lead from")
    stage(page, 0).get_by_role("button", name="copy arm damping").click()
    expect(page.locator("#drawer [data-stage]")).to_have_count(4)
    stage(page, 1).get_by_role("button", name="remove arm damping").click()
    expect(page.locator("#drawer [data-stage]")).to_have_count(3)
    page.keyboard.press("Control+z")
    expect(page.locator("#drawer [data-stage]")).to_have_count(4)


PURPOSES = ["add phase at the crossover", "hold against load", "quiet a resonance", "roll off noise", "a bare corner"]


def test_stages_are_added_by_purpose_with_the_reason_why(open_design: Open, bench_design: dict[str, Any]) -> None:
    bench_design["compensator"]["stages"] = []
    page = open_design(bench_design)
    expect(page.locator("#drawer .empty")).to_contain_text("plain gain")
    for count, words in enumerate(PURPOSES, start=1):
        page.get_by_role("button", name=words, exact=True).click()
        expect(page.locator("#drawer [data-stage]")).to_have_count(count)
        expect(page.locator(".stages-why")).to_have_text(re.compile(r"\w+"))
        expect(stage(page, count - 1).locator(":focus")).to_have_count(1)
    assert len(_kinds(page)) == 5
    expect(page.locator("#drawer .empty")).to_be_hidden()


BY_NUMBERS: list[tuple[str, dict[str, str], dict[str, Any]]] = [
    ("lead_lag", {"o zero, rad/s": "4", "x pole, rad/s": "40"}, {"zero_rad_s": 4, "pole_rad_s": 40}),
    ("proportional_integral", {"corner, rad/s": "0.3"}, {"corner_rad_s": 0.3}),
    ("integrator", {}, {}),
    ("real_zero", {"corner, rad/s": "20"}, {"corner_rad_s": 20}),
    ("real_pole", {"corner, rad/s": "2e3"}, {"corner_rad_s": 2000}),
    ("complex_zeros", {"natural frequency, rad/s": "90", "damping": "0.1"}, {"natural_rad_s": 90, "damping": 0.1}),
    ("complex_poles", {"natural frequency, rad/s": "900", "damping": "0.6"}, {"natural_rad_s": 900, "damping": 0.6}),
    (
        "notch",
        {"centre, rad/s": "180", "damping of the zeros, ζo": "0.05", "damping of the poles, ζx": "0.5"},
        {"centre_rad_s": 180, "zero_damping": 0.05, "pole_damping": 0.5},
    ),
    (
        "rational",
        {"gain": "1.25", "zeros": "-1 ± 2j", "poles": "−3, -40"},
        {"gain": 1.25, "zeros": [[-1, 2], [-1, -2]], "poles": [-3, -40]},
    ),
]


def test_every_kind_of_stage_is_entered_by_its_numbers(open_design: Open, bench_design: dict[str, Any]) -> None:
    bench_design["compensator"]["stages"] = []
    page = open_design(bench_design)
    dialog = page.get_by_role("dialog")
    for kind, typed, _ in BY_NUMBERS:
        page.get_by_role("button", name="a stage by its numbers").click()
        dialog.get_by_label("kind").select_option(kind)
        for label, text in typed.items():
            dialog.get_by_label(label, exact=True).fill(text)
        dialog.get_by_role("button", name="add stage").click()
        expect(dialog).to_be_hidden()
    assert saved_design(page)["compensator"]["stages"] == [{"kind": kind, **want} for kind, _, want in BY_NUMBERS]


def test_a_stage_that_cannot_be_is_refused_beside_its_number(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    stage(page, 2).hover()
    stage(page, 2).get_by_role("button", name="all numbers notch").click()
    dialog = page.get_by_role("dialog")
    field = dialog.get_by_label("damping of the poles, ζx")
    field.fill("0")
    dialog.get_by_role("button", name="keep").click()
    expect(field.locator("xpath=..").get_by_role("alert")).to_have_text("must be greater than 0, is 0")
    dialog.get_by_label("centre, rad/s").fill("18o")
    dialog.get_by_role("button", name="keep").click()
    centre = dialog.get_by_label("centre, rad/s").locator("xpath=..")
    expect(centre.get_by_role("alert")).to_contain_text("“18o” is not a number")
    page.keyboard.press("Escape")
    assert saved_design(page) == bench_design


def test_tabs_are_walked_by_arrow_keys(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    page.get_by_role("tab", name="stages").focus()
    for name in ("plant cases", "scenario", "now and pinned", "stages"):
        page.keyboard.press("ArrowRight")
        expect(page.get_by_role("tab", name=name)).to_be_focused()
        expect(page.get_by_role("tabpanel", name=name)).to_be_visible()
        expect(page.get_by_role("tabpanel")).to_have_count(1)


def test_all_readings_stand_in_one_table(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    told = page.request.post("/api/assessment", data=bench_design).json()
    panel = open_tab(page, "now and pinned")
    expect(panel.locator(".hint").first).to_contain_text("Nothing is pinned")
    expect(panel.locator("[data-cell]")).to_have_count(sum(len(one["readings"]) for one in told["cases"]))
    margin = panel.locator("[data-cell='phase_margin_deg-0']")
    margin.focus()
    expect(panel.locator(".reading-why")).to_contain_text(re.compile(r"phase margin, empty: [\d.]+°. At [\d.]+ rad/s"))
    expect(panel.get_by_role("row", name=re.compile("^closed-loop poles, rad"))).to_contain_text("−")
    crossings = panel.get_by_role("row", name=re.compile("^gain crossovers"))
    at = told["cases"][0]["gain_crossovers"][0]["rad_s"]
    assert float(crossings.locator("td").first.inner_text().split(":")[0]) == pytest.approx(at, rel=5e-4)

    page.get_by_role("button", name="pin", exact=True).click()
    expect(panel.locator("thead th")).to_have_count(7)
    was = panel.locator("[data-cell='phase_margin_deg-0-was']")
    expect(was).to_have_text(margin.inner_text())


def test_the_scenario_is_typed_in_place(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    panel = open_tab(page, "scenario")
    panel.get_by_label("shape").select_option("ramp")
    panel.get_by_label("amplitude").fill("0.2")
    panel.get_by_label("lowest effort").fill("24")
    panel.get_by_label("highest effort").fill("-24")
    page.keyboard.press("Tab")
    high = panel.get_by_label("highest effort")
    expect(high.locator("xpath=..").get_by_role("alert")).to_contain_text("must be greater than low")
    panel.get_by_label("lowest effort").fill("-24")
    page.keyboard.press("Tab")
    high.fill("24")
    panel.get_by_label("unit of the effort").fill("A")
    panel.get_by_label("notes").fill("two shifts a day")
    page.keyboard.press("Tab")
    page.get_by_role("button", name="undo: notes").wait_for()
    saved = saved_design(page)
    assert saved["scenario"] == {"command": {"shape": "ramp", "amplitude": 0.2}}
    assert saved["actuator"] == {"low": -24, "high": 24}
    assert saved["signals"]["effort"] == {"name": "drive", "unit": "A"}
    assert saved["notes"] == "two shifts a day"
