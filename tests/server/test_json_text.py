"""JSON that a design may not be: every kind is told with its place, none gets through."""

from __future__ import annotations

import pytest

from engine.errors import DesignError
from server.json_text import parse_json


@pytest.mark.parametrize(
    ("text", "told"),
    [
        (b"", "must be JSON, is empty"),
        (b" \n", "must be JSON, is empty"),
        (b"{", "must be JSON: line 1, column 2: expecting property name"),
        (b'{"a": 1,}', "must be JSON: line 1, column 9"),
        (b'{"a":\n tru}', "must be JSON: line 2, column 2"),
        (b"[1] 2", "must be JSON: line 1, column 5: extra data"),
        (b'"\xff"', "must be JSON in UTF-8, byte 1 is not"),
        (b"\x00\x01\x02", "must be JSON: line 1, column 1"),
        (b'{"a": [1, {"b": NaN}]}', "a[1].b: must be a finite number, is NaN"),
        (b'{"a": -Infinity}', "a: must be a finite number, is -Infinity"),
        (b'{"a": 1e999}', "a: must be a finite number, is 1e999"),
        (b'{"a": ' + b"9" * 400 + b"}", "a: must be a finite number, is 99999999999999999999… (400 characters)"),
        (b'{"a": ' + b"9" * 200_000 + b"}", "a: must be a finite number"),
        (b'{"a": {"b": 1, "c": 2, "b": 3}}', "a.b: is named twice in the same object; keep one"),
        (b'{"a": NaN, "a": 1}', "a: is named twice in the same object; keep one"),
        (b"[" * 100_000, "is nested too deep, at most 100 levels are taken"),
        (b"[" * 100_000 + b"]" * 100_000, "is nested too deep"),
        (b'{"a":' * 500 + b"1" + b"}" * 500, "is nested too deep"),
        (b'{"notes": "\\ud800"}', "notes: holds half a character"),
        (b'{"\\uDfff": 1}', "holds half a character"),
    ],
)
def test_refused_with_its_place(text: bytes, told: str) -> None:
    with pytest.raises(DesignError) as raised:
        parse_json(text)
    assert str(raised.value).startswith(told)
    assert "\n" not in str(raised.value)


def test_what_is_legal_comes_through() -> None:
    text = '\ufeff{"a": [1, -2.5e-3, true, null, "\\ud83d\\ude00", {}, []], "b": {"a": 12345678901234567890}}'
    value = {"a": [1, -2.5e-3, True, None, "😀", {}, []], "b": {"a": 12345678901234567890}}
    assert parse_json(text.encode()) == value


def test_a_hundred_levels_are_taken_and_one_more_is_not() -> None:
    assert parse_json("[" * 100 + "]" * 100)
    with pytest.raises(DesignError):
        parse_json("[" * 101 + "]" * 101)


def test_many_brackets_side_by_side_are_not_deep() -> None:
    assert len(parse_json("[" + ",".join(["[0,1]"] * 500) + "]")) == 500
