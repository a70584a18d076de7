"""Roots of a polynomial from its coefficients: multiplicity, real or complex, on the axis or not, all exact.

The coefficients are exact fractions, so a repeated root is found by a greatest common divisor and comes out
repeated, and only the separated rest is iterated for. Expanded (s + 1)^12 gives twelve roots at exactly -1;
an eigenvalue method on the same coefficients scatters them by 0.09.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from fractions import Fraction

import numpy as np

from engine.errors import DesignError
from engine.model.exact import (
    IntPolynomial,
    common_divisor,
    exact_number,
    exact_quotient,
    mirrored,
    repeated_factors,
    split_content,
)
from engine.model.factored import ComplexArray
from engine.model.isolate import ExactComplex, separated_roots
from engine.model.limits import DEFAULT_LIMITS, LARGEST_ROOT_RAD_S, SMALLEST_ROOT_RAD_S, Limits, require_items

ROOT_BITS = 160


def roots_of(coefficients: Sequence[object], limits: Limits = DEFAULT_LIMITS) -> ComplexArray:
    """All roots, each correct to the last place or the one before, in ascending magnitude.

    Parameters
    ----------
    coefficients : real numbers, highest power first; leading zeros only lower the order. Doubles are read as
        the shortest decimal that prints as them; int and Fraction are taken as they are.

    Returns
    -------
    (n,) array [rad/s]; a real root has imaginary part 0, a root on the imaginary axis has real part 0, a
    complex root (upper half plane first) is followed by its exact conjugate

    Raises DesignError: `[k]` for a coefficient that is not a finite number, "" where all are zero, where there
    are too many, or where a root is outside 1e-30 … 1e30 rad/s.
    """
    _, polynomial = exact_polynomial(coefficients, limits)
    return roots_of_exact(polynomial)


def exact_polynomial(coefficients: Sequence[object], limits: Limits = DEFAULT_LIMITS) -> tuple[Fraction, IntPolynomial]:
    """Leading coefficient, and the polynomial scaled to coprime integers; errors as in `roots_of`."""
    require_items(coefficients, limits.order + 1, "", "coefficients")
    exact = [exact_number(c, f"[{k}]") for k, c in enumerate(coefficients)]
    if not any(exact):
        raise DesignError("", "needs at least one coefficient that is not 0")
    content, polynomial = split_content(exact)
    return content * polynomial[0], polynomial


def roots_of_exact(polynomial: IntPolynomial) -> ComplexArray:
    """The same for a polynomial that is exact already (integers, highest power first, not zero)."""
    last = max(k for k, c in enumerate(polynomial) if c)
    found: list[ExactComplex] = []
    for factor, multiplicity in repeated_factors(polynomial[: last + 1]):
        found += _roots_of_factor(factor) * multiplicity
    listed: list[complex] = [0j] * (len(polynomial) - 1 - last)
    for root in sorted((_rounded(r) for r in found), key=lambda r: (abs(r), r.real, r.imag)):
        listed += [root, root.conjugate()] if root.imag else [root]
    return np.array(listed, dtype=np.complex128)


def _rounded(root: ExactComplex) -> complex:
    try:
        rounded = complex(float(root[0]), float(root[1]))
        size = abs(rounded)
    except OverflowError:
        size = math.inf
    if not SMALLEST_ROOT_RAD_S <= size <= LARGEST_ROOT_RAD_S:
        raise DesignError(
            "",
            f"has a root of size {size:.3g} rad/s; roots are 0 or from {SMALLEST_ROOT_RAD_S:g} to "
            f"{LARGEST_ROOT_RAD_S:g} rad/s: check the units",
        )
    return rounded


def _roots_of_factor(factor: IntPolynomial) -> list[ExactComplex]:
    """Roots of a factor without repeated roots and without root 0; one for each conjugate pair."""
    if len(factor) <= 3:
        return _closed_form(factor)
    # Roots that lie symmetrically about 0 include all that lie exactly on the imaginary axis. They are split off
    # and found as roots in s², so that "on the axis" is decided exactly, not by a tolerance.
    symmetric = common_divisor(factor, mirrored(factor))
    if len(symmetric) == 1:
        return separated_roots(factor)
    rest = exact_quotient(factor, symmetric) or (1,)
    squares = _roots_of_factor(symmetric[::2])
    return [root for square in squares for root in _square_roots(square)] + _roots_of_factor(rest)


def _closed_form(factor: IntPolynomial) -> list[ExactComplex]:
    if len(factor) == 1:
        return []
    if len(factor) == 2:
        return [(Fraction(-factor[1], factor[0]), Fraction(0))]
    a, b, c = factor
    discriminant = b * b - 4 * a * c
    if discriminant < 0:
        return [(Fraction(-b, 2 * a), _root_of(Fraction(-discriminant)) / abs(2 * a))]
    # The larger root first, the other from the product: the difference of near equals never arises.
    larger = (-b - _root_of(Fraction(discriminant)) * (1 if b >= 0 else -1)) / (2 * a)
    return [(larger, Fraction(0)), (Fraction(c, a) / larger, Fraction(0))]


def _root_of(number: Fraction) -> Fraction:
    """Square root of a number >= 0 to ROOT_BITS bits or more, exact where it is a fraction."""
    shift = max(ROOT_BITS - (number.numerator * number.denominator).bit_length() // 2, 0)
    return Fraction(math.isqrt(number.numerator * number.denominator << 2 * shift), number.denominator << shift)


def _square_roots(square: ExactComplex) -> list[ExactComplex]:
    """Both roots of a real square, or those of its complex square that lie in the upper half plane."""
    real, imaginary = square
    if imaginary == 0:
        root = _root_of(abs(real))
        return [(Fraction(0), root)] if real < 0 else [(root, Fraction(0)), (-root, Fraction(0))]
    size = _root_of(real * real + imaginary * imaginary)
    # The larger component from a sum of like signs, the other from the product.
    larger = _root_of((size + abs(real)) / 2)
    smaller = imaginary / (2 * larger)
    re, im = (larger, smaller) if real >= 0 else (smaller, larger)
    return [(re, im), (-re, im)]
