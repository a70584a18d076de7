"""All crossings, none invented: traps that each hide one, and a search by polynomial roots as the second method."""

from __future__ import annotations

import math

import mpmath as mp
import numpy as np
import pytest

from engine.loop.crossings import find_crossings
from engine.loop.grid import sampled
from engine.loop.loop_set import LoopSet
from engine.model.factored import Factored
from tests.loop.loops import UNITY, factored, number, pair, read
from tests.loop.random_loops import expanded, random_loop


def gain_crossings(*plants: Factored) -> list[list[float]]:
    found = find_crossings(sampled(LoopSet(plants, UNITY)))
    return [found.gain.of(case).omega_rad_s.tolist() for case in range(len(plants))]


def phase_crossings(plant: Factored) -> list[float]:
    found = find_crossings(sampled(LoopSet((plant,), UNITY)))
    return found.phase.omega_rad_s.tolist()


# Field notes, trap 1: plain log grids of 200 to 2000 points find one of the three crossovers.
def test_a_grid_that_steps_over_a_mode():
    case = read(factored(400 * 5 * 1e6, [], [0, -5, *pair(1000.0, 0.0005)]))
    assert case.stable
    margins = [crossing.signed_phase_margin_deg for crossing in case.gain_crossovers]
    assert [crossing.direction for crossing in case.gain_crossovers] == [-1, 1, -1]
    np.testing.assert_allclose(margins, [6.39, -29.6, -149.6], atol=0.05)


# By hand: the modes' peaks of 1/(2ζ) times the flat gain. Every one of eight modes far narrower than any grid.
def test_many_modes_each_crossed_twice():
    roots: list[complex] = []
    for natural in 2.0 ** np.arange(8) * 3.7:
        roots += pair(natural, 1e-6)
    zeros: list[complex] = []
    for natural in 2.0 ** np.arange(7) * 3.7 * 1.4:
        zeros += pair(natural, 1e-6)
    gain = 1e-3 * np.prod(np.abs(roots)) / np.prod(np.abs(zeros))
    crossings = gain_crossings(factored(gain, zeros, roots))[0]
    assert len(crossings) == 16
    np.testing.assert_allclose(crossings[::2], 2.0 ** np.arange(8) * 3.7, rtol=2e-3)


@pytest.mark.parametrize("shift", [1.0, 1e-3, 1e5])
def test_a_crossing_exactly_on_a_corner(shift):
    # Field notes, trap 2: 1/(s(s+1)²) crosses −180° exactly at its own corner.
    case = read(factored(shift**3, [], [0, -shift, -shift]))
    assert [point.rad_s for point in case.phase_crossovers] == pytest.approx([shift], rel=1e-15)


# By hand: |L|² = 4u/(1+u)², u = ω², reaches 1 at u = 1 and stays below elsewhere.
@pytest.mark.parametrize("scale", [1.0, 3.3, 1e4, 7e-5])
def test_touching_counts_once(scale):
    case = read(factored(2.0 * scale, [0], [-scale, -scale]))
    assert len(case.gain_crossovers) == 1
    assert case.gain_crossovers[0].direction == 0
    # Rounding of one part in 1e15 in |L| is all of 1e-8 in ω here.
    assert case.gain_crossovers[0].rad_s == pytest.approx(scale, rel=1e-6)
    assert case.readings["crossover_rad_s"].state == "absent"
    assert number(case, "phase_margin_deg") == pytest.approx(180.0, abs=1e-4)


@pytest.mark.parametrize("excess", [1e-6, 1e-9, 1e-12])
def test_just_above_touching_is_two_crossings(excess):
    # By hand: 4u(1+e)² = (1+u)² gives ω = (1+e) ± √((1+e)² − 1).
    case = read(factored(2.0 * (1 + excess), [0], [-1, -1]))
    half = math.sqrt((1 + excess) ** 2 - 1)
    # |L| is known to an ulp or two: the distance of the pair from the middle to ulp/excess of itself.
    assert [point.rad_s for point in case.gain_crossovers] == pytest.approx(
        [1 + excess - half, 1 + excess + half], rel=4e-16 / half + 1e-14
    )
    assert [point.direction for point in case.gain_crossovers] == [1, -1]


def test_just_below_touching_is_none():
    assert gain_crossings(factored(2.0 * (1 - 1e-12), [0], [-1, -1])) == [[]]


