"""Hand-over: the verdict and the cautions stand before the button, and the file is the server's own."""

from __future__ import annotations

import csv
import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

from playwright.sync_api import Locator, Page, expect

from engine.design.transfer_function import CAUTIONS
from tests.browser.saved import call_up

Open = Callable[..., Page]


def _download(page: Page, dialog: Locator) -> tuple[str, str]:
    with page.expect_download() as download:
        dialog.locator(".strong").click()
    return download.value.suggested_filename, Path(download.value.path()).read_text(encoding="utf-8")


def test_what_is_missed_is_said_before_the_button(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    dialog = call_up(page, "hand over")
    verdict = dialog.locator(".hand-over-verdict")
    expect(verdict).to_contain_text("3 of 4 met: phase margin is")
    expect(verdict).to_contain_text("NOT MET: phase margin on")
    expect(dialog.locator(".strong")).to_have_text("download, marked “not met”")
    above = verdict.bounding_box()["y"]
    assert above < dialog.locator(".strong").bounding_box()["y"]


def test_the_cautions_are_the_files_own_and_in_sight(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    dialog = call_up(page, "hand over")
    expect(dialog.locator(".cautions p")).to_have_text(list(CAUTIONS))
    for caution in dialog.locator(".cautions p").all():
        expect(caution).to_be_in_viewport(ratio=1)


def test_the_transfer_function_is_handed_over(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    dialog = call_up(page, "hand over")
    expect(dialog.locator(".strong")).to_be_enabled()
    name, text = _download(page, dialog)
    assert name == "gantry-arm-transfer-function.json"
    want = page.request.post("/api/exports/transfer-function", data=bench_design).json()
    assert json.loads(text) == want
    assert dialog.locator(".preview").inner_text().strip() == text.strip()
    assert want["verdict"] == "not met"


def test_the_curves_are_handed_over(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    dialog = call_up(page, "hand over")
    dialog.locator(".segment", has_text="curves, CSV").click()
    expect(dialog.locator(".preview")).to_contain_text("more lines")
    name, text = _download(page, dialog)
    assert name == "gantry-arm-curves.csv"
    rows = list(csv.DictReader(text.splitlines()))
    assert {line["case"] for line in rows} == {"empty", "loaded", "worn belt"}
    assert len(rows) > 1000


def test_an_unstable_design_is_called_unstable(open_design: Open, bench_design: dict[str, Any]) -> None:
    bench_design["compensator"]["gain"] = -1.5
    page = open_design(bench_design)
    dialog = call_up(page, "hand over")
    verdict = dialog.locator(".hand-over-verdict")
    expect(verdict).to_contain_text("Unstable on every plant case")
    expect(verdict).to_contain_text("UNSTABLE on empty")
    _, text = _download(page, dialog)
    assert json.loads(text)["verdict"] == "not met"


def test_a_design_that_meets_its_sheet_is_plainly_handed_over(open_design: Open, bench_design: dict[str, Any]) -> None:
    bench_design["requirements"] = bench_design["requirements"][1:]
    page = open_design(bench_design)
    dialog = call_up(page, "hand over")
    expect(dialog.locator(".hand-over-verdict")).to_have_text("All 3 requirements met.")
    expect(dialog.locator(".strong")).to_have_text("download")
