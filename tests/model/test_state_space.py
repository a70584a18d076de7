"""State-space models: exact poles and zeros, hidden modes, shapes."""

from __future__ import annotations

from collections.abc import Callable
from fractions import Fraction

import numpy as np
import pytest
import sympy
from hypothesis import given, settings
from hypothesis import strategies as st

from engine.model.characteristic import characteristic_polynomial
from engine.model.evaluate import response
from engine.model.factored import Factored
from engine.model.polynomial import from_coefficients
from engine.model.state_space import from_state_space
from tests.model.refusal import refused


def test_controllable_canonical_form() -> None:
    # By hand: 1/(s² + 2s + 900) from position and (s + 40) from c = [40, 1].
    model = from_state_space([[0, 1], [-900, -2]], [0, 1], [40, 1], 0)
    want = from_coefficients([1, 40], [1, 2, 900])
    assert model.gain == 1
    assert model.zeros.tolist() == want.zeros.tolist()
    assert model.poles.tolist() == want.poles.tolist()


@pytest.mark.parametrize(
    ("b", "c", "hidden"),
    [([1, 0], [1, 1], 2), ([1, 1], [1, 0], 2), ([0, 1], [1, 1], -1), ([1, 1], [0, 1], -1)],
    ids=["not reached", "not seen", "not reached (stable)", "not seen (stable)"],
)
def test_hidden_modes_stay_as_equal_pole_and_zero(b: list[float], c: list[float], hidden: float) -> None:
    # By hand: a = diag(−1, 2).
    model = from_state_space([[-1, 0], [0, 2]], b, c, 0)
    assert model.poles.tolist() == [-1, 2]
    assert model.zeros.tolist() == [hidden]


def test_hidden_mode_behind_a_full_matrix() -> None:
    # By hand: t·diag(−0.1, 0.3, −2)·t⁻¹ with t = [[1,1,0],[0,1,1],[0,0,1]]; b = t·[1,0,1], c·t = [1,1,1].
    t = sympy.Matrix([[1, 1, 0], [0, 1, 1], [0, 0, 1]])
    a = t * sympy.diag(sympy.Rational(-1, 10), sympy.Rational(3, 10), -2) * t.inv()
    b = t * sympy.Matrix([1, 0, 1])
    c = sympy.Matrix([[1, 1, 1]]) * t.inv()
    model = from_state_space(
        np.array(a, dtype=float).tolist(), np.array(b, dtype=float).tolist(), np.array(c, dtype=float).tolist(), 0
    )
    assert model.poles.tolist() == [-0.1, 0.3, -2]
    # Without the mode at 0.3: 1/(s + 0.1) + 1/(s + 2) = 2 (s + 1.05)/…
    assert sorted(model.zeros.real.tolist()) == [-1.05, 0.3]
    assert model.gain == 2


def test_direct_path() -> None:
    # By hand: 0.5 + 1/(s + 1) = 0.5 (s + 3)/(s + 1); and d alone.
    model = from_state_space([[-1]], [1], [1], 0.5)
    assert (model.gain, model.zeros.tolist(), model.poles.tolist()) == (0.5, [-3], [-1])
    static = from_state_space([], [], [], -3)
    assert (static.gain, len(static.zeros), len(static.poles)) == (-3, 0, 0)


def test_rigid_body_is_exactly_at_zero() -> None:
    # By hand: a double integrator with a mode; 1/s² + 0.1/(s² + 0.02 s + 400).
    a = [[0, 1, 0, 0], [0, 0, 0, 0], [0, 0, 0, 1], [0, 0, -400, -0.02]]
    model = from_state_space(a, [0, 1, 0, 1], [1, 0, 0.1, 0], 0, 0.001)
    assert model.poles[:2].tolist() == [0, 0]
    np.testing.assert_allclose(model.poles[2:].real, -0.01, rtol=2e-16)
    want = from_coefficients([1.1, 0.02, 400], [1])
    assert model.zeros.tolist() == want.zeros.tolist()
    assert (model.gain, model.dead_time_s) == (1.1, 0.001)


@pytest.mark.parametrize("seed", range(8))
def test_against_the_resolvent(seed: int) -> None:
    # Second method: c (s − a)⁻¹ b + d by linear solution at points; poles by numpy's eigenvalues.
    rng = np.random.default_rng(seed)
    n = int(rng.integers(1, 13))
    a = rng.normal(size=(n, n)) * 10 ** rng.uniform(-2, 2, (n, n))
    b, c, d = rng.normal(size=(n, 1)), rng.normal(size=(1, n)), rng.choice([0.0, 0.7])
    model = from_state_space(a, b, c, d)
    s = np.array([0.1j, 3j + 1, 200j])
    want = [(c @ np.linalg.solve(x * np.eye(n) - a, b))[0, 0] + d for x in s]
    np.testing.assert_allclose(response(model, s), want, rtol=1e-8)
    scale = np.linalg.norm(a)
    eigenvalues = list(np.linalg.eigvals(a))
    for pole in model.poles:
        nearest = min(eigenvalues, key=lambda e: abs(e - pole))
        assert abs(nearest - pole) < 1e-10 * scale
        eigenvalues.remove(nearest)


