"""Stability decided twice: from the closed-loop roots and from the encirclements of −1."""

from __future__ import annotations

import numpy as np
import pytest

from engine.loop.closed_loop_roots import closed_loop_roots
from engine.loop.crossings import find_crossings
from engine.loop.grid import sampled
from engine.loop.loop_set import LoopSet
from engine.loop.stability import ENDLESS, encirclement_count
from engine.model.factored import Factored
from tests.loop.loops import UNITY, factored, number, pair, read, states
from tests.loop.random_loops import random_loop


def counted(plant: Factored) -> int:
    samples = sampled(LoopSet((plant,), UNITY))
    return int(encirclement_count(samples, find_crossings(samples))[0])


# The law of style.md: the rational and the encirclement test agree. Both signs, poles and zeros in the right half
# plane, integrators and zeros at the origin, proper and improper.
@pytest.mark.parametrize("seed", range(40))
def test_both_counts_agree_on_random_loops(seed):
    rng = np.random.default_rng(seed)
    plants = []
    for _ in range(12):
        right = float(rng.choice([0.0, 0.1, 0.4]))
        loop = random_loop(rng, int(rng.integers(1, 13)), (-3.0, 3.0), right=right)
        # One in four upside down: improper.
        plants.append(loop if rng.random() < 0.75 else Factored(1.0 / loop.gain, loop.poles, loop.zeros))
    loops = LoopSet(tuple(plants), UNITY)
    samples = sampled(loops)
    roots = closed_loop_roots(loops).roots
    # Roots at 0 that pole and zero share stay where they are; both methods leave them out of the right half plane.
    np.testing.assert_array_equal(encirclement_count(samples, find_crossings(samples)), np.sum(roots.real > 0, axis=1))


# By hand, e.g. Routh: k/(s(s+1)²) is stable for k < 2; s³ + 2s² + s + k then has two roots on the right.
@pytest.mark.parametrize(("gain", "right"), [(0.5, 0), (1.999, 0), (2.001, 2), (100.0, 2), (-0.1, 1)])
def test_gain_of_a_third_order_loop(gain, right):
    case = read(factored(gain, [], [0, -1, -1]))
    assert case.stable == (right == 0)
    assert case.unstable_poles == right
    assert counted(factored(gain, [], [0, -1, -1])) == right


# By hand: e^−s·k/s is stable for k < π/2, then two more poles cross at every k = π/2 + 2πn.
@pytest.mark.parametrize(("gain", "right"), [(1.57, 0), (1.58, 2), (7.8, 2), (7.9, 4), (14.2, 6), (-0.1, 1)])
def test_integrator_with_dead_time(gain, right):
    case = read(factored(gain, [], [0], 1.0))
    assert case.unstable_poles == right
    assert case.stable == (right == 0)
    assert case.closed_loop_poles is None


# By hand: k·e^−s/(s − a), a = 1/2, is stable for a < k < √(w² + a²) = 1.2683, w = 1.16556 the root of w = atan(w/a).
@pytest.mark.parametrize(("gain", "right"), [(0.49, 1), (0.51, 0), (1.268, 0), (1.269, 2)])
def test_unstable_plant_with_dead_time(gain, right):
    assert read(factored(gain, [], [0.5], 1.0)).unstable_poles == right


def test_dead_time_with_gain_that_stays_above_one():
    case = read(factored(1.5, [-2.0], [-1.0], 0.1))
    assert not case.stable
    assert case.unstable_poles == ENDLESS
    assert "endlessly many" in case.stability
    np.testing.assert_equal(states(case, "delay_margin_s", "peak_sensitivity"), ["unstable", "unstable"])


def test_the_slightest_delay_is_too_much_for_a_biproper_loop():
    case = read(factored(1.5, [-2.0], [-1.0]))
    assert case.stable
    assert number(case, "delay_margin_s") == 0.0


def test_dead_time_with_gain_one_at_infinity_is_on_the_boundary():
    assert "on the stability boundary" in read(factored(1.0, [-1.0], [-2.0], 0.1)).stability


# Field notes, trap 8: hidden cancellations must show.
def test_hidden_unstable_pole():
    plant, compensator = factored(1.0, [], [1.0, -2.0]), factored(2.0, [1.0], [-5.0])
    case = read(plant, compensator)
    assert not case.stable
    assert case.stability == "unstable: hidden unstable mode at 1 rad/s, where a zero covers a pole"
    assert case.unstable_poles == 1
    assert counted(compensator * plant) == 1


