"""The assessment as a whole: shape, verdicts, purity, and that no number is ever invented."""

from __future__ import annotations

import copy
import json
from typing import Any

import numpy as np
import pytest

from engine.design.assess import assess, assess_with_arrays
from engine.design.measures import MEASURES
from engine.design.parse import parse_design
from engine.design.transfer_function import hand_over
from tests.design.sheets import servo

SCALAR = {name for name, measure in MEASURES.items() if not measure.per_frequency}


def _assess(curves: bool = False, **changes: Any) -> dict[str, Any]:
    return assess(parse_design(servo(**changes)), curves)


def _plant(**model: Any) -> list[dict[str, Any]]:
    return [{"name": "only", "model": model}]


def test_every_measure_of_the_table_is_read_on_every_case() -> None:
    for case in _assess()["cases"]:
        assert set(case["readings"]) == SCALAR
        for reading in case["readings"].values():
            assert (reading["value"] is not None) is (reading["state"] == "value")


def test_the_assessment_is_plain_finite_json() -> None:
    text = json.dumps(_assess(curves=True), allow_nan=False)
    assert json.loads(text)["format"] == "loopwright-assessment/1"


def test_the_headline_names_the_worst_row_and_case() -> None:
    assessment = _assess()
    assert assessment["verdict"] == "not met"
    assert assessment["headline"].startswith("1 of 2 met: crossover is ")
    assert assessment["headline"].endswith(" rad/s short on loaded.")
    met = _assess(requirements=[{"measure": "phase_margin_deg", "at_least": 30}])
    assert (met["verdict"], met["headline"]) == ("met", "The one requirement is met.")


def test_the_same_design_gives_identical_numbers() -> None:
    first, second = _assess(curves=True), _assess(curves=True)
    assert json.dumps(first) == json.dumps(second)


def test_nothing_about_a_design_is_changed_by_assessing_it() -> None:
    written = servo()
    before = copy.deepcopy(written)
    assess(parse_design(written))
    assert written == before


def test_a_case_alone_reads_as_in_company() -> None:
    company = _assess()
    for index, case in enumerate(servo()["plant_cases"]):
        (alone,) = _assess(plant_cases=[case])["cases"]
        for measure, reading in alone["readings"].items():
            with_others = company["cases"][index]["readings"][measure]
            assert reading["state"] == with_others["state"]
            if reading["value"] is not None:
                np.testing.assert_allclose(with_others["value"], reading["value"], rtol=1e-9, err_msg=measure)


def test_what_cannot_be_judged_as_built_is_not_assessable() -> None:
    assessment = _assess(implementation={"kind": "digital", "sample_period_s": 0.002})
    assert assessment["verdict"] == "not assessable"
    assert "digital" in assessment["headline"]
    assert [row["met"] for row in assessment["requirements"]] == [None, None]
    assert any("digital" in notice for notice in assessment["notices"])
    assert hand_over(parse_design(servo(implementation={"kind": "analogue"})))["verdict"] == "not assessable"


def test_an_unstable_loop_is_called_unstable_and_its_crossings_are_still_listed() -> None:
    compensator = {"gain": 4000.0, "stages": []}
    assessment = _assess(compensator=compensator)
    assert assessment["verdict"] == "not met"
    assert "nstable" in assessment["headline"]
    for case in assessment["cases"]:
        assert case["stable"] is False
        assert case["readings"]["phase_margin_deg"]["state"] == "unstable"
        assert case["readings"]["overshoot_pct"]["state"] == "unstable"
        assert case["gain_crossovers"]
    handed = hand_over(parse_design(servo(compensator=compensator)))
    assert [text for text in handed["warnings"] if text.startswith("UNSTABLE on empty")]


def test_an_empty_sheet_does_not_vouch_for_an_unstable_loop() -> None:
    assert _assess(requirements=[])["verdict"] == "met"
    assert _assess(requirements=[], compensator={"gain": 4000.0})["verdict"] == "not met"


# Loops that are odd on purpose: each must be assessed, said, and stay finite JSON.
ODD_LOOPS = {
    "improper loop": ({"kind": "factored", "gain": 1.0, "zeros": [-1, -2], "poles": [-3]}, 1.0),
    "algebraic loop": ({"kind": "factored", "gain": -1.0, "zeros": [-1], "poles": [-3]}, 1.0),
    "hidden unstable mode": ({"kind": "factored", "gain": 1.0, "zeros": [2], "poles": [2, -3]}, 1.0),
    "constant": ({"kind": "factored", "gain": 2.0}, 1.0),
    "pure gain below one": ({"kind": "factored", "gain": 0.5}, 1.0),
    "pure dead time": ({"kind": "factored", "gain": 0.5, "dead_time_s": 1.0}, 1.0),
    "biproper with dead time": (
        {"kind": "factored", "gain": 2.0, "zeros": [-1], "poles": [-3], "dead_time_s": 1.0},
        1.0,
    ),
    "oscillator": ({"kind": "factored", "gain": 1.0, "poles": [[0, 5], [0, -5]]}, 1.0),
    "double integrator": ({"kind": "factored", "gain": 1.0, "poles": [0, 0]}, 1.0),
    "zero at the origin": ({"kind": "factored", "gain": 3.0, "zeros": [0], "poles": [-1, -2]}, 1.0),
    "cancelled integrator": ({"kind": "factored", "gain": 3.0, "zeros": [0], "poles": [0, -1]}, 1.0),
    "unstable plant": ({"kind": "factored", "gain": 4.0, "poles": [1, -9]}, 5.0),
    "negative plant": ({"kind": "factored", "gain": -4.0, "poles": [-1, -9]}, -5.0),
    "positive feedback": ({"kind": "factored", "gain": -4.0, "poles": [-1, -9]}, 5.0),
    "seven integrators": ({"kind": "factored", "gain": 1.0, "poles": [0] * 7}, 1.0),
    "tiny": ({"kind": "factored", "gain": 1e-60, "poles": [-1]}, 1e-40),
    "huge": ({"kind": "factored", "gain": 1e60, "poles": [-1]}, 1e40),
    "fast and slow": ({"kind": "factored", "gain": 1.0, "poles": [-1e-9, -1e9]}, 1.0),
}


@pytest.mark.parametrize("name", ODD_LOOPS)
def test_an_odd_loop_is_assessed_and_said(name: str) -> None:
    model, gain = ODD_LOOPS[name]
    rows = [
        {"measure": measure.name, measure.usual: 1.0, **({"over_rad_s": [0.1, 100.0]} if measure.per_frequency else {})}
        for measure in MEASURES.values()
    ]
    assessment = _assess(True, plant_cases=_plant(**model), compensator={"gain": gain}, requirements=rows)
    json.dumps(assessment, allow_nan=False)
    (case,) = assessment["cases"]
    assert set(case["readings"]) == SCALAR
    assert case["stability"]
    for row in assessment["requirements"]:
        assert row["reading"]["state"] == "value" or row["reading"]["why"]
    json.dumps(hand_over(parse_design(servo(plant_cases=_plant(**model), compensator={"gain": gain}))), allow_nan=False)


def test_curves_are_of_one_length_and_shared_axes_increase() -> None:
    _, arrays = assess_with_arrays(parse_design(servo()))
    for axis, curves in (("omega_rad_s", ("magnitude_db", "phase_deg")), ("time_s", ("command", "load", "effort"))):
        assert np.all(np.diff(arrays[axis]) > 0)
        for name in curves:
            assert arrays[name].shape == (2, len(arrays[axis]))
            assert np.all(np.isfinite(arrays[name]))
