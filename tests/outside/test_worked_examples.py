"""Worked examples and tables from print: the engine against the 60-digit references, and against what is printed.

`worked_examples.json` has one entry a case. `read` says whether the source was read for this file or quoted from
memory; either way the loop is recomputed, and `exact` holds the digits that must come out again. `printed` is
[value, how far off the print may be]: half of the last digit, or what reading a plot allows.
"""

from __future__ import annotations

import json
from functools import cache
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from engine.design.assess import assess
from engine.design.parse import parse_design
from tests.outside.agreement import disagreements, off, time_disagreements
from tests.outside.record import record

EXAMPLES = json.loads(Path(__file__).with_name("worked_examples.json").read_text(encoding="utf-8"))


def each() -> Any:
    return pytest.mark.parametrize("number", range(len(EXAMPLES)), ids=[e["source"] for e in EXAMPLES])


@cache
def case_of(number: int) -> dict[str, Any]:
    return assess(parse_design(EXAMPLES[number]["design"]))["cases"][0]


@cache
def reference_of(number: int) -> dict[str, Any]:
    return record(EXAMPLES[number]["design"], with_time=True)


def test_sources_are_many_and_named():
    groups = [e["group"] for e in EXAMPLES]
    assert groups.count("open") >= 12
    assert groups.count("textbook") >= 12
    assert groups.count("field notes") == 11
    assert all(e["read"] in ("read in the source", "from memory") for e in EXAMPLES)
    assert len({e["source"] for e in EXAMPLES}) == len(EXAMPLES)


@each()
def test_engine_and_reference_agree(number):
    reference, case = reference_of(number), case_of(number)
    assert disagreements(reference, case) == []
    assert time_disagreements(reference, case) == []


@each()
def test_stored_digits_come_out_again(number):
    reference = reference_of(number)
    for name, digits in EXAMPLES[number]["exact"].items():
        if name == "peak_sensitivity":
            again = reference["peaks"]["sensitivity"][0]
        elif name in reference["readings"]:
            again = reference["readings"][name]
        else:
            again = reference["time"][name][0]
        np.testing.assert_allclose(again, digits, rtol=1e-10, err_msg=name)


@each()
def test_printed_values(number):
    case = case_of(number)
    found: list[str] = []
    for name, printed in EXAMPLES[number]["printed"].items():
        found += _printed(case, name, printed)
    assert found == []


def test_printed_step_response():
    # Course solutions 7.9.9.6: c(t) = 1 − 0.3649 e^{−2t} + 0.9747 e^{−7t} cos(7t + 2.2805), four digits.
    example = next(e for e in EXAMPLES if "step" in e["printed"])
    curves = assess(parse_design(example["design"]), curves=True)["curves"]
    t, y = np.array(curves["time_s"]), np.array(curves["command"][0])
    printed = 1 - 0.3649 * np.exp(-2 * t) + 0.9747 * np.exp(-7 * t) * np.cos(7 * t + 2.2805)
    np.testing.assert_allclose(y, printed, atol=5e-4)


def _printed(case: dict[str, Any], name: str, printed: Any) -> list[str]:
    readings = case["readings"]
    if isinstance(printed, str):
        state = readings[name]["state"]
        return [] if state == printed else [f"{name}: engine {state}, printed {printed}"]
    if name == "step":
        return []  # test_printed_step_response
    if name == "phase_crossovers":
        got = [c for c in case["phase_crossovers"] if c["rad_s"] not in (0, None)]
        pairs = [(c["rad_s"], w, dw) for c, (w, dw, _, _) in zip(got, printed, strict=True)]
        pairs += [(c["gain_db"], g, dg) for c, (_, _, g, dg) in zip(got, printed, strict=True)]
        return [line for value, want, tolerance in pairs for line in off(name, value, want, tolerance)]
    if name == "closed_loop_poles":
        return _printed_poles(case, printed)
    want, tolerance = printed
    return list(off(name, _printed_quantity(case, name), want, tolerance))


def _printed_quantity(case: dict[str, Any], name: str) -> float:
    """A reading by its name, or what sources print instead of it."""
    readings = case["readings"]
    if name == "gain_margin_factor":
        return 10 ** (readings["gain_margin_db"]["value"] / 20)
    if name == "gain_reduction_factor":
        return 10 ** (readings["gain_reduction_margin_db"]["value"] / 20)
    if name == "stability_margin":  # least distance of L from −1
        return 1 / readings["peak_sensitivity"]["value"]
    if name == "first_phase_crossover_rad_s":
        return case["phase_crossovers"][0]["rad_s"]
    return readings[name]["value"]


def _printed_poles(case: dict[str, Any], printed: list) -> list[str]:
    left = [complex(*p) for p in case["closed_loop_poles"]]
    printed = printed + [[re, -im, tolerance] for re, im, tolerance in printed if im]
    if len(left) != len(printed):
        return [f"closed-loop poles: engine {left}, printed {printed}"]
    found: list[str] = []
    for re, im, tolerance in printed:
        nearest = min(left, key=lambda p, want=complex(re, im): abs(p - want))
        left.remove(nearest)
        found += off(f"closed-loop pole {re}+{im}j", abs(nearest - complex(re, im)), 0.0, tolerance)
    return found
