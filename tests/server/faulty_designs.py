"""Designs and bodies that must be refused, each with the place and the words that the one line must hold."""

from __future__ import annotations

import copy
import json
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

Change = Callable[[dict[str, Any]], object]


@dataclass(frozen=True)
class Faulty:
    """One way to spoil a good design."""

    name: str
    change: Change
    where: str
    what: str = ""

    def spoiled(self, design: dict[str, Any]) -> dict[str, Any]:
        """A spoiled copy."""
        spoiled = copy.deepcopy(design)
        self.change(spoiled)
        return spoiled


def _put(path: str, value: Any) -> Change:
    """Set a field; the path is written as in the messages."""
    keys = [int(part) if part.isdigit() else part for part in path.replace("[", ".").replace("]", "").split(".")]

    def change(design: dict[str, Any]) -> None:
        holder: Any = design
        for key in keys[:-1]:
            holder = holder[key]
        holder[keys[-1]] = value

    return change


def _at(name: str, path: str, value: Any, what: str = "", where: str | None = None) -> Faulty:
    return Faulty(name, _put(path, value), path if where is None else where, what)


def _model(name: str, model: Any, where: str, what: str = "") -> Faulty:
    return Faulty(name, _put("plant_cases[0].model", model), f"plant_cases[0].model{where}", what)


_TEXT = {"kind": "expression"}

FAULTY = [
    _at("no object", "compensator", 3, ""),
    _at("wrong type", "compensator.gain", "one", ""),
    _at("text for a number", "plant_cases[0].model.gain", "2.5"),
    _at("truth for a number", "compensator.gain", True),
    _at("zero gain", "compensator.gain", 0),
    _at("huge whole number", "compensator.gain", 10**310, "finite number"),
    _at("corner that is negative", "compensator.stages[0].pole_rad_s", -3, "greater than 0, is -3"),
    _at("unknown field", "titel", "x", ""),
    _at("unknown field deep down", "plant_cases[0].model.poels", []),
    _at("unknown stage", "compensator.stages[0].kind", "pid"),
    _at("unknown measure", "requirements[0].measure", "beauty"),
    _at("requirement without a limit", "requirements[0]", {"measure": "phase_margin_deg"}),
    _at("requirement on an unknown case", "requirements[0].cases", ["nobody"], where="requirements[0].cases[0]"),
    _at("format of tomorrow", "format", "loopwright-design/2"),
    _at("no plant case", "plant_cases", []),
    _at("duplicate case names", "plant_cases[1].name", "empty", where="plant_cases[1].name"),
    _at("one pole of a pair", "plant_cases[0].model.poles", [[-1, 5]], "conjugate",
        "plant_cases[0].model.poles[0]"),
    _at("a complex number of three", "plant_cases[0].model.poles", [[-1, 5, 2]], "[re, im]",
        "plant_cases[0].model.poles[0]"),
    _at("ten thousand poles", "plant_cases[0].model.poles", [-1] * 10_000),
    _at("ten thousand stages", "compensator.stages", [{"kind": "integrator"}] * 10_000),
    _at("ten thousand cases", "plant_cases", [{"name": "x", "model": {}}] * 10_000),
    _at("ten thousand requirements", "requirements", [{"measure": "gain_margin_db", "at_least": 6}] * 10_000),
    _at("dead time that is negative", "plant_cases[0].model.dead_time_s", -1),
    _at("sensor", "sensor", {"kind": "factored", "gain": 1}, "not supported yet"),
    _at("command filter", "command_filter", {"kind": "factored", "gain": 1}, "not supported yet"),
    _at("feedforward", "feedforward", {"kind": "factored", "gain": 1}, "not supported yet"),
    _model("unknown kind", {"kind": "magic"}, ".kind"),
    _model("measured", {"kind": "measured", "frequency_rad_s": [1]}, ".kind", "not supported yet"),
    _model("no kind", {}, ".kind"),
    _model("nothing", None, ""),
    _model("code", {**_TEXT, "text": "__import__('os')"}, ".text", "column"),
    _model("attribute", {**_TEXT, "text": "s.__class__"}, ".text", "column"),
    _model("call", {**_TEXT, "text": "sin(s)"}, ".text", "column"),
    _model("many parentheses", {**_TEXT, "text": "(" * 100_000 + "s" + ")" * 100_000}, ".text"),
    _model("parentheses up to the limit", {**_TEXT, "text": "(" * 1900 + "s" + ")" * 1900}, ".text"),
    _model("tower of powers", {**_TEXT, "text": "9^9^9^9^9"}, ".text"),
    _model("huge power", {**_TEXT, "text": "1/(s+1)^100000"}, ".text"),
    _model("nested powers", {**_TEXT, "text": "1/((((s+1)^9)^9)^9)^9"}, ".text"),
    _model("division by zero", {**_TEXT, "text": "1/0"}, ".text"),
    _model("huge number", {**_TEXT, "text": "1e999*s"}, ".text"),
    _model("huge exponent of ten", {**_TEXT, "text": "1e999999999/(s+1)"}, ".text"),
    _model("empty text", {**_TEXT, "text": ""}, ".text"),
    _model("zero denominator", {"kind": "polynomial", "numerator": [1], "denominator": [0, 0]}, ".denominator"),
    _model("ten thousand coefficients", {"kind": "polynomial", "numerator": [1], "denominator": [1] * 10_000},
           ".denominator"),
    _model("ragged matrix",
           {"kind": "state_space", "a": [[1, 2], [3]], "b": [[1], [1]], "c": [[1, 1]], "d": [[0]]}, ".a[1]"),
]  # fmt: skip
"""Spoiled designs that JSON can carry."""

BODIES: list[tuple[str, bytes, str]] = [
    ("empty", b"", "must be JSON, is empty"),
    ("not JSON", b"hello", "must be JSON: line 1, column 1"),
    ("binary", bytes(range(256)) * 100, "must be JSON"),
    ("cut off", b'{"format": "loopwright-desi', "must be JSON: line 1"),
    ("list", b"[]", "must be a JSON object"),
    ("number", b"7", "must be a JSON object"),
    ("null", b"null", "must be a JSON object"),
    ("nested 10^5 deep", b"[" * 100_000, "nested too deep"),
    ("nested 10^5 deep, closed", b"[" * 100_000 + b"]" * 100_000, "nested too deep"),
    ("objects nested 10^5 deep", b'{"a":' * 100_000, "nested too deep"),
]
"""Bodies that are no design at all."""


def literal_faults(design: dict[str, Any]) -> list[tuple[str, bytes, str]]:
    """Bodies that only differ in one literal: name, body, place."""
    text = json.dumps(design)
    before = '"gain": 1.0'
    assert text.count(before) == 1
    found = []
    for literal in ("NaN", "Infinity", "-Infinity", "1e999", "9" * 5000):
        changed = text.replace(before, f'"gain": {literal}').encode()
        found.append((literal[:9], changed, "compensator.gain"))
    found.append(("twice", text.replace(before, '"gain": 1, "gain": 2').encode(), "compensator.gain"))
    return found
