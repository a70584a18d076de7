"""Exact numbers and exact polynomials: integer coefficients, greatest common divisors, repeated factors.

A polynomial is a tuple of integers, highest power first, without leading zeros; () is the zero polynomial.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from fractions import Fraction
from numbers import Integral, Rational, Real
from typing import TypeAlias

from engine.errors import DesignError

IntPolynomial: TypeAlias = tuple[int, ...]

# Exponents of Mersenne primes (OEIS A000043): ready-made primes of any size that the arithmetic asks for.
MERSENNE_EXPONENTS = (61, 127, 521, 1279, 2203, 3217, 4423, 9689, 11213, 19937, 44497)


def exact_number(number: object, where: str) -> Fraction:
    """The number as a fraction; a double is read as the shortest decimal that prints as it.

    So 0.2 means 1/5, not the nearest binary fraction: (s + 0.1)² typed as coefficients 1, 0.2, 0.01 has its
    double root at -0.1 exactly. Against the binary value this moves a number by at most half a unit in its
    last place, as reading the text did.

    Raises DesignError at `where` for anything but a finite real number.
    """
    if isinstance(number, bool) or not isinstance(number, Real):
        raise DesignError(where, f"must be a number, is {_shown(number)}")
    try:
        approximate = float(number)
    except OverflowError:
        raise DesignError(where, "must be a finite number, is beyond 1e308") from None
    if not math.isfinite(approximate):
        raise DesignError(where, f"must be a finite number, is {approximate}")
    if isinstance(number, Integral):
        return Fraction(int(number))
    if isinstance(number, Rational):
        return Fraction(int(number.numerator), int(number.denominator))
    return Fraction(repr(approximate))


def _shown(number: object) -> str:
    text = repr(number)
    return text if len(text) <= 40 else text[:37] + "..."


def trimmed(coefficients: Sequence[int]) -> IntPolynomial:
    """Without leading zeros."""
    first = next((k for k, c in enumerate(coefficients) if c), len(coefficients))
    return tuple(coefficients[first:])


def split_content(coefficients: Iterable[Fraction]) -> tuple[Fraction, IntPolynomial]:
    """content · polynomial, the polynomial with coprime integers and a positive leading one.

    The zero polynomial gives (0, ()).
    """
    listed = list(coefficients)
    scale = math.lcm(*(c.denominator for c in listed))
    integers = trimmed([int(c * scale) for c in listed])
    if not integers:
        return Fraction(0), ()
    divisor = math.gcd(*integers) * (1 if integers[0] > 0 else -1)
    return Fraction(divisor, scale), tuple(c // divisor for c in integers)


def primitive(polynomial: Sequence[int]) -> IntPolynomial:
    """The polynomial over the greatest common divisor of its coefficients, leading coefficient positive."""
    cut = trimmed(polynomial)
    if not cut:
        return ()
    divisor = math.gcd(*cut) * (1 if cut[0] > 0 else -1)
    return tuple(c // divisor for c in cut)


def times(left: Sequence[int], right: Sequence[int]) -> IntPolynomial:
    """The product of two polynomials."""
    if not left or not right:
        return ()
    product = [0] * (len(left) + len(right) - 1)
    for i, a in enumerate(left):
        if a:
            for j, b in enumerate(right):
                product[i + j] += a * b
    return tuple(product)


def plus(left: Sequence[int], right: Sequence[int]) -> IntPolynomial:
    """The sum of two polynomials."""
    length = max(len(left), len(right))
    padded = ([0] * (length - len(p)) + list(p) for p in (left, right))
    return trimmed([a + b for a, b in zip(*padded, strict=True)])


def derivative(polynomial: Sequence[int]) -> IntPolynomial:
    """d/ds."""
    degree = len(polynomial) - 1
    return tuple(c * (degree - k) for k, c in enumerate(polynomial[:-1]))


def mirrored(polynomial: Sequence[int]) -> IntPolynomial:
    """p(-s), up to sign: leading coefficient kept."""
    return tuple(-c if k % 2 else c for k, c in enumerate(polynomial))


def exact_quotient(polynomial: Sequence[int], divisor: Sequence[int]) -> IntPolynomial | None:
    """polynomial / divisor where it divides with integers throughout, else None."""
    rest = list(polynomial)
    quotient = []
    for k in range(len(polynomial) - len(divisor) + 1):
        factor, remainder = divmod(rest[k], divisor[0])
        if remainder:
            return None
        quotient.append(factor)
        if factor:
            for j, d in enumerate(divisor):
                rest[k + j] -= factor * d
    return tuple(quotient) if not any(rest) else None


def common_divisor(left: IntPolynomial, right: IntPolynomial) -> IntPolynomial:
    """Greatest common divisor of two primitive polynomials, itself primitive; (1,) where they are coprime.

    Computed modulo Mersenne primes of growing size and proven by exact division: the degree modulo a prime
    that does not divide the leading coefficients is never too small, so a candidate that divides both is it.
    """
    if not left or not right:
        return left or right
    leading = math.gcd(left[0], right[0])
    for exponent in MERSENNE_EXPONENTS:
        prime = (1 << exponent) - 1
        if left[0] % prime == 0 or right[0] % prime == 0:
            continue
        found = _divisor_modulo(left, right, prime)
        if len(found) == 1:
            return (1,)
        lift = leading * pow(found[0], -1, prime) % prime
        candidate = primitive([_centred(c * lift % prime, prime) for c in found])
        if exact_quotient(left, candidate) is not None and exact_quotient(right, candidate) is not None:
            return candidate
    # Only coefficients of more than 13 000 digits come here; the limits at entry keep them out.
    raise DesignError("", "has coefficients too long to factor; give the model as zeros and poles")


def _centred(residue: int, prime: int) -> int:
    return residue - prime if residue > prime // 2 else residue


def _divisor_modulo(left: IntPolynomial, right: IntPolynomial, prime: int) -> list[int]:
    """Euclid's algorithm with cross-multiplied remainders, which need no inverse modulo the prime."""
    a = [c % prime for c in left]
    b = [c % prime for c in right]
    if len(a) < len(b):
        a, b = b, a
    while b:
        while len(a) >= len(b):
            top_a, top_b = a[0], b[0]
            head = [(top_b * x - top_a * y) % prime for x, y in zip(a, b, strict=False)]
            tail = [top_b * x % prime for x in a[len(b) :]]
            a = list(trimmed(head + tail))
        a, b = b, a
    return a


def repeated_factors(polynomial: IntPolynomial) -> list[tuple[IntPolynomial, int]]:
    """Factors without repeated roots and their multiplicity; their product is the primitive polynomial.

    Source: R. G. Tobey / E. Horowitz square-free decomposition, as in Knuth, TAOCP vol. 2, 4.6.2 exercise 34
    (from memory; the tests pin it by multiplying the factors back).
    """
    whole = primitive(polynomial)
    repeated = common_divisor(whole, primitive(derivative(whole)))
    single = _quotient(whole, repeated)
    factors = []
    multiplicity = 1
    while len(single) > 1:
        shared = common_divisor(single, repeated)
        here = _quotient(single, shared)
        if len(here) > 1:
            factors.append((here, multiplicity))
        single, repeated = shared, _quotient(repeated, shared)
        multiplicity += 1
    return factors


def _quotient(polynomial: IntPolynomial, divisor: IntPolynomial) -> IntPolynomial:
    quotient = exact_quotient(polynomial, divisor)
    if quotient is None:
        raise ArithmeticError("a common divisor does not divide")
    return primitive(quotient)
