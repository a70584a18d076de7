"""Suprema of |S|, |T|, |C·S| and the disk, bandwidth, and their ends at ω → 0 and ω → ∞."""

from __future__ import annotations

import math

import numpy as np
import pytest
import slycot

from engine.loop.frequency import read_frequency
from engine.loop.loop_set import LoopSet
from engine.model.factored import Factored
from tests.loop.loops import UNITY, factored, number, pair, read, states
from tests.loop.random_loops import random_loop


# Seiler, Packard, Gahinet, An Introduction to Disk Margins, IEEE Control Systems Magazine 40 (2020): symmetric disk of
# size α allows gain factors (2−α)/(2+α)…(2+α)/(2−α) and angles 2·atan(α/2). Here as a law on the readings.
@pytest.mark.parametrize("gain", [0.1, 0.7, 1.5, 1.99])
def test_disk_margin_is_inside_the_classical_margins(gain):
    case = read(factored(gain, [], [0, -1, -1]))
    alpha = number(case, "disk_margin")
    assert 0 < alpha < 2
    assert (2 + alpha) / (2 - alpha) <= 10 ** (number(case, "gain_margin_db") / 20) * (1 + 1e-12)
    assert np.degrees(2 * math.atan(alpha / 2)) <= number(case, "phase_margin_deg") * (1 + 1e-12)


# Field notes, identities: gain margin ≥ Ms/(Ms−1), phase margin ≥ 2·asin(1/(2Ms)).
@pytest.mark.parametrize("gain", [0.1, 0.7, 1.5, 1.99])
def test_margins_that_peak_sensitivity_guarantees(gain):
    case = read(factored(gain, [], [0, -1, -1]))
    peak = number(case, "peak_sensitivity")
    assert 10 ** (number(case, "gain_margin_db") / 20) >= peak / (peak - 1) * (1 - 1e-12)
    assert number(case, "phase_margin_deg") >= np.degrees(2 * math.asin(1 / (2 * peak))) * (1 - 1e-12)


# By hand, in the limit of k → 2 for k/(s(s+1)²): the nearer to the boundary, the narrower the peak. At s = j the loop
# passes −k/2, and |S| there is 1/(1−k/2); the true peak is within O(1−k/2) of that in ω and value.
@pytest.mark.parametrize("short", [1e-3, 1e-6, 1e-8])
def test_needle_peaks_near_the_boundary(short):
    case = read(factored(2.0 * (1 - short), [], [0, -1, -1]))
    # S = D/(D+N), near s = j: |S| = |D(j)|/|2j(s−λ)(…)|: the rest follows from the roots.
    roots = case.closed_loop_poles
    assert roots is not None
    light = roots[np.argmax(roots.imag)]
    others = [r for r in roots if r != light]
    s = 1j * light.imag
    want = abs(s * (s + 1) ** 2) / (abs(light.real) * np.prod([abs(s - r) for r in others]))
    np.testing.assert_allclose(number(case, "peak_sensitivity"), want, rtol=5 * short)
    # L is known to an ulp or two, and 1 + L to as much times the peak.
    assert number(case, "peak_sensitivity") >= want * (1 - 1e-15 * want)


# H-infinity norm by eigenvalues of a Hamiltonian matrix (slycot's ab13dd) on the realisation of the closed loop.
# Its own tolerance is 1e-9: tighter, it can stop at the gain for s → ∞ although the norm is larger.
@pytest.mark.parametrize("seed", range(25))
def test_against_hamiltonian_eigenvalues(seed):
    rng = np.random.default_rng(100 + seed)
    for _ in range(200):
        loop = random_loop(rng, int(rng.integers(2, 6)), (-1.0, 1.0), right=0.05, excess=1)
        case = read(loop)
        if case.stable and number(case, "peak_sensitivity") < 50:
            break
    else:
        pytest.fail("no stable loop among 200")
    a, b, c = _companion(loop)
    closed = a - b @ c
    one = np.ones((1, 1))
    for name, c_out, d in (
        ("peak_sensitivity", -c, one),
        ("peak_complementary_sensitivity", c, 0 * one),
        ("disk_margin", -2 * c, one),
    ):
        want, _ = slycot.ab13dd("C", "I", "N", "D", len(a), 1, 1, closed, np.eye(len(a)), b, c_out, d, tol=1e-9)
        got = number(case, name)
        np.testing.assert_allclose(2 / got if name == "disk_margin" else got, want, rtol=1e-8, err_msg=name)


