"""Sharing: a link shows exactly the design that was shared, as a copy, to someone who shares nothing else."""

from __future__ import annotations

import json
import re
from collections.abc import Callable
from typing import Any

import pytest
from playwright.sync_api import Page, expect

from tests.browser.conftest import Visit
from tests.browser.saved import call_up, open_tab, row, saved_design

Begin = Callable[..., Visit]


def _all_words(page: Page) -> dict[str, Any]:
    """Everything that is read off the design: the ledger, and the table of all readings."""
    panel = open_tab(page, "now and pinned")
    panel.locator("[data-cell]").first.wait_for()
    return {
        "ledger": page.locator(".requirement").all_inner_texts(),
        "readings": panel.locator("tbody tr").all_inner_texts(),
    }


def _make_link(page: Page) -> str:
    dialog = call_up(page, "share")
    dialog.get_by_role("button", name="make a link").click()
    link = dialog.get_by_role("textbox", name="the link", exact=True).input_value()
    page.keyboard.press("Escape")
    return link


def test_a_link_opens_the_same_design_in_another_browser(visit: Begin, bench_design: dict[str, Any]) -> None:
    mine = visit()
    page = mine.open(design=bench_design)
    link = _make_link(page)
    assert re.fullmatch(re.escape(mine.url) + r"/d/[A-Za-z0-9_-]{22,}", link)

    theirs = visit().open(link.removeprefix(mine.url))
    assert saved_design(theirs) == bench_design
    assert _all_words(theirs) == _all_words(page)
    expect(theirs.locator(".copy-notice")).to_contain_text("This is your own copy")


def test_going_on_from_a_link_leaves_the_original_alone(visit: Begin, bench_design: dict[str, Any]) -> None:
    mine = visit()
    page = mine.open(design=bench_design)
    link = _make_link(page)
    path = link.removeprefix(mine.url)

    theirs = visit()
    copy = theirs.open(path)
    copy.get_by_role("button", name="gain of the compensator").click()
    copy.keyboard.type("7")
    copy.keyboard.press("Enter")
    expect(copy.locator(".gain-row")).to_contain_text("gain 7.00 gives")
    assert saved_design(page) == bench_design
    assert saved_design(visit().open(path)) == bench_design
    # Their own reload goes on with their copy, not with the original.
    copy.reload()
    expect(copy.locator(".gain-row")).to_contain_text("gain 7.00 gives")
    # And what I do later does not reach the link.
    page.get_by_role("button", name="gain of the compensator").click()
    page.keyboard.type("9")
    page.keyboard.press("Enter")
    assert saved_design(visit().open(path)) == bench_design


def test_a_link_is_withdrawn_by_the_browser_that_made_it(visit: Begin, bench_design: dict[str, Any]) -> None:
    mine = visit()
    page = mine.open(design=bench_design)
    link = _make_link(page)
    page.reload()
    dialog = call_up(page, "share")
    earlier = dialog.locator(".share-earlier li")
    expect(earlier).to_contain_text("Gantry arm")
    earlier.get_by_role("button", name="withdraw").click()
    assert page.request.get(link).ok  # once more to be sure
    earlier.get_by_role("button", name="withdraw for everyone?").click()
    expect(dialog).to_contain_text("Withdrawn: the link shows nothing any more")
    token = link.rpartition("/")[2]
    assert page.request.get(f"{mine.url}/api/designs/{token}").status == 404

    late = visit().context.new_page()
    late.goto(link)
    expect(late.locator("#status")).to_contain_text("This link leads to no design")


def test_a_link_can_carry_the_design_in_itself(
    visit: Begin, bench_design: dict[str, Any], launch_workbench: Any
) -> None:
    page = visit().open(design={**bench_design, "notes": "Größe: 3 µm, ζ = 0,05"})
    dialog = call_up(page, "share")
    link = dialog.get_by_role("textbox", name="the link that carries the design").input_value()
    # Another server with another store, as a colleague's own Loopwright is.
    elsewhere = launch_workbench()
    theirs = visit(url=elsewhere.url).open("/" + link.partition("/#")[2].join(["#", ""]))
    assert saved_design(theirs) == {**bench_design, "notes": "Größe: 3 µm, ζ = 0,05"}
    expect(theirs.locator(".copy-notice")).to_be_visible()
    assert row(theirs, 0).inner_text() == row(page, 0).inner_text()


@pytest.mark.parametrize(
    ("path", "words"),
    [
        ("/d/AAAAAAAAAAAAAAAAAAAAAA", "This link leads to no design"),
        ("/#design=notadesign", "This link carries no readable design"),
    ],
)
def test_a_broken_link_says_so_and_still_opens_the_workbench(visit: Begin, path: str, words: str) -> None:
    page = visit().context.new_page()
    one = visit()
    page = one.open(path)
    expect(page.locator("#status")).to_contain_text(words)
    expect(page.locator(".copy-notice")).to_be_hidden()


def test_the_link_is_copied(visit: Begin, bench_design: dict[str, Any]) -> None:
    page = visit(permissions=["clipboard-read", "clipboard-write"]).open(design=bench_design)
    dialog = call_up(page, "share")
    dialog.get_by_role("button", name="make a link").click()
    dialog.get_by_role("button", name="copy the link", exact=True).click()
    expect(dialog.get_by_role("button", name="copy the link", exact=True)).to_have_text("copied")
    link = dialog.get_by_role("textbox", name="the link", exact=True).input_value()
    assert page.evaluate("navigator.clipboard.readText()") == link


def test_the_hand_over_of_a_shared_design_names_its_link(visit: Begin, bench_design: dict[str, Any]) -> None:
    page = visit().open(design=bench_design)
    link = _make_link(page)
    dialog = call_up(page, "hand over")
    expect(dialog.get_by_role("button", name=re.compile("^download"))).to_be_enabled()
    assert json.loads(dialog.locator(".preview").inner_text())["link"] == link
