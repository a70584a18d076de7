"""An automated check (axe) of every tab and every dialog on both grounds, and the keyboard's way through."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import pytest
from axe_playwright_python.sync_playwright import Axe
from playwright.sync_api import Page, expect

from tests.browser.saved import call_up, open_tab, row, stage

Open = Callable[..., Page]

# WCAG 2.2 A and AA, and the rules that axe keeps as good practice.
_RULES = {"runOnly": ["wcag2a", "wcag2aa", "wcag21a", "wcag21aa", "wcag22aa", "best-practice"]}


def _findings(page: Page, where: str) -> list[str]:
    """Serious and critical findings inside `where`."""
    page.wait_for_timeout(200)  # colours that fade in are measured once they stand
    violations = Axe().run(page, context=where, options=_RULES).response["violations"]
    return [
        f"{one['id']}: {node['target']} {node['failureSummary']}"
        for one in violations
        if one["impact"] in ("serious", "critical")
        for node in one["nodes"]
    ]


def _on(ground: str, open_design: Open, design: dict[str, Any]) -> Page:
    opened = open_design(design, color_scheme=ground)
    expect(opened.locator("html")).to_have_attribute("data-theme", ground)
    return opened


@pytest.fixture
def page(open_design: Open, bench_design: dict[str, Any]) -> Page:
    """The workbench on the light ground."""
    return _on("light", open_design, bench_design)


@pytest.fixture(params=["light", "dark"])
def either(request: pytest.FixtureRequest, open_design: Open, bench_design: dict[str, Any]) -> Page:
    """The workbench on either ground."""
    return _on(request.param, open_design, bench_design)


def test_page_and_tabs_have_no_serious_finding(either: Page) -> None:
    row(either, 0).locator(".requirement-measure").click()
    assert _findings(either, "body") == []
    either.get_by_role("button", name="pin", exact=True).click()
    for tab in ("stages", "plant cases", "scenario", "now and pinned"):
        open_tab(either, tab)
        assert _findings(either, "#drawer, #ledger") == []


def test_no_dialog_has_a_serious_finding(either: Page) -> None:
    for dialog in ("share", "hand over", "open", "demos"):
        shown = call_up(either, dialog)
        if dialog == "share":
            shown.get_by_role("button", name="make a link").click()
            shown.get_by_role("button", name="copy the link", exact=True).wait_for()
        if dialog == "hand over":
            expect(shown.locator(".strong")).to_be_enabled()
        if dialog == "open":
            shown.get_by_role("button", name="open what was pasted").click()
            expect(shown.locator(".file-faults")).to_contain_text("not opened")
        assert _findings(either, "dialog[open]") == []
        either.keyboard.press("Escape")
        expect(shown).to_have_count(0)


def test_no_editor_has_a_serious_finding(either: Page) -> None:
    either.get_by_role("button", name="+ add a requirement").click()
    either.get_by_role("combobox", name="measure").click()
    assert _findings(either, "dialog[open]") == []
    either.locator(".measure-option").last.click()
    either.get_by_label("judged", exact=True).select_option("mask")
    either.get_by_role("button", name="add requirement").click()
    assert _findings(either, "dialog[open]") == []
    either.keyboard.press("Escape")

    open_tab(either, "plant cases")
    either.get_by_role("button", name="edit loaded").click()
    for form in ("coefficients", "zeros and poles", "state space", "formula"):
        either.locator("dialog[open] .segment", has_text=form).click()
        assert _findings(either, "dialog[open]") == []
    either.get_by_label("formula in s").fill("5/(s")
    expect(either.locator("dialog[open] .caret")).to_be_visible()
    assert _findings(either, "dialog[open]") == []
    either.keyboard.press("Escape")

    open_tab(either, "stages")
    either.get_by_role("button", name="a stage by its numbers").click()
    either.get_by_role("button", name="add stage").click()
    assert _findings(either, "dialog[open]") == []


def test_controls_are_large_enough_to_hit(page: Page) -> None:
    """WCAG 2.2, 2.5.8: targets of at least 24 by 24 CSS pixels."""
    row(page, 0).locator(".requirement-measure").click()
    small = page.locator("#ledger button, #drawer button").evaluate_all(
        """nodes => nodes.filter(node => node.checkVisibility()).map(node => [node, node.getBoundingClientRect()])
             .filter(([, box]) => box.width < 23.5 || box.height < 23.5)
             .map(([node, box]) => `${node.textContent} ${box.width}x${box.height}`)"""
    )
    assert small == []


def test_dialogs_take_the_focus_and_give_it_back(page: Page) -> None:
    opener = page.get_by_role("button", name="+ add a requirement")
    opener.focus()
    page.keyboard.press("Enter")
    expect(page.get_by_role("combobox", name="measure")).to_be_focused()
    page.keyboard.press("Escape")
    expect(opener).to_be_focused()


def test_a_stage_is_changed_by_keyboard_alone(page: Page) -> None:
    number = stage(page, 0).locator(".exact-number").first
    number.focus()
    page.keyboard.press("Enter")
    page.keyboard.type("5")
    page.keyboard.press("Enter")
    expect(number).to_have_text("5.00")
    expect(number).to_be_focused()
