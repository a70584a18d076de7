"""The requirement ledger: what it says, and what can be changed where it stands."""

from __future__ import annotations

import re
from collections.abc import Callable
from typing import Any

import pytest
from playwright.sync_api import Page, expect

from tests.browser.saved import row, saved_design

Open = Callable[..., Page]


def _number(text: str) -> float:
    return float(re.search(r"[−-]?[\d.]+", text)[0].replace("−", "-"))


def test_rows_show_the_worst_value_its_case_and_the_verdict(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    told = page.request.post("/api/assessment", data=bench_design).json()
    for index, want in enumerate(told["requirements"]):
        here = row(page, index)
        expect(here.locator(".requirement-case")).to_have_text(want["case"])
        shown = _number(here.locator(".requirement-worst").inner_text())
        # Three significant digits are shown, so half a unit of the third is allowed.
        assert shown == pytest.approx(want["reading"]["value"], rel=5e-3)
        expect(here).to_have_attribute("data-standing", "met" if want["met"] else "not met")
    head, rest = told["headline"].rstrip(".").split(": ", 1)
    expect(page.locator("#ledger .verdict")).to_have_text(head)
    expect(page.locator("#ledger .verdict-rest")).to_have_text(re.compile(re.escape(rest[1:])))


def test_a_limit_is_typed_where_it_stands(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    limit = row(page, 0).get_by_role("button", name="at least: ≥ 80°")
    limit.click()
    page.keyboard.type("30")
    page.keyboard.press("Enter")
    expect(row(page, 0)).to_have_attribute("data-standing", "met")
    expect(page.locator("#ledger .verdict")).to_contain_text("All 4 requirements met")
    assert saved_design(page)["requirements"][0]["at_least"] == 30
    page.keyboard.press("Control+z")
    expect(row(page, 0)).to_have_attribute("data-standing", "not met")
    expect(limit).to_be_visible()


def test_escape_and_nonsense_leave_a_limit_alone(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    limit = row(page, 0).get_by_role("button", name="at least: ≥ 80°")
    limit.click()
    page.keyboard.type("abc")
    page.keyboard.press("Enter")
    expect(row(page, 0).get_by_role("alert")).to_contain_text("“abc” is not a number")
    page.keyboard.press("Escape")
    expect(limit).to_be_focused()
    assert saved_design(page) == bench_design


def test_the_servers_refusal_stands_beside_the_limit(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    row(page, 1).get_by_role("button", name="at most: ≤ 60 rad/s").click()
    page.keyboard.type("1")
    page.keyboard.press("Enter")
    expect(row(page, 1).get_by_role("alert")).to_contain_text("must be at least 2")
    page.keyboard.press("Escape")
    assert saved_design(page) == bench_design


def test_frequencies_are_shown_and_typed_in_the_unit_chosen(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    page.get_by_role("button", name="frequencies in Hz").click()
    row(page, 1).get_by_role("button", name="at most: ≤ 9.549 Hz").click()
    page.keyboard.type("10")
    page.keyboard.press("Enter")
    expect(row(page, 1).get_by_role("button", name="at most: ≤ 10 Hz")).to_be_visible()
    # By hand: 10 Hz is 20π rad/s.
    assert saved_design(page)["requirements"][1]["at_most"] == pytest.approx(62.83185307179586, rel=1e-12)


def test_a_requirement_is_found_by_typing_and_added(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    page.get_by_role("button", name="+ add a requirement").click()
    dialog = page.get_by_role("dialog")
    dialog.get_by_role("combobox", name="measure").fill("overshoot")
    page.keyboard.press("Enter")
    dialog.get_by_label("at most, %").fill("45")
    dialog.get_by_label("worn belt").uncheck()
    dialog.get_by_label("rank").select_option("should")
    dialog.get_by_label("reason").fill("the tool must not touch the guard")
    dialog.get_by_role("button", name="add requirement").click()
    expect(row(page, 4).locator(".requirement-measure")).to_have_text("overshoot, should")
    expect(row(page, 4).locator(".requirement-measure")).to_be_focused()
    expect(row(page, 4)).to_have_attribute("data-standing", re.compile("met"))
    assert saved_design(page)["requirements"][4] == {
        "measure": "overshoot_pct", "at_most": 45, "cases": ["empty", "loaded"], "rank": "should",
        "reason": "the tool must not touch the guard",
    }  # fmt: skip


def test_every_measure_is_on_offer(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    measures = page.request.get("/api/measures").json()
    page.get_by_role("button", name="+ add a requirement").click()
    page.get_by_role("combobox", name="measure").click()
    offered = page.locator(".measure-option").evaluate_all("nodes => nodes.map(node => node.dataset.measure)")
    assert sorted(offered) == sorted(one["measure"] for one in measures)
    assert len(offered) > 30


def test_a_mask_is_entered_point_by_point(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    page.get_by_role("button", name="+ add a requirement").click()
    dialog = page.get_by_role("dialog")
    dialog.get_by_role("combobox", name="measure").fill("complementary sensitivity")
    dialog.get_by_role("option", name=re.compile("^complementary sensitivity, dB")).click()
    dialog.get_by_label("judged", exact=True).select_option("mask")
    add = dialog.get_by_role("button", name="add requirement")
    add.click()
    expect(dialog.locator(".fault:not(:empty)").first).to_contain_text("point 1 needs a frequency and a limit")
    for number, (frequency, limit) in enumerate([(100, -3), (50, -20)], start=1):
        dialog.get_by_label(f"point {number}, frequency in rad/s").fill(str(frequency))
        dialog.get_by_label(f"point {number}, limit").fill(str(limit))
    add.click()
    expect(dialog.locator(".fault:not(:empty)").first).to_contain_text("must be above 100, is 50")
    dialog.get_by_label("point 2, frequency in rad/s").fill("400")
    add.click()
    expect(row(page, 4).locator(".requirement-measure")).to_have_text("complementary sensitivity against a mask")
    wanted = {"measure": "complementary_sensitivity_db", "mask": [[100, -3], [400, -20]], "mask_side": "at_most"}
    assert saved_design(page)["requirements"][4] == wanted


def test_what_the_editor_cannot_use_is_said_beside_the_field(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    row(page, 1).locator(".requirement-measure").click()
    row(page, 1).get_by_role("button", name="edit crossover").click()
    dialog = page.get_by_role("dialog")
    dialog.get_by_label("at most, rad/s").fill("1")
    dialog.get_by_role("button", name="keep").click()
    fault = dialog.get_by_label("at most, rad/s").locator("xpath=..").get_by_role("alert")
    expect(fault).to_contain_text("must be at least 2")
    expect(dialog.get_by_label("at most, rad/s")).to_be_focused()
    dialog.get_by_label("at most, rad/s").fill("")
    dialog.get_by_role("button", name="keep").click()
    expect(dialog).to_be_hidden()
    assert saved_design(page)["requirements"][1] == {"measure": "crossover_rad_s", "at_least": 2}


def test_rows_are_moved_and_removed_and_brought_back(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    row(page, 0).locator(".requirement-measure").click()
    row(page, 0).get_by_role("button", name="move down phase margin").click()
    measures = page.locator("#ledger .requirement-measure")
    expect(measures.nth(1)).to_have_text("phase margin")
    expect(measures.nth(1)).to_be_focused()
    row(page, 1).get_by_role("button", name="remove phase margin").click()
    expect(measures).to_have_count(3)
    page.keyboard.press("Control+z")
    page.keyboard.press("Control+z")
    expect(measures).to_have_text(["phase margin", "crossover", re.compile("peak"), re.compile("loop")])
    assert saved_design(page) == bench_design


def test_an_open_row_tells_reason_place_and_every_case(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    row(page, 0).locator(".requirement-measure").press("Enter")
    more = row(page, 0).locator(".requirement-more")
    expect(more).to_contain_text("Asked for by the line's builder.")
    expect(more).to_contain_text(re.compile(r"Read at [\d.]+ rad/s on "))
    expect(more).to_contain_text("short")
    expect(more.locator("dt")).to_have_text(["empty", "loaded", "worn belt"])


def test_pointing_at_a_row_marks_it_for_the_charts(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    row(page, 2).hover()
    expect(row(page, 2)).to_have_class(re.compile("is-focused"))
    page.locator("#header").hover()
    expect(page.locator(".requirement.is-focused")).to_have_count(0)
    row(page, 0).locator(".requirement-measure").focus()
    expect(row(page, 0)).to_have_class(re.compile("is-focused"))


def test_slack_grows_right_with_room_and_left_when_short(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)

    def reach(index: int) -> tuple[float, float]:
        track = row(page, index).locator(".slack").bounding_box()
        fill = row(page, index).locator(".slack-fill").bounding_box()
        middle = track["x"] + track["width"] / 2
        return fill["x"] - middle, fill["x"] + fill["width"] - middle

    short, room = reach(0), reach(1)
    assert short[0] < -2
    assert short[1] == pytest.approx(0, abs=1)
    assert room[0] == pytest.approx(0, abs=1)
    assert room[1] > 2


def test_a_pin_adds_the_values_as_they_were(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    before = row(page, 1).locator(".requirement-worst").inner_text()
    page.get_by_role("button", name="pin", exact=True).click()
    page.get_by_role("button", name="gain of the compensator").click()
    page.keyboard.type("2.5")
    page.keyboard.press("Enter")
    expect(row(page, 1).locator(".requirement-worst")).not_to_have_text(before)
    expect(row(page, 1).locator(".requirement-was")).to_have_text(before.removesuffix(" rad/s"))


def test_states_are_said_in_words(open_design: Open, bench_design: dict[str, Any]) -> None:
    bench_design["requirements"].append({"measure": "gain_margin_db", "at_least": 6})
    page = open_design(bench_design)
    # 60/(s(s+2)) with a lead and a corner of integral action never reaches −180° above its crossover.
    expect(row(page, 4).locator(".requirement-worst")).to_have_text("unlimited")
    expect(row(page, 4)).to_have_attribute("data-standing", "met")
    page.get_by_role("button", name="gain of the compensator").click()
    page.keyboard.type("-1.5")
    page.keyboard.press("Enter")
    for index in range(5):
        expect(row(page, index).locator(".requirement-worst")).to_have_text("unstable")
        expect(row(page, index)).to_have_attribute("data-standing", "not met")
    expect(page.locator("#ledger .verdict")).to_contain_text("Unstable on every plant case")


def test_what_cannot_be_assessed_says_so(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design({**bench_design, "implementation": {"kind": "digital", "sample_period_s": 0.001}})
    expect(row(page, 0).locator(".requirement-worst")).to_have_text("not assessable")
    expect(row(page, 0)).to_have_attribute("data-standing", "not assessable")
    expect(page.locator("#ledger .verdict")).to_contain_text("Not assessable")


def test_an_empty_sheet_says_the_next_step(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design({**bench_design, "requirements": []})
    expect(page.locator("#ledger .empty")).to_contain_text("Say what the loop has to do")


def test_changes_are_spoken_once_the_hand_rests(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    spoken = page.locator("#ledger output[role=status]")
    expect(spoken).to_contain_text("3 of 4 met")
    row(page, 0).get_by_role("button", name="at least: ≥ 80°").click()
    page.keyboard.type("30")
    page.keyboard.press("Enter")
    expect(row(page, 0)).to_have_attribute("data-standing", "met")
    expect(spoken).to_contain_text("3 of 4 met")  # not before the pause
    expect(spoken).to_contain_text("All 4 requirements met")
