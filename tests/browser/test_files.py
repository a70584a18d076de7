"""Files: opened by choice, drop or paste; what cannot be used leaves the work as it was."""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

from playwright.sync_api import Page, expect

from tests.browser.saved import call_up, row, saved_design

Open = Callable[..., Page]

_DROP = """([name, text]) => {
  const carried = new DataTransfer();
  carried.items.add(new File([text], name, { type: "application/json" }));
  for (const type of ["dragenter", "dragover", "drop"]) {
    const event = new DragEvent(type, { dataTransfer: carried, bubbles: true, cancelable: true });
    document.querySelector("#charts").dispatchEvent(event);
  }
}"""  # fmt: skip


def test_a_file_is_chosen(
    open_design: Open, bench_design: dict[str, Any], plain_design: dict[str, Any], tmp_path: Path
) -> None:
    page = open_design(bench_design)
    path = tmp_path / "bench-axis.json"
    path.write_text(json.dumps(plain_design), encoding="utf-8")
    call_up(page, "open")
    with page.expect_file_chooser() as chooser:
        page.get_by_role("button", name="choose a file").click()
    chooser.value.set_files(path)
    expect(page.locator("dialog[open]")).to_have_count(0)
    expect(page.get_by_label("title of the design")).to_have_value("Bench axis")
    assert saved_design(page) == plain_design
    page.keyboard.press("Control+z")
    assert saved_design(page) == bench_design


def test_a_file_is_dropped_anywhere(
    open_design: Open, bench_design: dict[str, Any], plain_design: dict[str, Any]
) -> None:
    page = open_design(bench_design)
    page.evaluate(_DROP, ["axis.json", "\ufeff" + json.dumps(plain_design)])
    expect(page.get_by_label("title of the design")).to_have_value("Bench axis")
    expect(page.locator(".drop-veil")).to_be_hidden()
    assert saved_design(page) == plain_design


def test_a_design_is_pasted(open_design: Open, bench_design: dict[str, Any], plain_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    dialog = call_up(page, "open")
    dialog.get_by_label("a design as text").fill(json.dumps(plain_design))
    dialog.get_by_role("button", name="open what was pasted").click()
    expect(page.get_by_label("title of the design")).to_have_value("Bench axis")
    assert saved_design(page) == plain_design


BAD_FILES = [
    ("", "must be JSON, is empty"),
    ("{\n  \"format\": 'x'\n}", "line 2, column 13"),
    ("[1, 2]", "a design must be a JSON object"),
    ('{"format": "loopwright-design/1", "format": "loopwright-design/1"}', "format"),
    ('{"format": "loopwright-transfer-function/1"}', "format"),
    ("<svg onload=alert(1)>", "must be JSON"),
]


def test_a_bad_file_is_refused_in_one_line(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    for text, words in BAD_FILES:
        page.evaluate(_DROP, ["broken.json", text])
        faults = page.locator("dialog[open] .file-faults")
        expect(faults).to_contain_text("broken.json was not opened; your work is as it was.")
        expect(faults).to_contain_text(words)
        page.keyboard.press("Escape")
        expect(page.locator("dialog[open]")).to_have_count(0)
    assert saved_design(page) == bench_design


def test_a_bad_value_is_told_with_its_field(
    open_design: Open, bench_design: dict[str, Any], plain_design: dict[str, Any]
) -> None:
    page = open_design(bench_design)
    plain_design["compensator"]["stages"][0]["pole_rad_s"] = -3
    plain_design["plant_cases"][1]["model"]["text"] = "2/(s*(s+0.8)"
    page.evaluate(_DROP, ["axis.json", json.dumps(plain_design)])
    faults = page.locator("dialog[open] .file-faults")
    expect(faults).to_contain_text("compensator.stages[0].pole_rad_s: must be greater than 0, is -3")
    plain_design["compensator"]["stages"][0]["pole_rad_s"] = 12
    page.keyboard.press("Escape")
    page.evaluate(_DROP, ["axis.json", json.dumps(plain_design)])
    expect(faults).to_contain_text("plant_cases[1].model.text: column 3")
    expect(row(page, 3)).to_have_count(1)


def test_a_saved_file_opens_as_the_same_design(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    assert saved_design(page) == bench_design
    page.evaluate("document.body.dispatchEvent(new CustomEvent('call-up', {bubbles: true, detail: {dialog: 'demos'}}))")
    dialog = page.locator("dialog[open]")
    dialog.locator(".demo").nth(1).click()
    expect(page.get_by_label("title of the design")).not_to_have_value("Gantry arm")
    page.evaluate(_DROP, ["gantry-arm.loopwright.json", json.dumps(bench_design)])
    expect(page.get_by_label("title of the design")).to_have_value("Gantry arm")
    assert saved_design(page) == bench_design


def test_every_demo_is_listed_with_a_sentence_and_opens(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    demos = page.request.get("/api/demos").json()
    assert len(demos) >= 6
    for index, demo in enumerate(demos):
        dialog = call_up(page, "demos")
        entry = dialog.locator(".demo").nth(index)
        expect(entry.locator(".demo-title")).to_have_text(demo["title"])
        expect(entry.locator(".demo-summary")).not_to_be_empty()
        entry.click()
        expect(page.get_by_label("title of the design")).to_have_value(demo["title"])
        expect(row(page, 0).locator(".requirement-worst")).not_to_have_text("…")


def test_the_work_survives_a_reload(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    page.get_by_role("button", name="gain of the compensator").click()
    page.keyboard.type("4.25")
    page.keyboard.press("Enter")
    expect(page.locator(".gain-row")).to_contain_text("gain 4.25")
    page.reload()
    expect(page.locator(".gain-row")).to_contain_text("gain 4.25 gives")
    page.keyboard.press("Control+z")
    assert saved_design(page) == bench_design
