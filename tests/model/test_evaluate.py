"""Values of factored models against mpmath."""

from __future__ import annotations

import math

import mpmath
import numpy as np
import pytest

from engine.model import stages
from engine.model.evaluate import log_derivative, response
from engine.model.factored import Factored
from engine.model.factored_entry import factored_model


def exact_response(model: Factored, s: complex) -> mpmath.mpc:
    """The definition, at the precision in force."""
    at = mpmath.mpc(s)
    value = mpmath.mpf(model.gain) * mpmath.exp(-at * mpmath.mpf(model.dead_time_s))
    for zero in model.zeros:
        value *= at - mpmath.mpc(complex(zero))
    for pole in model.poles:
        value /= at - mpmath.mpc(complex(pole))
    return value


def random_model(seed: int) -> Factored:
    rng = np.random.default_rng(seed)
    zeros = [complex(x) for x in 10 ** rng.uniform(-3, 3, rng.integers(0, 5)) * rng.choice([-1, 1])]
    poles = [complex(x) for x in -(10 ** rng.uniform(-3, 3, rng.integers(0, 6)))]
    for _ in range(int(rng.integers(0, 3))):
        natural, damping = 10 ** rng.uniform(-3, 3), 10 ** rng.uniform(-3.3, 0)
        pair = natural * complex(-damping, math.sqrt(1 - damping**2))
        poles += [pair, pair.conjugate()]
    return factored_model(-2.5, zeros, poles, rng.choice([0.0, 0.3]))


@pytest.mark.parametrize("seed", range(20))
def test_response_and_slope_against_40_digits(seed: int) -> None:
    model = random_model(seed)
    s = np.array([0.01j, 1j, 17j, 500j, 0.3 - 2j, -0.7 + 0.1j])
    with mpmath.workdps(40):
        want = [complex(exact_response(model, x)) for x in s.tolist()]
        slope = [
            complex(sum(1 / (mpmath.mpc(x) - mpmath.mpc(complex(z))) for z in model.zeros)
                    - sum(1 / (mpmath.mpc(x) - mpmath.mpc(complex(p))) for p in model.poles)
                    - mpmath.mpf(model.dead_time_s))
            for x in s.tolist()
        ]  # fmt: skip
    # 30 roundings of factors, and 150 rad of dead time in the argument.
    np.testing.assert_allclose(response(model, s), want, rtol=5e-14)
    np.testing.assert_allclose(log_derivative(model, s), slope, rtol=1e-12, atol=1e-13)


def test_slope_is_the_derivative_of_the_logarithm() -> None:
    # Second method: mpmath's numerical derivative at 50 digits.
    model = random_model(3)
    with mpmath.workdps(50):
        want = complex(mpmath.diff(lambda x: mpmath.log(exact_response(model, x)), mpmath.mpc(0.2, 1.3)))
    np.testing.assert_allclose(log_derivative(model, 0.2 + 1.3j), want, rtol=1e-12)


@pytest.mark.parametrize("count", [1, 40, 60])
@pytest.mark.parametrize("size", [1e-9, 1e9, 1e20])
def test_intermediate_products_do_not_overflow(count: int, size: float) -> None:
    # By hand: 40 poles and 40 zeros at −size; at s = j·size each pair is 1, and 1e20^60 is far beyond a double.
    model = Factored(2.0, np.full(count, -size + 0j), np.full(count, -2 * size + 0j))
    want = 2 * ((1 + 1j) / (2 + 1j)) ** count
    np.testing.assert_allclose(response(model, 1j * size), want, rtol=1e-13)


def test_a_huge_gain_meets_a_tiny_product() -> None:
    # By hand: 1e300 / (s + 1e10)^30 at s = 0 is 1; the product alone is 1e-300. Once more with 31 poles: 1e-10.
    for count, want in ((30, 1.0), (31, 1e-10)):
        model = Factored(1e300, np.empty(0, complex), np.full(count, -1e10 + 0j))
        np.testing.assert_allclose(response(model, [0, 1j]), want, rtol=1e-8)


def test_at_roots() -> None:
    model = factored_model(3, [-1], [0, -2, [0, 5], [0, -5]])
    assert np.isinf(response(model, [0, -2, 5j])).all()
    assert response(model, -1) == 0
    hidden = factored_model(3, [2], [2])
    assert np.isnan(response(hidden, 2))
    assert response(hidden, 3j) == 3


def test_shapes() -> None:
    model = stages.integrator()
    assert response(model, 2.0).shape == ()
    assert response(model, np.ones((2, 3), complex)).shape == (2, 3)
    assert log_derivative(model, np.ones((2, 3), complex)).shape == (2, 3)
    np.testing.assert_array_equal(response(factored_model(4, [], []), [1j, 2j]), [4, 4])
    np.testing.assert_array_equal(log_derivative(factored_model(4, [], [], 0.5), [1j]), [-0.5])


def test_series_connection_multiplies_values() -> None:
    first, second = random_model(5), random_model(6)
    s = 1j * np.logspace(-3, 3, 13)
    np.testing.assert_allclose(response(first * second, s), response(first, s) * response(second, s), rtol=1e-13)
    assert (first * second).relative_degree == first.relative_degree + second.relative_degree
