"""JSON text to plain values, or the pointed reason why not, and back. Stricter than Python's own reader."""

from __future__ import annotations

import json
import math
from collections.abc import Iterator
from typing import Any, NoReturn

from engine.errors import DesignError

_DIGITS_OF_A_FLOAT = 309
_DEEPEST = 100
"""Levels of lists and objects; a design needs eight."""


class _Doubled:
    """Stands where an object named one of its fields twice."""

    def __init__(self, field: str) -> None:
        self.field = field


class _NotFinite:
    """Stands where a number was written that is not a finite one."""

    def __init__(self, text: str) -> None:
        self.text = text if len(text) <= 24 else f"{text[:20]}… ({len(text)} characters)"


def parse_json(data: bytes | str) -> Any:
    """Read one JSON value (RFC 8259).

    Raises
    ------
    DesignError : not UTF-8, not JSON (with line and column), nested too deep, a field named twice, a number that
        is not finite; the last two name the field
    """
    text = data if isinstance(data, str) else _decoded(data)
    marks: list[_Doubled | _NotFinite] = []
    try:
        value = _reader(marks).decode(text)
    except json.JSONDecodeError as error:
        _not_json(error)
    except RecursionError:
        raise DesignError("", f"is nested too deep, at most {_DEEPEST} levels are taken") from None
    if marks:
        _point_at_mark(value)
    # Counting is quick, walking is not: only a text with many opening brackets can be deep.
    if text.count("[") + text.count("{") > _DEEPEST and _depth_exceeds(value, _DEEPEST):
        raise DesignError("", f"is nested too deep, at most {_DEEPEST} levels are taken")
    if "\\ud" in text or "\\uD" in text:
        _refuse_half_characters(value)
    return value


def json_text(value: Any, indent: int | None = None) -> str:
    """One spelling for files, responses and frames: shortest exact digits, text as it is; ValueError on a NaN."""
    separators = (",", ":") if indent is None else (",", ": ")
    return json.dumps(value, ensure_ascii=False, allow_nan=False, indent=indent, separators=separators)


def _decoded(data: bytes) -> str:
    try:
        return data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        raise DesignError("", f"must be JSON in UTF-8, byte {error.start} is not") from None


def _not_json(error: json.JSONDecodeError) -> NoReturn:
    if not error.doc.strip():
        raise DesignError("", "must be JSON, is empty") from None
    what = error.msg[0].lower() + error.msg[1:]
    raise DesignError("", f"must be JSON: line {error.lineno}, column {error.colno}: {what}") from None


def _reader(marks: list[_Doubled | _NotFinite]) -> json.JSONDecoder:
    def number(text: str) -> float | _NotFinite:
        value = float(text)
        return value if math.isfinite(value) else constant(text)

    def whole(text: str) -> int | _NotFinite:
        return int(text) if len(text) < _DIGITS_OF_A_FLOAT else constant(text)

    def constant(text: str) -> _NotFinite:
        marks.append(_NotFinite(text))
        return marks[-1]  # type: ignore[return-value]

    def fields(pairs: list[tuple[str, Any]]) -> dict[str, Any]:
        made = dict(pairs)
        if len(made) < len(pairs):
            names = [name for name, _ in pairs]
            doubled = next(name for name in names if names.count(name) > 1)
            made[doubled] = _Doubled(doubled)
            marks.append(made[doubled])
        return made

    return json.JSONDecoder(object_pairs_hook=fields, parse_float=number, parse_int=whole, parse_constant=constant)


def _walk(value: Any) -> Iterator[tuple[str, Any]]:
    """Every value with its path, in the order of the text."""
    waiting: list[tuple[str, Any]] = [("", value)]
    while waiting:
        where, part = waiting.pop()
        yield where, part
        waiting.extend(reversed(_parts(where, part)))


def _point_at_mark(value: Any) -> NoReturn:
    """Find the first mark, so that the message can name the field."""
    for where, part in _walk(value):
        if isinstance(part, _Doubled):
            raise DesignError(where, "is named twice in the same object; keep one")
        if isinstance(part, _NotFinite):
            raise DesignError(where, f"must be a finite number, is {part.text}")
    raise DesignError("", "holds a field that is named twice, one of them with a number that is not finite")


def _refuse_half_characters(value: Any) -> None:
    """Half of a surrogate pair is legal in JSON text, but no text can hold it when it is written again."""
    for where, part in _walk(value):
        texts = [part] if isinstance(part, str) else list(part) if isinstance(part, dict) else []
        if any("\ud800" <= letter <= "\udfff" for text in texts for letter in text):
            raise DesignError(where.encode(errors="replace").decode(), "holds half a character (a lone surrogate)")


def _parts(where: str, value: Any) -> list[tuple[str, Any]]:
    if isinstance(value, dict):
        return [(f"{where}.{name}" if where else name, part) for name, part in value.items()]
    if isinstance(value, list):
        return [(f"{where}[{index}]", part) for index, part in enumerate(value)]
    return []


def _depth_exceeds(value: Any, most: int) -> bool:
    level = [value]
    for _ in range(most):
        level = [
            part
            for holder in level
            if isinstance(holder, (dict, list))
            for part in (holder.values() if isinstance(holder, dict) else holder)
            if isinstance(part, (dict, list))
        ]
        if not level:
            return False
    return True
