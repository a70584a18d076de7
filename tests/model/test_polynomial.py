"""Coefficient models: exact gain and roots, nothing cancelled."""

from __future__ import annotations

import math
from collections.abc import Callable

import mpmath
import numpy as np
import pytest

from engine.model.evaluate import response
from engine.model.factored import Factored
from engine.model.polynomial import from_coefficients
from tests.model.refusal import refused


def test_by_hand() -> None:
    # By hand: (2 s + 80) / (0.5 s³ + s² + 450 s) = 4 (s + 40) / (s (s² + 2 s + 900)).
    model = from_coefficients([2, 80], [0.5, 1, 450, 0], 0.002)
    assert model.gain == 4
    assert model.zeros.tolist() == [-40]
    assert model.poles[0] == 0
    np.testing.assert_allclose(model.poles[1], complex(-1, math.sqrt(899)), rtol=3e-16)
    assert model.dead_time_s == 0.002


def test_common_factors_stay() -> None:
    # By hand: (s − 1)(s + 2) / ((s − 1)(s + 3)): a hidden unstable mode must not vanish.
    model = from_coefficients([1, 1, -2], [1, 2, -3])
    assert model.zeros.tolist() == [1, -2]
    assert model.poles.tolist() == [1, -3]


def test_an_irrational_common_factor_comes_out_equal() -> None:
    # By hand: s³ + s − 1 is irreducible; times s + 2 above and s + 3 below its roots stay equal to the last place.
    model = from_coefficients([1, 2, 1, 1, -2], [1, 3, 1, 2, -3])
    assert set(model.zeros.tolist()) - {-2} == set(model.poles.tolist()) - {-3}
    assert len(set(model.zeros.tolist()) & set(model.poles.tolist())) == 3


@pytest.mark.parametrize("seed", range(10))
def test_value_against_40_digits(seed: int) -> None:
    # Second method: both polynomials by Horner's rule at 40 digits; corners over six decades.
    rng = np.random.default_rng(seed)
    numerator = np.poly(-(10 ** rng.uniform(-3, 3, 4))).tolist()
    denominator = (-3.5 * np.poly(-(10 ** rng.uniform(-3, 3, 7)))).tolist()
    s = [0.002j, 0.9j, 70j, 4000j]
    with mpmath.workdps(40):
        want = [
            complex(mpmath.polyval([mpmath.mpf(repr(c)) for c in numerator], x)
                    / mpmath.polyval([mpmath.mpf(repr(c)) for c in denominator], x))
            for x in s
        ]  # fmt: skip
    np.testing.assert_allclose(response(from_coefficients(numerator, denominator), s), want, rtol=1e-14)


def test_improper_and_constant_models() -> None:
    assert from_coefficients([1, 0, 0], [2]).zeros.tolist() == [0, 0]
    assert from_coefficients([3], [0, -2]).gain == -1.5
    assert from_coefficients([1, 2], [4]).relative_degree == -1


@pytest.mark.parametrize(
    ("build", "where", "words"),
    [
        (lambda: from_coefficients([], [1]), "numerator", ["at least one coefficient"]),
        (lambda: from_coefficients([0, 0], [1]), "numerator", ["not 0"]),
        (lambda: from_coefficients([1], [0]), "denominator", ["not 0"]),
        (lambda: from_coefficients([1], [1, 2, "x"]), "denominator[2]", ["must be a number", "'x'"]),
        (lambda: from_coefficients([1, float("nan")], [1]), "numerator[1]", ["finite"]),
        (lambda: from_coefficients([1], [1, 1e200]), "denominator", ["root", "units"]),
        (lambda: from_coefficients([1], [1] * 10_000), "denominator", ["10000", "at most 61"]),
        (lambda: from_coefficients([1e300], [1e-300]), "numerator", ["gain"]),
        (lambda: from_coefficients([1e-300], [1e300]), "numerator", ["gain"]),
        (lambda: from_coefficients([1], [1, 1], -1), "dead_time_s", ["0 or greater"]),
    ],
)
def test_refused(build: Callable[[], Factored], where: str, words: list[str]) -> None:
    refused(build, where, *words)