# By hand: 1e12/s² crosses at 1e6 and 1e-12/s² at 1e-6, without a corner to guide the search; e.g. one more far out.
def test_crossings_far_beyond_all_corners():
    assert gain_crossings(factored(1e12, [], [0, 0]), factored(1e-12, [], [0, 0]), factored(1e20, [], [0])) == [
        pytest.approx([1e6], rel=1e-14),
        pytest.approx([1e-6], rel=1e-14),
        pytest.approx([1e20], rel=1e-14),
    ]


def test_crossings_far_below_all_corners():
    # By hand: 1e-6·(1 + s)/s crosses near 1e-6; s/1e-9 with one corner at 1 crosses at 1e-9.
    low = gain_crossings(factored(1e-6, [-1], [0]), factored(1e9, [0], [-1]))
    assert low[0] == pytest.approx([1e-6], rel=1e-11)
    assert low[1][0] == pytest.approx(1e-9, rel=1e-14)


@pytest.mark.parametrize(("pole", "places"), [(3.0, 0), (3.001, 1), (2.999, 0), (3.1, 1)])
def test_phase_whose_first_order_term_cancels_far_out(pole, places):
    # (s+1)(s+2)/(s³(s+p)) tends to −180°: from which side, the sum 1 + 2 − p tells, and at p = 3 the third powers.
    found = phase_crossings(factored(1.0, [-1, -2], [0, 0, 0, -pole]))
    want = _phase_roots([-1, -2], [0, 0, 0, -pole])
    assert len(want) == places
    np.testing.assert_allclose(found, want, rtol=1e-9)


def _phase_roots(zeros: list[float], poles: list[float]) -> list[float]:
    """Positive ω where N(jω)·conj(D(jω)) is real and negative, by mpmath at 50 digits."""
    with mp.workdps(50):
        product = mp_product(zeros, poles)
        odd = [value.imag for value in product]
        found = mp.polyroots(_trimmed(odd), maxsteps=400, extraprec=400)
        places = sorted(
            float(w.real) for w in found if abs(w.imag) < mp.mpf(10) ** -20 * abs(w) and w.real > mp.mpf(10) ** -30
        )
        return [w for w in places if mp.polyval(product, mp.mpf(w)).real < 0]


def mp_product(zeros: list[complex], poles: list[complex]) -> list[mp.mpc]:
    """Coefficients in ω of Π(jω − z)·Π(−jω − conj(p)), highest power first."""
    total = [mp.mpc(1)]
    for factor in [(mp.mpc(0, 1), -mp.mpmathify(z)) for z in zeros] + [
        (mp.mpc(0, -1), -mp.conj(mp.mpmathify(p))) for p in poles
    ]:
        longer = [mp.mpc(0)] * (len(total) + 1)
        for power, value in enumerate(total):
            longer[power] += value * factor[0]
            longer[power + 1] += value * factor[1]
        total = longer
    return total


def _trimmed(coefficients: list[mp.mpf]) -> list[mp.mpf]:
    largest = max(abs(value) for value in coefficients)
    start = next(i for i, value in enumerate(coefficients) if abs(value) > largest * mp.mpf(10) ** -45)
    return coefficients[start:]


# Second method: the positive roots of |N|² − |D|² and of Im(N·conj D), at 60 digits.
@pytest.mark.parametrize("seed", range(30))
def test_against_polynomial_roots(seed):
    rng = np.random.default_rng(7000 + seed)
    loop = random_loop(rng, int(rng.integers(2, 9)), (-2.0, 3.0), right=0.15)
    samples = sampled(LoopSet((loop,), UNITY))
    found = find_crossings(samples)
    with mp.workdps(60):
        n, d = [mp.mpf(loop.gain) * c for c in expanded(loop.zeros)], expanded(loop.poles)
        level = _difference(_squared(n), _squared(d))
        want = [mp.sqrt(u) for u in _positive(level)]
        np.testing.assert_allclose(found.gain.omega_rad_s, [float(w) for w in want], rtol=1e-9)
        odd, even = _cross_product(n, d)
        places = [u for u in _positive(odd) if mp.polyval(even, u) < 0]
        np.testing.assert_allclose(found.phase.omega_rad_s, [float(mp.sqrt(u)) for u in places], rtol=1e-8)
    assert np.all(np.abs(found.gain.gain) < 1e-9)


def _squared(p: list[mp.mpf]) -> list[mp.mpf]:
    """|p(jω)|² as a polynomial in u = ω², highest power first."""
    even, odd = _parts(p)
    return _sum(_times(even, even), [*_times(odd, odd), mp.mpf(0)])


