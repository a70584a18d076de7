"""Damping and speed of the closed-loop poles, with and without dead time."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.special import lambertw

from engine.loop.closed_loop_roots import closed_loop_roots
from engine.loop.crossings import find_crossings
from engine.loop.grid import sampled
from engine.loop.loop_set import LoopSet
from engine.loop.stability import ENDLESS, encirclement_count
from engine.model.factored import Factored
from tests.loop.loops import UNITY, factored, number, pair, read, states
from tests.loop.random_loops import random_loop


# By hand: 1 + 4/(s(s+2)) has s² + 2s + 4: ω = 2, ζ = 1/2, −Re = 1.
def test_second_order():
    case = read(factored(4.0, [], [0, -2]))
    assert number(case, "least_damping") == pytest.approx(0.5, rel=1e-12)
    assert number(case, "slowest_pole_rad_s") == pytest.approx(1.0, rel=1e-12)


# Ogata, lag example (field notes): the slow closed-loop pole is at −0.1228, next to the lag's zero at −0.1.
def test_slow_pole_of_a_lag():
    case = read(factored(1.0, [-0.1], [-0.01, 0, -1, -2]))
    assert number(case, "slowest_pole_rad_s") == pytest.approx(0.1228, abs=5e-5)


# s + k·e^−s = 0 has the roots W_n(−k), W the branches of Lambert's function (Corless et al., On the Lambert W
# function, Advances in Computational Mathematics 5 (1996)).
@pytest.mark.parametrize("gain", [0.1, 0.36, 0.5, 1.0, 1.5])
def test_integrator_with_dead_time(gain):
    case = read(factored(gain, [], [0], 1.0))
    root = complex(lambertw(-gain, 0))
    assert number(case, "slowest_pole_rad_s") == pytest.approx(-root.real, rel=1e-9)
    assert number(case, "least_damping") == pytest.approx(-root.real / abs(root), rel=1e-9)


def test_the_chain_of_a_dead_time_does_not_count_as_badly_damped():
    case = read(factored(0.5, [], [0], 1.0))
    # The tenth pair of the chain has damping 0.06, and nothing of it can be seen.
    assert number(case, "least_damping") > 0.7
    assert "higher ones are fainter" in case.readings["least_damping"].why


def test_a_light_mode_counts_with_dead_time_too():
    case = read(factored(400 * 5 * 1e6, [], [0, -5, *pair(1000.0, 0.0005)], 0.0005))
    assert case.stable
    assert 0 < number(case, "least_damping") < 0.002


def test_no_poles_at_all():
    assert states(read(factored(0.5)), "least_damping", "slowest_pole_rad_s") == ["unlimited", "unlimited"]


# Second method: where the argument principle has confirmed the list of roots, as many of them lie on the right as the
# encirclements of −1 say. The two share no code but the model.
@pytest.mark.parametrize("seed", range(12))
def test_encirclements_agree_with_the_roots_of_loops_with_dead_time(seed):
    rng = np.random.default_rng(900 + seed)
    plants = []
    for _ in range(6):
        rational = random_loop(rng, int(rng.integers(1, 7)), (-1.0, 2.0), right=0.1, excess=1)
        plants.append(Factored(rational.gain, rational.zeros, rational.poles, 10 ** rng.uniform(-2.5, 0.5)))
    loops = LoopSet(tuple(plants), UNITY)
    samples = sampled(loops)
    counted = encirclement_count(samples, find_crossings(samples))
    roots = closed_loop_roots(loops)
    confirmed = [found is not None and found.counted for found in roots.dominant]
    assert sum(confirmed) >= 3
    for case in np.nonzero(confirmed)[0]:
        assert counted[case] != ENDLESS
        assert counted[case] == np.sum(roots.roots[case].real > 0)