def test_hidden_unstable_pair():
    case = read(factored(1.0, [], [*pair(10.0, -0.1), -2.0]), factored(0.1, pair(10.0, -0.1), [-5.0, -5.0]))
    assert "hidden unstable mode at 1±9.94987j" in case.stability
    assert case.unstable_poles == 2


@pytest.mark.parametrize(
    ("plant", "compensator"),
    [
        (factored(1.0, [0], [-1, -2]), factored(1.0, [-1], [0])),
        (factored(1.0, [], [*pair(10.0, 0.0), -2.0]), factored(0.1, pair(10.0, 0.0), [-5.0, -5.0])),
    ],
    ids=["at the origin", "on the axis"],
)
def test_hidden_pole_on_the_axis(plant, compensator):
    case = read(plant, compensator)
    assert not case.stable
    assert case.stability.startswith("on the stability boundary: a hidden mode at")
    assert case.unstable_poles == 0


# By hand: at k = 2 poles of k/(s(s+1)²) at ±j; 1/s² always; −1 at s = 0; (1−s)/(1+s) has L(∞) = −1.
@pytest.mark.parametrize(
    ("plant", "sentence"),
    [
        (factored(2.0, [], [0, -1, -1]), "closed-loop poles at ±1j rad/s"),
        (factored(9.0, [], [0, 0]), "closed-loop poles at ±3j rad/s"),
        (factored(1.0, [], [1.0]), "L(0) = −1"),
        (factored(-1.0, [1.0, -3.0], [-1.0, -2.0]), "L(∞) = −1"),
    ],
)
def test_boundary(plant, sentence):
    case = read(plant)
    assert not case.stable
    assert case.stability.startswith("on the stability boundary: ")
    assert sentence in case.stability
    assert case.readings["phase_margin_deg"].state == "unstable"


# By hand: 1 + 5/(s² + 1)·(s + 1) is stable; poles on the axis are passed on their right.
def test_undamped_plant():
    case = read(factored(5.0, [-1.0], [1j, -1j]))
    assert case.stable
    # By hand: |5(1 + jω)| = |1 − ω²|: ω⁴ − 27ω² − 24 = 0.
    crossing = np.sqrt((27 + np.sqrt(27**2 + 96)) / 2)
    assert [point.rad_s for point in case.gain_crossovers] == pytest.approx([crossing], rel=1e-13)
    assert counted(factored(-5.0, [-1.0], [1j, -1j])) == 1


def test_improper_loop():
    # By hand: L = 0.5·s: 1 + L has its root at −2; L = −0.5·s at +2.
    assert read(factored(0.5, [0], [])).stable
    assert read(factored(-0.5, [0], [])).unstable_poles == 1
    assert counted(factored(-0.5, [0], [])) == 1
    # By hand: L = s²/(s+1)·k: ks² + s + 1 stable for k > 0.
    assert counted(factored(3.0, [0, 0], [-1])) == 0
    assert counted(factored(-3.0, [0, 0], [-1])) == 1


def test_unstable_loop_keeps_what_is_still_defined():
    case = read(factored(10.0, [], [0, -1, -1]))
    margins = ("phase_margin_deg", "gain_margin_db", "gain_reduction_margin_db", "delay_margin_s", "disk_margin")
    peaks = ("peak_sensitivity", "peak_complementary_sensitivity", "effort_gain_db", "bandwidth_rad_s", "ramp_error")
    assert states(case, *margins, *peaks) == ["unstable"] * 10
    assert number(case, "velocity_error_constant") == 10.0
    # By hand: ω(ω² + 1) = 10 at ω = 2, where the phase is −90° − 2·atan 2.
    assert number(case, "crossover_rad_s") == pytest.approx(2.0, rel=1e-14)
    assert case.gain_crossovers[0].signed_phase_margin_deg == pytest.approx(90 - 2 * np.degrees(np.arctan(2)))
    assert [point.rad_s for point in case.phase_crossovers] == pytest.approx([1.0])


def test_gains_beyond_all_reason_are_left_to_the_roots():
    # By hand: (s+1)² + 1e300 has its roots at −1 ± j·1e150, s(s+30) + 1e-300… at about −1e-301: both stable.
    assert read(factored(1e300, [], [-1, -1])).stable
    assert read(factored(1e-300, [], [-30, 0])).stable
