"""Levels at a frequency, in bands and against masks, with dense sampling and closed forms as the second method."""

from __future__ import annotations

import math

import numpy as np
import pytest

from engine.loop.at_frequency import extreme_over, level_at, worst_against_mask
from engine.loop.loop_set import LoopSet
from tests.loop.loops import UNITY, factored, pair

PLANTS = (
    factored(400 * 5 * 1e6, [], [0, -5, *pair(1000.0, 0.0005)]),
    factored(1.0, [], [0, -1, -1]),
    factored(-3.0, [20.0], [-0.3, -8.0, -40.0], 0.004),
)
COMPENSATOR = factored(0.8, [-3.0], [-60.0])
QUANTITIES = (
    "loop_gain_db",
    "sensitivity_db",
    "complementary_sensitivity_db",
    "effort_gain_at_db",
    "load_gain_db",
    "command_gain_db",
    "loop_phase_deg",
)


def value_of(model, s):
    return (
        model.gain
        * np.prod([s - z for z in model.zeros], axis=0)
        / np.prod([s - p for p in model.poles], axis=0)
        * np.exp(-s * model.dead_time_s)
    )


def dense(quantity, plant, omega):
    P, C = value_of(plant, 1j * omega), value_of(COMPENSATOR, 1j * omega)
    L = C * P
    wanted = {
        "loop_gain_db": L,
        "sensitivity_db": 1 / (1 + L),
        "complementary_sensitivity_db": L / (1 + L),
        "effort_gain_at_db": C / (1 + L),
        "load_gain_db": P / (1 + L),
        "command_gain_db": L / (1 + L),
    }
    if quantity == "loop_phase_deg":
        return np.degrees(np.angle(L))
    return 20 * np.log10(np.abs(wanted[quantity]))


@pytest.mark.parametrize("quantity", QUANTITIES)
@pytest.mark.parametrize("omega", [0.01, 1.0, 44.0, 999.0, 1e5])
def test_level_at(quantity, omega):
    got = level_at(LoopSet(PLANTS, COMPENSATOR), quantity, omega)
    want = [dense(quantity, plant, np.array([omega]))[0] for plant in PLANTS]
    if quantity == "loop_phase_deg":
        np.testing.assert_allclose((got - want + 180.0) % 360.0, 180.0, atol=1e-9)
    else:
        np.testing.assert_allclose(got, want, rtol=1e-10, atol=1e-9)


# 2·10⁶ samples over 1…2000 rad/s: their greatest falls short of the true extreme by up to half a step's curvature, at
# the mode (1/(2·0.0005) wide) by 1e-5 dB at most.
@pytest.mark.parametrize("quantity", QUANTITIES[:-1])
def test_extremes_and_masks_against_dense_samples(quantity):
    loops = LoopSet(PLANTS[:2], COMPENSATOR)
    omega = np.geomspace(1.0, 2000.0, 400_001)
    mask = np.array([[1.0, 20.0], [50.0, 10.0], [50.0, -3.0], [2000.0, -40.0]])
    line = np.where(
        omega < 50.0,
        np.interp(np.log(omega), np.log(mask[:2, 0]), mask[:2, 1]),
        np.interp(np.log(omega), np.log(mask[2:, 0]), mask[2:, 1]),
    )
    top, top_at = extreme_over(loops, quantity, 1.0, 2000.0, "greatest")
    bottom, bottom_at = extreme_over(loops, quantity, 1.0, 2000.0, "least")
    over = worst_against_mask(loops, quantity, mask, "at_most")
    under = worst_against_mask(loops, quantity, mask, "at_least")
    for case, plant in enumerate(loops.plants):
        level = dense(quantity, plant, omega)
        for got, want in (
            (top[case], level.max()),
            (-bottom[case], -level.min()),
            (over[0][case] - over[1][case], (level - line).max()),
            (under[1][case] - under[0][case], (line - level).max()),
        ):
            assert want - 1e-9 <= got <= want + 2e-3
        for at, value in ((top_at, top), (bottom_at, bottom), (over[2], over[0]), (under[2], under[0])):
            np.testing.assert_allclose(dense(quantity, plant, at[case : case + 1])[0], value[case], atol=1e-8)


def test_phase_extreme_of_a_lead_network():
    # By hand: 30° at √3 for (1+s)/(1+s/3); −30° upside down.
    lead = LoopSet((factored(3.0, [-1.0], [-3.0]), factored(1 / 3, [-3.0], [-1.0])), UNITY)
    greatest, at = extreme_over(lead, "loop_phase_deg", 0.01, 100.0, "greatest")
    least, low_at = extreme_over(lead, "loop_phase_deg", 0.01, 100.0, "least")
    np.testing.assert_allclose([greatest[0], least[1]], [30.0, -30.0], rtol=1e-13)
    np.testing.assert_allclose([at[0], low_at[1]], math.sqrt(3), rtol=1e-8)


def test_narrow_band_and_single_point():
    loops = LoopSet(PLANTS, COMPENSATOR)
    value, at = extreme_over(loops, "loop_gain_db", 7.0, 7.0, "greatest")
    np.testing.assert_array_equal(value, level_at(loops, "loop_gain_db", 7.0))
    np.testing.assert_array_equal(at, 7.0)
    # A band between two grid points that holds the resonance's top: 20·log10(1/(2ζ)·|rest|).
    mode = LoopSet((factored(1e6, [], pair(1000.0, 0.0005)),), UNITY)
    top, where = extreme_over(mode, "loop_gain_db", 999.9, 1000.1, "greatest")
    np.testing.assert_allclose(top, 20 * math.log10(1 / (2 * 0.0005 * math.sqrt(1 - 0.0005**2))), rtol=1e-12)
    np.testing.assert_allclose(where, 1000.0 * math.sqrt(1 - 2 * 0.0005**2), rtol=1e-10)


def test_infinite_at_an_undamped_root():
    mode = LoopSet((factored(100.0, [], [10j, -10j]),), UNITY)
    assert level_at(mode, "loop_gain_db", 10.0)[0] == math.inf
    assert level_at(mode, "sensitivity_db", 10.0)[0] == -math.inf
    assert level_at(mode, "complementary_sensitivity_db", 10.0)[0] == pytest.approx(0.0, abs=1e-12)


def test_mask_with_one_vertex_and_with_steps_only():
    loops = LoopSet((factored(1.0, [], [0]),), UNITY)
    # |L| at 2 rad/s is −6.02 dB.
    value, limit, at = worst_against_mask(loops, "loop_gain_db", np.array([[2.0, -10.0]]), "at_most")
    np.testing.assert_allclose([value[0], limit[0], at[0]], [-20 * math.log10(2), -10.0, 2.0])
    value, limit, at = worst_against_mask(loops, "loop_gain_db", np.array([[2.0, -10.0], [2.0, -3.0]]), "at_least")
    np.testing.assert_allclose([value[0], limit[0], at[0]], [-20 * math.log10(2), -3.0, 2.0])
