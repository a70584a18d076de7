"""Laws that hold for every loop, on the whole assessment."""

from __future__ import annotations

import copy
import json
import math
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.outside.designs import assessed, case_of, design_of, factored
from tests.outside.make_reference import stored

LOOP_MEASURES = (
    "phase_margin_deg", "gain_margin_db", "gain_reduction_margin_db", "delay_margin_s", "crossover_rad_s",
    "last_crossover_rad_s", "bandwidth_rad_s", "peak_sensitivity", "peak_complementary_sensitivity", "disk_margin",
    "position_error_constant", "velocity_error_constant", "acceleration_error_constant", "step_error", "ramp_error",
    "parabola_error", "overshoot_pct", "undershoot_pct", "rise_time_s", "settling_time_s",
)  # fmt: skip
FREQUENCIES = ("crossover_rad_s", "last_crossover_rad_s", "bandwidth_rad_s", "slowest_pole_rad_s")
TIMES = ("delay_margin_s", "rise_time_s", "settling_time_s", "load_settling_time_s")
PURE = (
    "phase_margin_deg", "gain_margin_db", "gain_reduction_margin_db", "peak_sensitivity", "disk_margin",
    "peak_complementary_sensitivity", "overshoot_pct", "undershoot_pct", "step_error", "least_damping",
)  # fmt: skip

corner = st.floats(-1.5, 1.5).map(lambda e: float(f"{10**e:.4g}"))
light = st.floats(0.02, 0.9).map(lambda z: float(f"{z:.3g}"))


@st.composite
def designs(draw: st.DrawFn) -> dict[str, Any]:
    """Loops of order 2 to 6 with real and complex roots, an integrator or not, a lead or not."""
    poles: list[complex] = [-draw(corner) for _ in range(draw(st.integers(1, 2)))]
    if draw(st.booleans()):
        poles.append(0)
    if draw(st.booleans()):
        w, z = draw(corner), draw(light)
        poles += [complex(-z * w, w), complex(-z * w, -w)]
    zeros = [-draw(corner)] if draw(st.booleans()) else []
    gain = draw(corner) * math.prod(max(abs(p), 0.3) for p in poles) / math.prod(abs(z) for z in zeros)
    stages = []
    if draw(st.booleans()):
        stages.append({"kind": "lead_lag", "zero_rad_s": draw(corner), "pole_rad_s": draw(corner)})
    return design_of(factored(float(f"{gain:.5g}"), zeros, poles), gain=draw(corner), stages=stages)


def same(a: dict, b: dict, names: tuple[str, ...], scale: float = 1.0, rtol: float = 1e-8) -> None:
    """Readings `names` of case a times `scale` are those of case b, states included."""
    for name in names:
        x, y = a["readings"][name], b["readings"][name]
        assert x["state"] == y["state"], (name, x, y)
        if x["state"] == "value":
            np.testing.assert_allclose(y["value"], x["value"] * scale, rtol=rtol, atol=1e-9, err_msg=name)


few = settings(max_examples=25, deadline=None, derandomize=True)


@few
@given(designs())
def test_an_all_one_stage_changes_nothing(design):
    more = copy.deepcopy(design)
    more["compensator"]["stages"].append({"kind": "rational", "zeros": [], "poles": [], "gain": 1.0})
    assert assessed(more)["cases"] == assessed(design)["cases"]


@few
@given(designs(), corner)
def test_a_stage_that_cancels_itself_changes_no_loop_reading(design, where):
    more = copy.deepcopy(design)
    more["compensator"]["stages"].append({"kind": "lead_lag", "zero_rad_s": where, "pole_rad_s": where})
    a, b = case_of(design), case_of(more)
    assert a["stable"] == b["stable"]
    same(a, b, LOOP_MEASURES)


@few
@given(designs())
def test_a_resting_stage_changes_nothing(design):
    more = copy.deepcopy(design)
    more["compensator"]["stages"].append({"kind": "integrator", "enabled": False})
    assert assessed(more)["cases"] == assessed(design)["cases"]


@few
@given(designs())
def test_swapping_plant_and_compensator_changes_no_loop_reading(design):
    model = design["plant_cases"][0]["model"]
    held = {k: model[k] for k in ("zeros", "poles", "gain")} | {"kind": "rational"}
    parts = [{"kind": "rational", "zeros": [], "poles": [], "gain": design["compensator"]["gain"]}]
    for stage in design["compensator"]["stages"]:
        z, p = stage["zero_rad_s"], stage["pole_rad_s"]
        parts.append({"kind": "rational", "zeros": [[-z, 0]], "poles": [[-p, 0]], "gain": p / z})
    plant = factored(
        math.prod(p["gain"] for p in parts),
        [complex(*z) for p in parts for z in p["zeros"]],
        [complex(*z) for p in parts for z in p["poles"]],
    )
    swapped = design_of(plant, stages=[held])
    a, b = case_of(design), case_of(swapped)
    assert a["stable"] == b["stable"]
    same(a, b, LOOP_MEASURES)


@few
@given(designs())
def test_two_minus_signs_make_a_plus(design):
    turned = copy.deepcopy(design)
    turned["compensator"]["gain"] *= -1
    turned["plant_cases"][0]["model"]["gain"] *= -1
    same(case_of(design), case_of(turned), LOOP_MEASURES)