def _cross_product(n: list[mp.mpf], d: list[mp.mpf]) -> tuple[list[mp.mpf], list[mp.mpf]]:
    """Im(N·conj D)/ω and Re(N·conj D) as polynomials in u = ω²."""
    ne, no = _parts(n)
    de, do = _parts(d)
    imaginary = _difference(_times(no, de), _times(ne, do))
    real = _sum(_times(ne, de), [*_times(no, do), mp.mpf(0)])
    return imaginary, real


def _parts(p: list[mp.mpf]) -> tuple[list[mp.mpf], list[mp.mpf]]:
    """p(jω) = even(ω²) + jω·odd(ω²)."""
    low = p[::-1]
    even = [c * (-1) ** k for k, c in enumerate(low[0::2])]
    odd = [c * (-1) ** k for k, c in enumerate(low[1::2])] or [mp.mpf(0)]
    return even[::-1], odd[::-1]


def _times(a: list[mp.mpf], b: list[mp.mpf]) -> list[mp.mpf]:
    out = [mp.mpf(0)] * (len(a) + len(b) - 1)
    for i, x in enumerate(a):
        for k, y in enumerate(b):
            out[i + k] += x * y
    return out


def _sum(a: list[mp.mpf], b: list[mp.mpf]) -> list[mp.mpf]:
    size = max(len(a), len(b))
    return [x + y for x, y in zip([mp.mpf(0)] * (size - len(a)) + a, [mp.mpf(0)] * (size - len(b)) + b, strict=True)]


def _difference(a: list[mp.mpf], b: list[mp.mpf]) -> list[mp.mpf]:
    return _sum(a, [-x for x in b])


def _positive(p: list[mp.mpf]) -> list[mp.mpf]:
    while p and p[0] == 0:
        p = p[1:]
    while p and p[-1] == 0:
        p = p[:-1]
    if len(p) < 2:
        return []
    # Scaled so that the roots are spread about 1: polyroots starts on a circle.
    ratio = mp.power(abs(p[-1] / p[0]), mp.mpf(1) / (len(p) - 1))
    scaled = [c * ratio ** (len(p) - 1 - k) for k, c in enumerate(p)]
    roots = mp.polyroots([c / scaled[0] for c in scaled], maxsteps=2000, extraprec=800)
    return sorted(u.real * ratio for u in roots if u.real > 0 and abs(u.imag) < mp.mpf(10) ** -25 * abs(u))


def test_dead_time_lists_every_crossing_that_matters():
    # By hand: the phase of e^−s/(2s) is −90° − ω, so −180° − k·360° at π/2 + 2πk.
    found = phase_crossings(factored(0.5, [], [0], 1.0))
    np.testing.assert_allclose(found, np.pi / 2 + 2 * np.pi * np.arange(len(found)), rtol=1e-14)
    assert len(found) >= 3


def test_dead_time_with_endless_crossings_says_so():
    case = read(factored(0.5, [-2.0], [-1.0], 1.0))
    assert any("endlessly" in notice for notice in case.notices)
    # By hand: |L| only falls, from 1 at ω → 0 to 1/2 for ω → ∞: the first crossing has the largest |L| of all.
    first = case.phase_crossovers[0]
    assert number(case, "gain_margin_db") == pytest.approx(-first.gain_db, rel=1e-12)


def test_a_phase_that_rests_on_the_level():
    case = read(factored(1.0, [], [0, 0]))
    assert case.phase_crossovers == ()
    assert any("rests on −180°" in notice for notice in case.notices)
    # By hand: 1/(s² − 1)'s phase is −180° everywhere; lead lifts it off.
    magnet = factored(2.0, [], [1.0, -1.0])
    assert any("rests on −180°" in notice for notice in read(magnet).notices)
    assert read(magnet, factored(10.0, [-1.0], [-10.0])).stable


def test_alone_and_in_company_alike():
    plants = (
        factored(400 * 5 * 1e6, [], [0, -5, *pair(1000.0, 0.0005)]),
        factored(0.5, [], [0], 1.0),
        factored(7, [-10, -10], [0, 0, 0]),
        factored(1e12, [], [0, 0]),
    )
    together = gain_crossings(*plants)
    for plant, found in zip(plants, together, strict=True):
        np.testing.assert_allclose(gain_crossings(plant)[0], found, rtol=1e-13)
