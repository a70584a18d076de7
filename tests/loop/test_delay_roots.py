"""Dominant roots of loops with dead time: exact where theory gives them, and complete by count."""

from __future__ import annotations

import mpmath as mp
import numpy as np
import pytest
import scipy.special

from engine.design.parse import parse_design
from engine.design.resolve import loops_of
from engine.loop.closed_loop_roots import closed_loop_roots
from engine.loop.loop_set import LoopSet
from engine.model.factored import ComplexArray, Factored
from tests.loop.time_views import UNITY, factored, pair
from tests.outside.make_reference import stored

DELAYED = [entry for entry in stored() if "closed_loop_poles" not in entry]


def found_roots(loop: Factored) -> ComplexArray:
    found = closed_loop_roots(LoopSet((loop,), UNITY))
    assert not found.complete[0]
    assert found.dominant[0] is not None
    assert found.dominant[0].counted
    return found.roots[0, : found.count[0]]


@pytest.mark.parametrize("gain", [0.1, 0.36787944117144233 * 0.999, 0.5, 1.2, 2.0, -0.3])
def test_integrator_with_dead_time_has_lambert_roots(gain: float) -> None:
    # By hand: s + k·e^(−s) = 0 has the roots W_j(−k), the branches of Lambert's function (DLMF 4.13).
    roots = found_roots(factored(gain, [], [0], 1.0))
    for root in roots[roots.imag >= 0.0]:
        branches = [complex(scipy.special.lambertw(-gain, j)) for j in range(-2, 40)]
        nearest = min(branches, key=lambda w, root=root: abs(w - root))
        assert abs(nearest - root) <= 1e-13 * abs(root) / min(abs(1 + root), 1.0)
    wanted = [complex(scipy.special.lambertw(-gain, j)) for j in range(4)]
    for want in wanted:
        assert want.real < -4.9 or np.min(np.abs(roots - want)) < 1e-9


@pytest.mark.parametrize("entry", DELAYED, ids=lambda entry: str(entry["index"]))
def test_unstable_roots_of_random_loops_are_all_there(entry: dict) -> None:
    # Against the count of encirclements with enclosures, tests/outside; every listed root solves the equation.
    loop = loops_of(parse_design(entry["design"])).loops[0]
    if entry["unstable_poles"] < 0 or entry["unstable_poles"] > 200:
        return
    roots = found_roots(loop)
    assert np.count_nonzero(roots.real > 0.0) == entry["unstable_poles"]
    with mp.workdps(40):
        for root in roots[roots.imag >= 0.0][:12]:
            s = mp.mpc(root)
            ratio = mp.fprod(s - mp.mpc(z) for z in loop.zeros) / mp.fprod(s - mp.mpc(p) for p in loop.poles)
            value = mp.mpf(loop.gain) * ratio * mp.exp(-s * mp.mpf(loop.dead_time_s))
            slope = mp.fsum(1 / (s - mp.mpc(z)) for z in loop.zeros) - mp.fsum(1 / (s - mp.mpc(p)) for p in loop.poles)
            distance = abs((1 + value) / ((slope - loop.dead_time_s) * s))
            assert distance < 1e-11, root


def test_a_light_mode_far_up_the_chain_is_found() -> None:
    # A mode at 300 rad per dead time, damped 0.001, far below the loop gain there: its root stays close by.
    mode = pair(300.0, 0.001)
    loop = factored(0.3 * 300.0**2 * 0.001, [], [0, *mode], 1.0)
    roots = found_roots(loop)
    assert 0.0 < np.min(np.abs(roots - mode[0])) < 1e-3


def test_slow_roots_beside_a_short_dead_time_are_found() -> None:
    # Roots a million times slower than the dead time: nearly those of the loop without it.
    loop = factored(1.0, [-0.01], [0, 0, -3.0], 1e-6)
    roots = found_roots(loop)
    without = closed_loop_roots(LoopSet((factored(1.0, [-0.01], [0, 0, -3.0]),), UNITY)).roots[0]
    for want in without:
        assert np.min(np.abs(roots - want)) < 1e-5 * abs(want)


def test_without_fall_off_there_are_no_dominant_roots() -> None:
    found = closed_loop_roots(LoopSet((factored(1.2, [-1], [-2], 0.5),), UNITY))
    assert found.count[0] == 0
    assert found.dominant[0] is None


def test_mixed_cases_keep_their_places() -> None:
    found = closed_loop_roots(LoopSet((factored(1, [], [0], 1.0), factored(1.0, [], [0, -2])), UNITY))
    np.testing.assert_array_equal(found.complete, [False, True])
    np.testing.assert_allclose(found.roots[1, :2], [-1, -1], rtol=1e-14)
