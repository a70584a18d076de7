"""Closed-loop roots against mpmath's polynomial roots, and the cases that need care."""

from __future__ import annotations

import mpmath as mp
import numpy as np
import pytest

from engine.loop.closed_loop_roots import closed_loop_roots
from engine.loop.loop_set import LoopSet
from engine.model.factored import ComplexArray, Factored
from tests.loop.random_loops import characteristic_polynomial, random_loop

NOTHING = np.empty(0, dtype=np.complex128)
UNITY = Factored(1.0, NOTHING, NOTHING)
DECADES = [(-2.0, 4.0), (0.0, 1.0), (-4.0, 4.0), (-1.0, 2.0)]


def factored(gain: float, zeros: list[complex], poles: list[complex], dead_time_s: float = 0.0) -> Factored:
    return Factored(gain, np.array(zeros, dtype=np.complex128), np.array(poles, dtype=np.complex128), dead_time_s)


def roots_of_loop(loop: Factored) -> ComplexArray:
    found = closed_loop_roots(LoopSet((loop,), UNITY))
    assert found.complete[0]
    return found.roots[0, : found.count[0]]


def worst_mismatch(got: ComplexArray, want: ComplexArray) -> float:
    """Largest distance of partners relative to their size, each taken once, nearest first."""
    assert len(got) == len(want)
    left = list(want)
    worst = 0.0
    for root in got:
        at = int(np.argmin(np.abs(np.array(left) - root)))
        worst = max(worst, abs(left[at] - root) / max(abs(left[at]), 1e-300))
        left.pop(at)
    return worst


def by_mpmath(loop: Factored) -> ComplexArray:
    """All roots at 60 digits and more: mpmath.polyroots (Durand–Kerner) on the coefficients."""
    with mp.workdps(60):
        coefficients = characteristic_polynomial(loop)
        trailing = 0
        while coefficients[-1] == 0:
            coefficients.pop()
            trailing += 1
        roots = mp.polyroots(coefficients, maxsteps=400, extraprec=500) if len(coefficients) > 1 else []
        return np.array([complex(root) for root in roots] + [0j] * trailing)


@pytest.mark.parametrize("seed", range(48))
def test_all_roots_of_random_loops_match_60_digits(seed: int) -> None:
    # Stiff, lightly damped, integrators, right half plane, both signs; 1e-9 relative is the contract's figure.
    rng = np.random.default_rng(seed)
    loop = random_loop(rng, int(rng.integers(1, 13)), DECADES[seed % 4])
    assert worst_mismatch(roots_of_loop(loop), by_mpmath(loop)) < 1e-9


@pytest.mark.parametrize("order", [30, 40])
def test_high_orders_over_eight_decades_satisfy_the_equation(order: int) -> None:
    # Vieta's formula pins the whole set: the sum of the roots, and each root's residual at 60 digits.
    rng = np.random.default_rng(order)
    loop = random_loop(rng, order, (-4.0, 4.0), excess=3)
    roots = roots_of_loop(loop)
    assert len(roots) == order
    with mp.workdps(60):
        coefficients = characteristic_polynomial(loop)
        total = mp.fsum(mp.mpc(root) for root in roots)
        scale = mp.fsum(abs(mp.mpc(root)) for root in roots)
        assert abs(total * coefficients[0] + coefficients[1]) < 1e-12 * scale * abs(coefficients[0])
        for root in roots:
            value, slope = mp.polyval(coefficients, mp.mpc(root), derivative=True)
            assert abs(value) <= 1e-9 * abs(slope) * abs(root)


def test_conjugates_are_exact_and_adjacent() -> None:
    for seed in range(30):
        roots = roots_of_loop(random_loop(np.random.default_rng(seed), 12, (-1.0, 3.0)))
        upper = np.flatnonzero(roots.imag > 0.0)
        np.testing.assert_array_equal(roots[upper + 1], roots[upper].conj())
        assert np.count_nonzero(roots.imag < 0.0) == len(upper)
        assert np.all(np.diff(np.abs(roots)) >= 0.0)


def test_a_case_reads_the_same_alone_and_in_company() -> None:
    cases = tuple(random_loop(np.random.default_rng(seed), 3 + 2 * seed, (-1.0, 3.0)) for seed in range(6))
    together = closed_loop_roots(LoopSet(cases, UNITY))
    for case, loop in enumerate(cases):
        alone = roots_of_loop(loop)
        assert together.count[case] == len(alone)
        np.testing.assert_allclose(together.roots[case, : len(alone)], alone, rtol=1e-12)
        assert np.isnan(together.roots[case, len(alone) :].real).all()