entries = st.one_of(st.integers(-9, 9).map(Fraction), st.fractions(-100, 100, max_denominator=1000))


@settings(deadline=None, max_examples=60)
@given(st.integers(1, 6).flatmap(lambda n: st.lists(st.lists(entries, min_size=n, max_size=n), min_size=n, max_size=n)))
def test_characteristic_polynomial_against_sympy(matrix: list[list[Fraction]]) -> None:
    want = sympy.Matrix([[sympy.Rational(x.numerator, x.denominator) for x in row] for row in matrix]).charpoly()
    assert characteristic_polynomial(matrix, "a") == [Fraction(int(c.p), int(c.q)) for c in want.all_coeffs()]


def test_companion_matrix_of_order_40() -> None:
    # By hand: the companion matrix of Π(s + k), k = 1…40, has the poles −1…−40.
    coefficients = [1]
    for k in range(1, 41):
        coefficients = [a + k * b for a, b in zip([*coefficients, 0], [0, *coefficients], strict=True)]
    a = [[0] * k + [0, 1] + [0] * (38 - k) for k in range(39)] + [[-c for c in coefficients[:0:-1]]]
    model = from_state_space(a, [0] * 39 + [1], [1] + [0] * 39, 0)
    assert model.poles.tolist() == [-k for k in range(1, 41)]
    assert (model.gain, len(model.zeros)) == (1, 0)


SQUARE = [[0, 1], [-2, -3]]


@pytest.mark.parametrize(
    ("build", "where", "words"),
    [
        (lambda: from_state_space(5, [1], [1]), "a", ["list of rows"]),
        (lambda: from_state_space([1, 2], [1], [1]), "a[0]", ["list of numbers"]),
        (lambda: from_state_space([[1, 2]], [1], [1]), "a[0]", ["must have 1 numbers", "has 2"]),
        (lambda: from_state_space([[1, 2], [3]], [1, 1], [1, 1]), "a[1]", ["must have 2 numbers", "has 1"]),
        (lambda: from_state_space([[0, 1], ["x", 1]], [1, 1], [1, 1]), "a[1][0]", ["must be a number"]),
        (lambda: from_state_space([[0, 1], [float("nan"), 1]], [1, 1], [1, 1]), "a[1][0]", ["finite"]),
        (lambda: from_state_space(SQUARE, [1], [1, 1]), "b", ["must have 2 numbers", "has 1"]),
        (lambda: from_state_space(SQUARE, [[1, 2], [3, 4]], [1, 1]), "b[0]", ["one input"]),
        (lambda: from_state_space(SQUARE, [[1], ["x"]], [1, 1]), "b[1][0]", ["must be a number"]),
        (lambda: from_state_space(SQUARE, [1, [2]], [1, 1]), "b[1]", ["must be a number"]),
        (lambda: from_state_space(SQUARE, [1, 1], [1, 1, 1]), "c", ["must have 2 numbers", "has 3"]),
        (lambda: from_state_space(SQUARE, [1, 1], [[1, 1], [1, 1]]), "c", ["one row", "2 rows"]),
        (lambda: from_state_space(SQUARE, [1, 1], [[1, None]]), "c[0][1]", ["must be a number"]),
        (lambda: from_state_space(SQUARE, "ab", [1, 1]), "b", ["list of numbers", "'ab'"]),
        (lambda: from_state_space(SQUARE, [1, 1], [1, 1], [[1, 2]]), "d[0]", ["one number", "has 2"]),
        (lambda: from_state_space(SQUARE, [1, 1], [1, 1], "0"), "d", ["must be a number"]),
        (lambda: from_state_space(SQUARE, [1, 1], [1, 1], np.array(np.nan)), "d", ["must be a number"]),
        (lambda: from_state_space(SQUARE, [0, 0], [1, 1], 0), "b", ["no path"]),
        (lambda: from_state_space(SQUARE, [1, 1], [1, 1], 0, -1), "dead_time_s", ["0 or greater"]),
        (lambda: from_state_space([[0.0] * 100] * 100, [1] * 100, [1] * 100), "a", ["100 rows", "at most 60"]),
        (lambda: from_state_space([[1e40]], [1], [1]), "a", ["root", "units"]),
        (lambda: from_state_space([[0, 1], [0, -1]], [0, 1], [1e35, 1]), "c", ["root", "1e+35"]),
        (lambda: from_state_space([[1e300, 1e-300] * 20] * 40, [1] * 40, [1] * 40), "a", ["too many digits"]),
    ],
)
def test_refused(build: Callable[[], Factored], where: str, words: list[str]) -> None:
    refused(build, where, *words)