def _companion(loop: Factored) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Controllable realisation of a strictly proper loop; roots within two decades keep it well conditioned."""
    d, n = np.real(np.poly(loop.poles)), loop.gain * np.atleast_1d(np.real(np.poly(loop.zeros)))
    size = len(loop.poles)
    a = np.diag(np.ones(size - 1), -1)
    a[0] -= d[1:]
    b = np.zeros((size, 1))
    b[0, 0] = 1.0
    c = np.concatenate([np.zeros(size - len(n)), n])[None, :]
    return a, b, c


# By hand, all limits for ω → 0 and ω → ∞.
@pytest.mark.parametrize(
    ("plant", "compensator", "name", "want", "at"),
    [
        (factored(1, [], [-1.0]), UNITY, "peak_sensitivity", 1.0, None),
        (factored(1, [], [-1.0]), UNITY, "peak_complementary_sensitivity", 0.5, 0.0),
        (factored(1, [], [0]), UNITY, "peak_complementary_sensitivity", 1.0, 0.0),
        (factored(1, [], [-1.0]), factored(3.0), "effort_gain_db", 20 * math.log10(3.0), None),
        (factored(1, [], [0, -1.0]), factored(0.1, [-0.5], [-50.0]), "effort_gain_db", 20 * math.log10(0.1), None),
        # PI on a plant of gain 4: the effort to hold a constant command is 1/4.
        (factored(4, [], [-1.0]), factored(0.01, [-1.0], [0]), "effort_gain_db", -20 * math.log10(4.0), 0.0),
        # The velocity loop's plant 0.5/s needs no effort at rest.
        (factored(0.5, [], [0]), factored(2.0, [], [-1.0]), "effort_gain_db", None, None),
        (factored(1, [], [-1.0]), UNITY, "disk_margin", 2.0, None),
        (factored(-0.5, [], [-1.0]), UNITY, "peak_sensitivity", 2.0, 0.0),
        (factored(0.5, [-1.0], [-2.0]), UNITY, "peak_complementary_sensitivity", 1 / 3, None),
    ],
)
def test_ends(plant, compensator, name, want, at):
    case = read(plant, compensator)
    reading = case.readings[name]
    assert reading.state == "value"
    if want is not None:
        np.testing.assert_allclose(reading.value, want, rtol=1e-12)
        assert reading.at_rad_s == at
    else:
        assert reading.at_rad_s not in (0.0, None)


def test_unbounded_effort():
    # Improper compensator, and a plant with a zero at 0 under integral action.
    ideal = read(factored(1.0, [], [0, -1.0]), factored(1.0, [-1.0], []))
    assert states(ideal, "effort_gain_db") == ["unbounded"]
    assert "ω → ∞" in ideal.readings["effort_gain_db"].why


# By hand: e^−sθ/2 turns on the circle of radius 1/2 for ever: sup|S| = 2, sup|T| = 1, sup|(1−L)/(1+L)| = 3.
def test_pure_dead_time():
    case = read(factored(0.5, [], [], 0.3))
    assert case.stable
    np.testing.assert_allclose(number(case, "peak_sensitivity"), 2.0, rtol=1e-12)
    np.testing.assert_allclose(number(case, "peak_complementary_sensitivity"), 1.0, rtol=1e-12)
    np.testing.assert_allclose(number(case, "disk_margin"), 2 / 3, rtol=1e-12)
    np.testing.assert_allclose(number(case, "gain_margin_db"), 20 * math.log10(2), rtol=1e-12)


# A mode of damping 1e-5 that the loop moves, damps or nearly undamps: sampled densely around the closed-loop root.
@pytest.mark.parametrize("gain", [-0.02, -0.002, 0.0005])
def test_needle_of_a_shifted_mode(gain):
    loop = factored(gain, [], [-0.5, *pair(10.0, 1e-5)])
    case = read(loop)
    assert case.stable
    roots = case.closed_loop_poles
    assert roots is not None
    light = roots[np.argmax(roots.imag)]
    assert light.imag != 10.0
    s = 1j * (light.imag + np.linspace(-5, 5, 100001) * abs(light.real))
    L = gain / ((s + 0.5) * np.prod([s - p for p in pair(10.0, 1e-5)], axis=0))
    np.testing.assert_allclose(number(case, "peak_complementary_sensitivity"), np.max(np.abs(L / (1 + L))), rtol=1e-8)
    assert number(case, "peak_sensitivity") >= np.max(np.abs(1 / (1 + L))) * (1 - 1e-10)


# C·S with a lead and a long dead time peaks on one of very many ripples, far denser than any grid. 4·10⁶
# samples around the envelope's top show which.
def test_a_peak_among_ripples():
    plant, lead = factored(0.4, [], [-0.4], 3.0), factored(30.0, [-20.0, -30.0], [-300.0, -100.0])
    case = read(plant, lead)
    assert case.stable
    omega = np.linspace(3000.0, 13000.0, 4_000_001)
    s = 1j * omega
    C = 30.0 * (s + 20.0) * (s + 30.0) / ((s + 300.0) * (s + 100.0))
    S = 1 / (1 + C * 0.4 / (s + 0.4) * np.exp(-3.0 * s))
    want = 20 * np.log10(np.max(np.abs(C * S)))
    assert want > 20 * np.log10(30.0)
    assert want - 1e-12 <= number(case, "effort_gain_db") <= want + 1e-6
    at = case.readings["effort_gain_db"].at_rad_s
    assert at is not None
    # Neighbouring ripples differ in the eleventh digit: any of the best few will do.
    assert at == pytest.approx(omega[np.argmax(np.abs(C * S))], abs=15.0)


def test_twin_corners_hide_no_peak():
    # Two cases put corners at 1 and 1 + 4 ulps into one grid: between them rounding alone tells which sample is higher.
    first = factored(-1.004987562112089, [], [-1.0], 1e-4)
    second = factored(1.4142135623730956, [], [-1.0000000000000009, 0.0], 1e-4)
    compensator = factored(-1.0, [], [0.0])
    together = read_frequency(LoopSet((first, second), compensator)).cases[0]
    np.testing.assert_allclose(
        number(together, "disk_margin"), number(read(first, compensator), "disk_margin"), rtol=1e-10
    )


# Lowest ω with |T| = |T(0)|/√2. By hand: T = 1/(s+1) → 1; L = 1/s. T(0) = 0 has none.
def test_bandwidth():
    assert number(read(factored(1.0, [], [0])), "bandwidth_rad_s") == pytest.approx(1.0, rel=1e-14)
    # |T| = (1/2)/|1 + s/2| → 2.
    assert number(read(factored(1.0, [], [-1.0])), "bandwidth_rad_s") == pytest.approx(2.0, rel=1e-14)
    assert states(read(factored(1.0, [0], [-1.0, -2.0])), "bandwidth_rad_s") == ["absent"]
    # Small L(0), late crossover: 1e9(s + 1e-3)/(s + 1e3)², T(0) = 1/2 … by hand |T|² = T(0)²/2 is a quadratic in ω².
    late = read(factored(1e3, [-1e-3], [-1e3, -1e3]))
    # n = 1e3 s + 1, d + n = s² + 3e3 s + (1e6 + 1), T(0) = 1/(1e6 + 1).
    c = 1e6 + 1
    u = np.roots([1.0, 9e6 - 2 * c - 2 * c * c * 1e6, c * c * (1 - 2.0)])
    assert number(late, "bandwidth_rad_s") == pytest.approx(float(np.sqrt(np.max(u))), rel=1e-9)
