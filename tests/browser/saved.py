"""The design on a page, as its own save gives it."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

from playwright.sync_api import Page


def saved_design(page: Page) -> dict[str, Any]:
    """What Ctrl+S writes to the disk."""
    with page.expect_download() as download:
        page.keyboard.press("Control+s")
    return json.loads(Path(download.value.path()).read_text(encoding="utf-8"))


def row(page: Page, index: int) -> Any:
    """A row of the requirement ledger."""
    return page.locator(f"#ledger .requirement[data-row='{index}']")


def stage(page: Page, index: int) -> Any:
    """A stage's row in the drawer."""
    return page.locator(f"#drawer [data-stage='{index}']")


def open_tab(page: Page, name: str) -> Any:
    """Show a tab of the drawer; gives its panel."""
    page.get_by_role("tab", name=name, exact=True).click()
    return page.get_by_role("tabpanel", name=name, exact=True)


def call_up(page: Page, dialog: str) -> Any:
    """Open a dialog as the header does; gives the dialog."""
    page.evaluate(
        "name => document.body.dispatchEvent(new CustomEvent('call-up', {bubbles: true, detail: {dialog: name}}))",
        dialog,
    )
    shown = page.locator("dialog[open]")
    shown.wait_for()
    return shown