def test_exactly_repeated_closed_loop_poles() -> None:
    # By hand: s(s+2) + 1 = (s+1)²; (s+1)³ − 1 + 1·…: 1/(s(s²+3s+3)) closes to (s+1)³.
    np.testing.assert_allclose(roots_of_loop(factored(1.0, [], [0, -2])), [-1, -1], rtol=1e-15)
    roots = roots_of_loop(factored(1.0, [], [0, -1.5 + 0.75j, -1.5 - 0.75j]))
    assert worst_mismatch(roots, by_mpmath(factored(1.0, [], [0, -1.5 + 0.75j, -1.5 - 0.75j]))) < 1e-14


@pytest.mark.parametrize("shift", [1e-15, 1e-13, 1e-10, 1e-7, 1e-4])
def test_nearly_repeated_closed_loop_poles(shift: float) -> None:
    # By hand: s² + 2s + k has the roots −1 ± √(1 − k).
    gain = 1.0 + shift
    with mp.workdps(40):
        half = complex(mp.sqrt(1 - mp.mpf(gain)))
    want = np.array([-1 + half, -1 - half])
    assert worst_mismatch(roots_of_loop(factored(gain, [], [0, -2])), want) < 1e-14


def test_hidden_cancellations_come_out() -> None:
    # By hand: (s−3)(s+5) stands in both N and D, exactly; the rest is s² + 2s + 2.
    roots = roots_of_loop(factored(2.0, [3, -5], [3, -5, 0, -2]))
    assert worst_mismatch(roots, np.array([3, -5, -1 + 1j, -1 - 1j])) < 1e-15


def test_nearly_hidden_cancellations_come_out() -> None:
    loop = factored(7.0, [3.0 + 1e-9, -4e-7 + 30j, -4e-7 - 30j], [3.0, -3e-7 + 30j, -3e-7 - 30j, 0, -2])
    assert worst_mismatch(roots_of_loop(loop), by_mpmath(loop)) < 1e-13


def test_repeated_open_loop_poles() -> None:
    # By hand: 7(s+10)² + s³ (field notes: conditionally stable above gain 5).
    loop = factored(7.0, [-10, -10], [0, 0, 0])
    assert worst_mismatch(roots_of_loop(loop), by_mpmath(loop)) < 1e-14
    loop = factored(1e4, [], [-1.0] * 12)
    # By hand: (s+1)^12 = −10⁴.
    want = -1.0 + 10 ** (4 / 12) * np.exp(1j * np.pi * (2 * np.arange(12) + 1) / 12)
    assert worst_mismatch(roots_of_loop(loop), want) < 1e-13


def test_improper_biproper_and_static_loops() -> None:
    # By hand: s + 1 + 3(s+2)(s+4) = 3s² + 19s + 25; (s+1) + 2(s+4) = 3s + 9; a pure gain has none.
    assert worst_mismatch(roots_of_loop(factored(3.0, [-2, -4], [-1])), np.roots([3, 19, 25])) < 1e-14
    np.testing.assert_allclose(roots_of_loop(factored(2.0, [-4], [-1])), [-3.0], rtol=1e-15)
    assert len(roots_of_loop(factored(2.0, [], []))) == 0
    # A differentiator alone: 1 + s/2.
    np.testing.assert_allclose(roots_of_loop(factored(0.5, [0], [])), [-2.0], rtol=1e-15)


def test_an_algebraic_loop_has_fewer_roots() -> None:
    # By hand: (s+1)(s+3) − (s+2)(s+7) = −5s − 11.
    np.testing.assert_allclose(roots_of_loop(factored(-1.0, [-2, -7], [-1, -3])), [-2.2], rtol=1e-15)
    # By hand: (s+1) − (s+4) = −3 never vanishes.
    assert len(roots_of_loop(factored(-1.0, [-4], [-1]))) == 0


def test_tiny_and_huge_gains_leave_roots_at_poles_and_zeros() -> None:
    np.testing.assert_allclose(roots_of_loop(factored(1e-30, [-3], [-1, -2])), [-1, -2], rtol=1e-15)
    np.testing.assert_allclose(roots_of_loop(factored(1e30, [-3], [-1, -2])), [-3, -1e30], rtol=1e-14)