@few
@given(designs(), st.sampled_from([1e-3, 0.1, 7.0, 1e4]))
def test_scaling_time_scales_frequencies_and_times(design, k):
    fast = copy.deepcopy(design)
    model = fast["plant_cases"][0]["model"]
    for roots in ("zeros", "poles"):
        model[roots] = [[k * re, k * im] for re, im in model[roots]]
    model["gain"] *= k ** (len(model["poles"]) - len(model["zeros"]))
    for stage in fast["compensator"]["stages"]:
        stage["zero_rad_s"] *= k
        stage["pole_rad_s"] *= k
    a, b = case_of(design), case_of(fast)
    assert a["stable"] == b["stable"]
    same(a, b, PURE, rtol=1e-7)
    same(a, b, FREQUENCIES, scale=k, rtol=1e-7)
    for name in TIMES:
        x, y = a["readings"][name], b["readings"][name]
        assert x["state"] == y["state"], (name, x, y)
        if x["state"] == "value":
            np.testing.assert_allclose(y["value"] * k, x["value"], rtol=1e-6, err_msg=name)


@few
@given(designs())
def test_a_design_survives_json(design):
    again = json.loads(json.dumps(design))
    assert assessed(again, curves=True) == assessed(design, curves=True)


@few
@given(designs())
def test_roots_and_encirclements_agree_on_stability(design):
    # A dead time of a billionth of the fastest time constant changes nothing but the way stability is decided.
    delayed = copy.deepcopy(design)
    delayed["plant_cases"][0]["model"]["dead_time_s"] = 1e-11
    a, b = case_of(design), case_of(delayed)
    if a["readings"]["peak_sensitivity"]["value"] is None or a["readings"]["peak_sensitivity"]["value"] < 1e6:
        assert a["stable"] == b["stable"], (a["stability"], b["stability"])


# --- margins mean what they say, on the stored random loops -------------------------------------------------------

STABLE = [e for e in stored() if not e["unstable_poles"]]
NUDGE = 1e-5


def each(entries: list[dict]) -> Any:
    return pytest.mark.parametrize("entry", entries, ids=lambda e: e["design"]["plant_cases"][0]["name"])


def _stable_with(design: dict, gain: float = 1.0, delay_s: float = 0.0) -> bool:
    changed = copy.deepcopy(design)
    changed["compensator"]["gain"] *= gain
    model = changed["plant_cases"][0]["model"]
    model["dead_time_s"] = model.get("dead_time_s", 0.0) + delay_s
    return case_of(changed)["stable"]


@each([e for e in STABLE if isinstance(e["readings"]["gain_margin_db"], float)][::3])
def test_the_gain_margin_is_where_stability_ends(entry):
    factor = 10 ** (case_of(entry["design"])["readings"]["gain_margin_db"]["value"] / 20)
    assert _stable_with(entry["design"], gain=factor * (1 - NUDGE))
    assert not _stable_with(entry["design"], gain=factor * (1 + NUDGE))


@each([e for e in STABLE if isinstance(e["readings"]["gain_reduction_margin_db"], float)][::2])
def test_the_gain_reduction_margin_is_where_stability_ends(entry):
    factor = 10 ** (-case_of(entry["design"])["readings"]["gain_reduction_margin_db"]["value"] / 20)
    assert _stable_with(entry["design"], gain=factor * (1 + NUDGE))
    assert not _stable_with(entry["design"], gain=factor * (1 - NUDGE))


@each(
    [e for e in STABLE if isinstance(e["readings"]["delay_margin_s"], float) and e["readings"]["delay_margin_s"]][::4]
)
def test_the_delay_margin_is_where_stability_ends(entry):
    delay = case_of(entry["design"])["readings"]["delay_margin_s"]["value"]
    assert _stable_with(entry["design"], delay_s=delay * (1 - NUDGE))
    assert not _stable_with(entry["design"], delay_s=delay * (1 + NUDGE))


@each(STABLE[::2])
def test_peak_sensitivity_bounds_the_margins(entry):
    # Exact: gain margin ≥ Ms/(Ms−1), phase margin ≥ 2·asin(1/(2Ms)).
    readings = case_of(entry["design"])["readings"]
    peak = readings["peak_sensitivity"]["value"]
    gain, phase = readings["gain_margin_db"], readings["phase_margin_deg"]
    if gain["state"] == "value" and peak > 1:
        assert gain["value"] >= 20 * math.log10(peak / (peak - 1)) - 1e-6
    if phase["state"] == "value":
        assert phase["value"] >= math.degrees(2 * math.asin(min(1.0, 1 / (2 * peak)))) - 1e-6


@pytest.mark.parametrize(("peak", "gain_db", "phase_deg"), [(2.0, 6.02, 28.96), (1.4, 10.88, 41.85)])
def test_the_bounds_that_peak_sensitivity_gives(peak, gain_db, phase_deg):
    # A loop whose curve touches the circle 1/Ms around −1 on the real axis: L = −k at ω = 0 side, k = 1 − 1/Ms.
    case = case_of(design_of(factored(-(1 - 1 / peak), zeros=[1], poles=[-1])))
    np.testing.assert_allclose(case["readings"]["peak_sensitivity"]["value"], peak, rtol=1e-9)
    np.testing.assert_allclose(case["readings"]["gain_margin_db"]["value"], gain_db, atol=5e-3)
    assert abs(math.degrees(2 * math.asin(1 / (2 * peak))) - phase_deg) < 0.01


def test_cases_read_alone_as_in_company():
    models = [e["design"]["plant_cases"][0]["model"] for e in STABLE[3:120:13]]
    together = assessed(design_of(*models, gain=0.37))["cases"]
    for model, in_company in zip(models, together, strict=True):
        alone = case_of(design_of(model, gain=0.37))
        assert alone["stable"] == in_company["stable"]
        for name, reading in alone["readings"].items():
            assert reading["state"] == in_company["readings"][name]["state"], name
            if reading["state"] == "value":
                got = in_company["readings"][name]["value"]
                np.testing.assert_allclose(got, reading["value"], rtol=1e-9, atol=1e-12, err_msg=name)
