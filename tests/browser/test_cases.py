"""Plant cases: entered in every form, read as one types, refused at the place that is wrong."""

from __future__ import annotations

import re
from collections.abc import Callable
from typing import Any

import pytest
from playwright.sync_api import Locator, Page, expect

from tests.browser.saved import open_tab, saved_design

Open = Callable[..., Page]


def _case(page: Page, name: str) -> Locator:
    return page.locator(".cases-table tbody tr").filter(has=page.get_by_role("rowheader", name=re.compile(f"^{name}")))


def _new_case(page: Page) -> Locator:
    open_tab(page, "plant cases")
    page.get_by_role("button", name="+ add a plant case").click()
    return page.get_by_role("dialog")


def _choose(dialog: Locator, form: str) -> None:
    dialog.locator(".segment", has_text=form).click()


def _reading(dialog: Locator) -> Locator:
    return dialog.get_by_role("region", name="the model as it is read")


def test_cases_tell_their_model_stability_and_key_readings(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    told = page.request.post("/api/assessment", data=bench_design).json()
    open_tab(page, "plant cases")
    expect(_case(page, "empty")).to_contain_text("nominal")
    expect(_case(page, "empty")).to_contain_text("60 / (s·(s + 2))")
    expect(_case(page, "loaded")).to_contain_text("45/(s*(s+1.5))")
    expect(_case(page, "worn belt")).to_contain_text("50 / (s·(s + 2))")
    for case in told["cases"]:
        expect(_case(page, case["name"]).locator(".case-stability")).to_have_text(case["stability"])
        crossover = _case(page, case["name"]).locator("td.number").first.inner_text()
        assert float(crossover.split()[0]) == pytest.approx(case["readings"]["crossover_rad_s"]["value"], rel=5e-3)


FORMS: list[tuple[str, dict[str, str], str, dict[str, Any]]] = [
    (
        "formula",
        {"formula in s": "3.2*(s+40)/(s*(s^2+2*s+900)) * exp(-0.002*s)"},
        "3.2·(s + 40) / (s·(s² + 2s + 900)) · e^(−0.002s)",
        {"kind": "expression", "text": "3.2*(s+40)/(s*(s^2+2*s+900)) * exp(-0.002*s)"},
    ),
    (
        "coefficients",
        {"numerator": "3.2, 128", "denominator": "1 2 900 0"},
        "3.2·(s + 40) / (s·(s² + 2s + 900))",
        {"kind": "polynomial", "numerator": [3.2, 128], "denominator": [1, 2, 900, 0]},
    ),
    (
        "zeros and poles",
        {"gain": "-3.2", "zeros": "−40", "poles": "0, -1 ± 30j", "dead time, s": "0.01"},
        "−3.2·(s + 40) / (s·(s² + 2s + 901)) · e^(−0.01s)",
        {
            "kind": "factored", "gain": -3.2, "zeros": [-40], "poles": [0, [-1, 30], [-1, -30]], "dead_time_s": 0.01,
        },
    ),
    (
        "state space",
        {"a": "0 1\n-900 -2", "b": "0\n1", "c": "900 0", "d": "0"},
        "900 / (s² + 2s + 900)",
        {"kind": "state_space", "a": [[0, 1], [-900, -2]], "b": [[0], [1]], "c": [[900, 0]], "d": [[0]]},
    ),
]  # fmt: skip


@pytest.mark.parametrize(("form", "typed", "text", "model"), FORMS, ids=[form for form, *_ in FORMS])
def test_a_case_is_entered_in_any_form(
    form: str, typed: dict[str, str], text: str, model: dict[str, Any], open_design: Open, bench_design: dict[str, Any]
) -> None:
    page = open_design(bench_design)
    dialog = _new_case(page)
    dialog.get_by_label("name of the case").fill("cold grease")
    _choose(dialog, form)
    for label, words in typed.items():
        dialog.get_by_label(label, exact=True).fill(words)
    expect(_reading(dialog).locator(".model-text")).to_have_text(text)
    expect(_reading(dialog)).to_contain_text("poles")
    dialog.get_by_role("button", name="add case").click()
    expect(dialog).to_be_hidden()
    expect(_case(page, "cold grease").locator(".case-stability")).to_have_text(re.compile("stable"))
    assert saved_design(page)["plant_cases"][3] == {"name": "cold grease", "model": model}


BAD_MODELS = [
    ("formula", {"formula in s": "3.2*(s+40)/(s*(s^2+2*s+900)"}, "formula in s", "column 12: "),
    ("formula", {"formula in s": "__import__('os')"}, "formula in s", "column 1"),
    ("coefficients", {"numerator": "1", "denominator": "0 0"}, "denominator", ""),
    ("coefficients", {"numerator": "1 zwei", "denominator": "1 0"}, "numerator", "entry 2, “zwei”, is not a number"),
    ("zeros and poles", {"poles": "-1 + 30j"}, "poles", "entry 1"),
    ("zeros and poles", {"poles": "0, fast"}, "poles", "entry 2, “fast”, is not a root"),
    ("zeros and poles", {"poles": "0", "gain": ""}, "gain", "needs a number"),
    ("state space", {"a": "0 1\n-900 x", "b": "0\n1", "c": "1 0", "d": "0"}, "a", "row 2, entry 2"),
    ("state space", {"a": "0 1\n-900 -2", "b": "0", "c": "1 0", "d": "0"}, "b", ""),
    (
        "coefficients",
        {"numerator": "1", "denominator": "1 0", "dead time, s": "-1"},
        "dead time, s",
        "not be less than 0",
    ),
]


def test_a_model_that_cannot_be_read_is_pointed_at(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    for form, typed, field, words in BAD_MODELS:
        dialog = _new_case(page)
        _choose(dialog, form)
        for label, text in typed.items():
            dialog.get_by_label(label, exact=True).fill(text)
        fault = dialog.get_by_label(field, exact=True).locator("xpath=..").get_by_role("alert")
        expect(fault).to_contain_text(words)
        expect(fault).not_to_be_empty()
        expect(_reading(dialog)).to_contain_text("Not readable as it stands")
        dialog.get_by_role("button", name="add case").click()
        expect(fault).to_contain_text(words)
        expect(dialog).to_be_visible()
        page.keyboard.press("Escape")
        expect(dialog).to_be_hidden()
    assert saved_design(page) == bench_design


def test_the_column_of_a_wrong_formula_is_marked(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    dialog = _new_case(page)
    dialog.get_by_label("formula in s").fill("5/(s*(s+2)) + q")
    expect(dialog.locator(".caret")).to_have_text(re.compile(r"^5/\(s\*\(s\+2\)\) \+ q\n {14}↑$"))
    dialog.get_by_label("formula in s").fill("5/(s*(s+2))")
    expect(dialog.locator(".caret")).to_be_hidden()
    expect(_reading(dialog).locator(".model-text")).to_have_text("5 / (s·(s + 2))")


def test_a_model_goes_over_into_another_form_unchanged(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design(bench_design)
    dialog = _new_case(page)
    dialog.get_by_label("formula in s").fill("3.2*(s+40)/(s*(s^2+2*s+901))")
    expect(_reading(dialog).locator(".model-text")).to_have_text("3.2·(s + 40) / (s·(s² + 2s + 901))")
    _choose(dialog, "zeros and poles")
    expect(dialog.get_by_label("poles", exact=True)).to_have_value(re.compile("−1 ± 30j"))
    expect(_reading(dialog).locator(".model-text")).to_have_text("3.2·(s + 40) / (s·(s² + 2s + 901))")
    dialog.get_by_label("zeros", exact=True).fill("-50")
    expect(_reading(dialog).locator(".model-text")).to_have_text("3.2·(s + 50) / (s·(s² + 2s + 901))")


def test_a_rename_is_followed_by_the_requirements(open_design: Open, bench_design: dict[str, Any]) -> None:
    bench_design["requirements"][0]["cases"] = ["loaded", "worn belt"]
    page = open_design(bench_design)
    open_tab(page, "plant cases")
    _case(page, "loaded").get_by_role("button", name="edit loaded").click()
    dialog = page.get_by_role("dialog")
    dialog.get_by_label("name of the case").fill("empty")
    dialog.get_by_role("button", name="keep").click()
    fault = dialog.get_by_label("name of the case").locator("xpath=..").get_by_role("alert")
    expect(fault).to_contain_text("is already the name of")
    dialog.get_by_label("name of the case").fill("full pallet")
    dialog.get_by_role("button", name="keep").click()
    expect(_case(page, "full pallet")).to_be_visible()
    saved = saved_design(page)
    assert saved["requirements"][0]["cases"] == ["full pallet", "worn belt"]
    assert saved["plant_cases"][1] == {**bench_design["plant_cases"][1], "name": "full pallet"}


def test_cases_are_copied_made_nominal_and_removed(open_design: Open, bench_design: dict[str, Any]) -> None:
    bench_design["requirements"][0]["cases"] = ["worn belt"]
    page = open_design(bench_design)
    open_tab(page, "plant cases")
    _case(page, "loaded").get_by_role("button", name="make nominal loaded").click()
    expect(_case(page, "loaded")).to_contain_text("nominal")
    _case(page, "worn belt").get_by_role("button", name="copy worn belt").click()
    page.get_by_role("dialog").get_by_role("button", name="add case").click()
    expect(_case(page, "worn belt, copy")).to_be_visible()
    assert [one["name"] for one in saved_design(page)["plant_cases"]] == [
        "loaded",
        "empty",
        "worn belt",
        "worn belt, copy",
    ]
    _case(page, "worn belt, copy").get_by_role("button", name="remove worn belt, copy").click()
    page.get_by_role("button", name="remove worn belt", exact=True).click()
    saved = saved_design(page)
    assert [one["name"] for one in saved["plant_cases"]] == ["loaded", "empty"]
    assert "cases" not in saved["requirements"][0]
    for _ in range(4):
        page.keyboard.press("Control+z")
    assert saved_design(page) == bench_design


def test_the_last_case_stays(open_design: Open, bench_design: dict[str, Any]) -> None:
    page = open_design({**bench_design, "plant_cases": bench_design["plant_cases"][:1]})
    open_tab(page, "plant cases")
    expect(page.get_by_role("button", name="remove empty")).to_be_disabled()
