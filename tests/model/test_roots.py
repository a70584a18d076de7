"""Roots of coefficients: repeated, clustered, widely spread, on the axis; against exact values and mpmath."""

from __future__ import annotations

import math
from fractions import Fraction

import mpmath
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray

from engine.model.factored import ComplexArray
from engine.model.limits import Limits
from engine.model.roots import roots_of
from tests.model.refusal import refused

ULP = 2.3e-16


def expanded(roots: list[Fraction]) -> list[Fraction]:
    """Exact coefficients of Π(s − root)."""
    coefficients = [Fraction(1)]
    for root in roots:
        coefficients = [
            a - root * b for a, b in zip([*coefficients, Fraction(0)], [Fraction(0), *coefficients], strict=True)
        ]
    return coefficients


def multiplied(*factors: list[int]) -> list[int]:
    product = np.array([1], dtype=object)
    for factor in factors:
        product = np.convolve(product, np.array(factor, dtype=object))
    return list(product)


def assert_same_roots(got: ComplexArray, want: NDArray[np.complex128], rtol: float) -> None:
    """Every wanted root has its own found one; real and imaginary part each relative to itself."""
    assert len(got) == len(want)
    left = list(got)
    for root in want:
        nearest = min(left, key=lambda other: abs(other - root))
        np.testing.assert_allclose([nearest.real, nearest.imag], [root.real, root.imag], rtol=rtol, atol=0)
        left.remove(nearest)


def test_a_twelvefold_root_survives_expansion() -> None:
    # Exact: (s + 1)^12 by the binomial theorem. Eigenvalues of the companion matrix are off by 0.09 here.
    assert roots_of([math.comb(12, k) for k in range(13)]).tolist() == [-1] * 12


def test_decimals_are_meant_as_written() -> None:
    # By hand: s² + 0.2 s + 0.01 = (s + 0.1)², though none of the three doubles but 1 is that decimal.
    assert roots_of([1.0, 0.2, 0.01]).tolist() == [-0.1, -0.1]


def test_wilkinson_polynomial() -> None:
    # Exact: Π (s − k), k = 1…20. J. H. Wilkinson, Rounding Errors in Algebraic Processes, 1963.
    assert roots_of(expanded([Fraction(k) for k in range(1, 21)])).tolist() == list(range(1, 21))


def test_wilkinson_polynomial_of_order_40() -> None:
    # Exact by construction; the widest of its coefficients has 48 digits.
    assert roots_of(expanded([Fraction(k) for k in range(1, 41)])).tolist() == list(range(1, 41))


def test_perturbed_wilkinson_polynomial() -> None:
    # The same, coefficient of s^19 changed by −2^-23. J. H. Wilkinson 1963, the values from memory;
    # pinned by test_against_60_digits, which runs mpmath on polynomials of this kind.
    coefficients = expanded([Fraction(k) for k in range(1, 21)])
    coefficients[1] -= Fraction(1, 2**23)
    upper = [r for r in roots_of(coefficients).tolist() if r.imag > 0]
    want = [
        10.095266145 + 0.643500904j,
        11.793633881 + 1.652329728j,
        13.992358137 + 2.518830070j,
        16.730737466 + 2.812624894j,
        19.502439400 + 1.940330347j,
    ]
    np.testing.assert_allclose(upper, want, rtol=0, atol=1e-9)


