"""Exact polynomial arithmetic against sympy."""

from __future__ import annotations

from fractions import Fraction

import sympy
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from engine.model.exact import (
    IntPolynomial,
    common_divisor,
    exact_number,
    exact_quotient,
    primitive,
    repeated_factors,
    split_content,
    times,
)

S = sympy.Symbol("s")
polynomials = st.lists(st.integers(-30, 30), min_size=1, max_size=5).map(primitive).filter(bool)
long_polynomials = st.lists(st.integers(-(10**40), 10**40), min_size=1, max_size=6).map(primitive).filter(bool)


def as_sympy(polynomial: IntPolynomial) -> sympy.Poly:
    return sympy.Poly(list(polynomial), S, domain="ZZ")


@settings(deadline=None)
@given(polynomials, polynomials, st.one_of(polynomials, long_polynomials))
def test_greatest_common_divisor(left: IntPolynomial, right: IntPolynomial, shared: IntPolynomial) -> None:
    a, b = times(left, shared), times(right, shared)
    want = sympy.gcd(as_sympy(a), as_sympy(b)).primitive()[1]
    assert common_divisor(a, b) == primitive([int(c) for c in want.all_coeffs()])


@settings(deadline=None)
@given(st.lists(st.tuples(polynomials, st.integers(1, 5)), min_size=1, max_size=3))
def test_repeated_factors_multiply_back(parts: list[tuple[IntPolynomial, int]]) -> None:
    whole: IntPolynomial = (1,)
    for part, multiplicity in parts:
        for _ in range(multiplicity):
            whole = times(whole, part)
    assume(whole[-1] != 0)
    factors = repeated_factors(whole)
    product: IntPolynomial = (1,)
    for factor, multiplicity in factors:
        for _ in range(multiplicity):
            product = times(product, factor)
    assert product == primitive(whole)
    assert all(as_sympy(factor).is_sqf for factor, _ in factors)
    want = sympy.sqf_list(as_sympy(whole))[1]
    assert sorted((len(f) - 1, m) for f, m in factors) == sorted((p.degree(), m) for p, m in want)


def test_quotient_only_where_it_divides() -> None:
    # By hand: (s + 1)(s + 2) / (s + 1); (s² + 1) / (s + 1) leaves 2; (s + 1) / (2 s + 2) is not integer.
    assert exact_quotient((1, 3, 2), (1, 1)) == (1, 2)
    assert exact_quotient((1, 0, 1), (1, 1)) is None
    assert exact_quotient((1, 1), (2, 2)) is None


def test_content() -> None:
    # By hand: −s/2 + 3/4 = −1/4 · (2 s − 3).
    assert split_content([Fraction(0), Fraction(-1, 2), Fraction(3, 4)]) == (Fraction(-1, 4), (2, -3))
    assert split_content([Fraction(0)]) == (0, ())


@given(st.floats(allow_nan=False, allow_infinity=False))
def test_a_double_is_read_as_its_shortest_decimal(number: float) -> None:
    assert float(exact_number(number, "")) == number
    assert exact_number(number, "") == Fraction(str(number))
