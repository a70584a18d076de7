"""How the screen writes numbers, and reads them back."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import pytest
from playwright.sync_api import Page

Open = Callable[..., Page]

# By hand: three significant digits, U+2212 for minus, U+202F between thousands from 10 000 on.
_NUMBERS = [
    (42.36, "42.4"),
    (1234.5, "1230"),
    (24824.0, "24\u202f800"),
    (0.0013, "0.00130"),
    (-0.000152, "\u22120.000152"),
    (1.52e-5, "1.52·10⁻⁵"),
    (-1.5e6, "\u22121.50·10⁶"),
    (0.0, "0"),
]
_TICKS = [
    (-180.0, "\u2212180"),
    (0.015, "0.015"),
    (30000.0, "30\u202f000"),
    (1e6, "10⁶"),
    (3e6, "3·10⁶"),
    (5e-7, "5·10⁻⁷"),
]
_TYPED = [("12,5", 12.5), ("\u22120.4", -0.4), ("24\u202f800", 24800.0), ("3e-4", 3e-4)]


@pytest.fixture
def call(open_design: Open, bench_design: dict[str, Any]) -> Callable[..., Any]:
    """Call a function of the page's number module."""
    page = open_design(bench_design)

    def of(function: str, *arguments: Any) -> Any:
        return page.evaluate(
            "async ([name, given]) => (await import('/static/app/format.js'))[name](...given)",
            [function, list(arguments)],
        )

    return of


def test_numbers_ticks_and_what_is_typed(call: Callable[..., Any]) -> None:
    assert [call("number", value) for value, _ in _NUMBERS] == [text for _, text in _NUMBERS]
    assert [call("tick", value) for value, _ in _TICKS] == [text for _, text in _TICKS]
    assert [call("parse", text) for text, _ in _TYPED] == [value for _, value in _TYPED]
    assert call("signed", 2.13) == "+2.1"
    assert call("frequency", 9.5, "rad/s") == "9.50 rad/s"
    # 2π rad/s are 1 Hz.
    assert call("frequency", 6.283185307179586, "Hz") == "1.00 Hz"
    assert call("withUnit", 42.36, "°", "rad/s") == "42.4°"


def test_what_is_shown_exactly_is_read_back_exactly(call: Callable[..., Any]) -> None:
    for value in (3.1234567, 0.1, 1e-9, 123456.789, -2.5):
        assert call("parse", call("exact", value)) == value
