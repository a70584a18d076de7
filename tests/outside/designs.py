"""Design documents for the outside checks, and their first case's assessment."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any

from engine.design.assess import assess
from engine.design.parse import parse_design


def factored(gain: float, zeros: Iterable = (), poles: Iterable = (), dead_time_s: float = 0.0) -> dict[str, Any]:
    """A `factored` model; complex roots as Python complex numbers."""
    listed = [[[complex(r).real, complex(r).imag] for r in group] for group in (zeros, poles)]
    model = {"kind": "factored", "gain": gain, "zeros": listed[0], "poles": listed[1]}
    return model | ({"dead_time_s": dead_time_s} if dead_time_s else {})


def design_of(*models: dict[str, Any], gain: float = 1.0, stages: Iterable[dict] = ()) -> dict[str, Any]:
    """A design with one plant case a model."""
    return {
        "format": "loopwright-design/1",
        "plant_cases": [{"name": f"case {i}", "model": m} for i, m in enumerate(models)],
        "compensator": {"gain": gain, "stages": list(stages)},
    }


def assessed(design: dict[str, Any], curves: bool = False) -> dict[str, Any]:
    """The engine's assessment."""
    return assess(parse_design(design), curves=curves)


def case_of(design: dict[str, Any]) -> dict[str, Any]:
    """The engine's word on the first plant case."""
    return assessed(design)["cases"][0]


def value(case: dict[str, Any], measure: str) -> float:
    """The number read for a measure; a failure where there is none."""
    reading = case["readings"][measure]
    assert reading["state"] == "value", (measure, reading)
    return reading["value"]