def test_legendre_polynomial_of_order_40() -> None:
    # Gauss-Legendre nodes; P_n from Rodrigues' formula (NIST DLMF 18.5.8). numpy's nodes are the second method.
    n = 40
    legendre = [0] * (n + 1)
    for k in range(n // 2 + 1):
        legendre[2 * k] = (-1) ** k * math.comb(n, k) * math.comb(2 * n - 2 * k, n)
    nodes, _ = np.polynomial.legendre.leggauss(n)
    got = roots_of(legendre)
    assert not got.imag.any()
    np.testing.assert_allclose(np.sort(got.real), nodes, rtol=1e-14)


@pytest.mark.parametrize("n", [3, 4, 5, 8, 12, 20, 40])
def test_roots_of_minus_one(n: int) -> None:
    # Exact: s^n = −1 at exp(iπ(2k + 1)/n).
    angles = np.pi * (2 * np.arange(n) + 1) / n
    got = roots_of([1] + [0] * (n - 1) + [1])
    np.testing.assert_allclose(np.sort(np.angle(got) % (2 * np.pi)), angles, rtol=4e-16)
    np.testing.assert_allclose(np.abs(got), 1, rtol=4e-16)


def test_on_the_axis_is_decided_exactly() -> None:
    # By hand: (s² + 900)(s² + 2)²(s + 3)(s² + s + 1)(s − 5)(s + 5).
    got = roots_of(multiplied([1, 0, 900], [1, 0, 2], [1, 0, 2], [1, 3], [1, 1, 1], [1, -5], [1, 5])).tolist()
    assert [r for r in got if r.real == 0] == [
        *[1j * math.sqrt(2), -1j * math.sqrt(2)] * 2,
        30j,
        -30j,
    ]
    assert sorted(r.real for r in got if r.imag == 0) == [-5, -3, 5]
    assert -0.5 + 1j * math.sqrt(0.75) in got


def test_just_off_the_axis_is_not_on_it() -> None:
    # By hand: s² + 2·1e-12·s + 1 times s² + 4 and s + 1.
    got = roots_of(multiplied([10**12, 2, 10**12], [1, 0, 4], [1, 1])).tolist()
    assert [r.real for r in got if r.imag] == [-1e-12, -1e-12, 0, 0]


def test_damping_keeps_its_digits() -> None:
    # Two modes 1e-9 apart with damping 1e-10: real parts to the last place, by hand from the factors.
    first = [Fraction(1), Fraction(2, 10**10), Fraction(1)]
    second = [Fraction(1), Fraction(3, 10**10), Fraction(1) + Fraction(1, 10**9)]
    product = [Fraction(0)] * 5
    for i, a in enumerate(first):
        for j, b in enumerate(second):
            product[i + j] += a * b
    np.testing.assert_allclose(roots_of(product).real, [-1e-10, -1e-10, -1.5e-10, -1.5e-10], rtol=ULP)


def test_damping_far_below_the_first_precision() -> None:
    # By hand: (s² + 2e-60 s + 1)(s² + s + 3); 160 bits leave noise of 1e-48 in the real part.
    light = [Fraction(1), Fraction(2, 10**60), Fraction(1)]
    product = [Fraction(0)] * 5
    for i, a in enumerate(light):
        for j, b in enumerate((1, 1, 3)):
            product[i + j] += a * b
    assert roots_of(product).real.tolist() == [-1e-60, -1e-60, -0.5, -0.5]


@pytest.mark.parametrize("bits", range(30, 48, 2))
@pytest.mark.parametrize("count", [3, 4, 5, 6])
def test_tight_clusters_are_resolved_to_the_last_place(bits: int, count: int) -> None:
    # Exact by construction: −1 − k·2^-bits are doubles.
    cluster = [-1 - Fraction(k, 2**bits) for k in range(count)]
    assert roots_of(expanded(cluster)).tolist() == [float(r) for r in cluster]


def test_spread_over_twelve_decades() -> None:
    # Exact by construction: corners 1e-6 … 1e6 rad/s, each twice.
    corners = [-(Fraction(10) ** k) for k in range(-6, 7) for _ in range(2)]
    want = [float(c) for c in sorted(corners, reverse=True)]
    assert roots_of(expanded(corners)).tolist() == want


@pytest.mark.parametrize(
    ("coefficients", "want"),
    [
        ([5], []),
        ([0, 0, 5], []),
        ([0, 2, 3], [-1.5]),
        ([1, 0], [0]),
        ([3, 0, 0, 0], [0, 0, 0]),
        ([0, 1, 1, 0, 0], [0, 0, -1]),
        ([1e-300, 1e-300], [-1]),
        ([1, 1e20, 1], [-1e-20, -1e20]),
        ([-2, 4], [2]),
        ([np.float64(1), np.int64(-1)], [1]),
    ],
)
def test_degenerate_coefficients(coefficients: list[float], want: list[float]) -> None:
    # By hand; s² + 1e20 s + 1 has -1e20 and -1e-20 to 40 digits.
    assert roots_of(coefficients).tolist() == want


@pytest.mark.parametrize("seed", range(25))
def test_against_60_digits(seed: int) -> None:
    # Second method: mpmath.polyroots (Durand-Kerner) at 60 digits on the same decimals.
    rng = np.random.default_rng(seed)
    roots: list[complex] = []
    for _ in range(int(rng.integers(1, 5))):
        natural, damping = 10 ** rng.uniform(-3, 3), 10 ** rng.uniform(-3.3, 0)
        pair = natural * complex(-damping * rng.choice([-1, 1]), math.sqrt(1 - damping**2))
        roots += [pair, pair.conjugate()]
    roots += [complex(x) for x in -(10 ** rng.uniform(-3, 3, int(rng.integers(0, 6))))]
    coefficients = np.atleast_1d(np.poly(roots)).real.tolist()
    got = roots_of(coefficients)
    with mpmath.workdps(60):
        exact = [mpmath.mpf(repr(c)) for c in coefficients]
        found = [complex(r) for r in mpmath.polyroots(exact, maxsteps=2000, extraprec=1500)]
    want = np.array([complex(r.real, 0 if abs(r.imag) < 1e-40 * abs(r) else r.imag) for r in found])
    assert_same_roots(got, want, rtol=2 * ULP)


rationals = st.builds(Fraction, st.integers(-(10**6), 10**6), st.integers(1, 10**3))


@settings(deadline=None)
@given(st.lists(st.tuples(rationals, st.integers(1, 4)), min_size=1, max_size=5))
def test_rational_roots_come_back(roots: list[tuple[Fraction, int]]) -> None:
    each = [root for root, times in roots for _ in range(times)]
    assert sorted(roots_of(expanded(each)).real.tolist()) == sorted(map(float, each))


coefficient = st.one_of(st.integers(-20, 20), st.floats(-1e6, 1e6, allow_subnormal=False).map(lambda x: round(x, 6)))


@settings(deadline=None)
@given(st.lists(coefficient, min_size=1, max_size=12).filter(any))
def test_shape_of_the_answer(coefficients: list[float]) -> None:
    """Count, order and exact conjugates; sum and product of the roots by Vieta."""
    got = roots_of(coefficients)
    while coefficients[0] == 0:
        coefficients = coefficients[1:]
    assert len(got) == len(coefficients) - 1
    k = 0
    while k < len(got):
        if got[k].imag:
            assert got[k].imag > 0
            assert got[k + 1] == got[k].conjugate()
        k += 2 if got[k].imag else 1
    if len(got):
        total = -coefficients[1] / coefficients[0]
        np.testing.assert_allclose(got.sum(), total, rtol=1e-12, atol=1e-14 * np.abs(got).sum())
        product = coefficients[-1] / coefficients[0] * (-1) ** len(got)
        np.testing.assert_allclose(got.prod(), product, rtol=1e-12)


@settings(deadline=None, max_examples=30)
@given(st.lists(st.integers(-99, 99), min_size=2, max_size=9).filter(lambda c: c[0]), st.integers(1, 50))
def test_time_scale_only_scales_the_roots(coefficients: list[int], k: int) -> None:
    stretched = [c * 2 ** (k * j) for j, c in enumerate(coefficients)]
    np.testing.assert_array_equal(roots_of(stretched), roots_of(coefficients) * 2.0**k)


def test_close_but_not_equal_roots() -> None:
    # By hand: (s + 1)(s + 1 + 1e-15)(s + 2) in fractions: three roots, none merged.
    got = roots_of(expanded([Fraction(-1), -1 - Fraction(1, 10**15), Fraction(-2)]))
    assert got.tolist() == [-1.0, -1.000000000000001, -2.0]


@pytest.mark.parametrize(
    ("coefficients", "where", "word"),
    [
        ([], "", "at least one coefficient"),
        ([0, 0.0], "", "at least one coefficient that is not 0"),
        ([1, float("nan")], "[1]", "nan"),
        ([float("inf"), 1], "[0]", "inf"),
        ([1, "2"], "[1]", "must be a number"),
        ([1, None], "[1]", "must be a number"),
        ([1, 1j], "[1]", "must be a number"),
        ([True, 1], "[0]", "must be a number"),
        ([1, 10**400], "[1]", "beyond 1e308"),
        ([1, 1e200], "", "1e-30"),
        ([1, 1e-200], "", "check the units"),
        ([1, 1, 1e250], "", "check"),
        ([1, 0, 0, 1e-300], "", "check"),
        ([1, 0, 3, 1e300], "", "check its units"),
        ([1] * 10_001, "", "10001"),
    ],
)
def test_refused(coefficients: list[object], where: str, word: str) -> None:
    refused(lambda: roots_of(coefficients), where, word)


def test_roots_beyond_telling_apart_are_said() -> None:
    # M. Mignotte's polynomials s^n − 2(as − 1)² have two roots as close as a^(-(n+2)/2).
    refused(lambda: roots_of([1] + [0] * 37 + [-2 * 10**32, 4 * 10**16, -2]), "", "too close together")


def test_limit_is_a_setting() -> None:
    refused(lambda: roots_of([1, 2, 3], Limits(order=1)), "", "at most 2")
    assert len(roots_of([1, 2, 3], Limits(order=2))) == 2
