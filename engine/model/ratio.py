"""Exact arithmetic on rational functions that stay products: what an expression is worked out with."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from fractions import Fraction
from typing import TypeAlias

from engine.model.exact import IntPolynomial, plus, split_content, times

Factors: TypeAlias = Mapping[IntPolynomial, int]
"""Multiplicity of each factor: primitive polynomials of degree 1 or more, leading coefficient positive."""


class TooLargeError(ArithmeticError):
    """The exact result would be out of all proportion; the message says how."""


@dataclass
class Budget:
    """Bounds the order and the work of one expression, so that any text is answered quickly."""

    order: int
    coefficient_bits: int = 20_000
    work_left: int = 3_000_000

    def spend(self, work: int) -> None:
        """Count work (about 100 ns a unit)."""
        self.work_left -= work
        if self.work_left < 0:
            raise TooLargeError("the formula takes too long to work out; give the model as zeros and poles")


@dataclass(frozen=True)
class Ratio:
    """content · Π factor^m / Π factor^m · exp(−s · dead_time). Common factors are kept on both sides."""

    content: Fraction
    top: Factors = field(default_factory=dict)
    bottom: Factors = field(default_factory=dict)
    dead_time: Fraction = Fraction(0)

    @property
    def is_constant(self) -> bool:
        """No s in it anywhere."""
        return self.content == 0 or not (self.top or self.bottom or self.dead_time)


VARIABLE = Ratio(Fraction(1), {(1, 0): 1})
"""s itself."""


def product(left: Ratio, right: Ratio, budget: Budget) -> Ratio:
    """left · right."""
    result = Ratio(
        left.content * right.content,
        _joined(left.top, right.top),
        _joined(left.bottom, right.bottom),
        left.dead_time + right.dead_time,
    )
    return _checked(result, budget)


def quotient(left: Ratio, right: Ratio, budget: Budget) -> Ratio:
    """left / right; right is not 0."""
    return product(left, Ratio(1 / right.content, right.bottom, right.top, -right.dead_time), budget)


def power(base: Ratio, exponent: int, budget: Budget) -> Ratio:
    """base^exponent; base is not 0 where the exponent is negative."""
    if exponent < 0:
        return quotient(Ratio(Fraction(1)), power(base, -exponent, budget), budget)
    bits = base.content.numerator.bit_length() + base.content.denominator.bit_length()
    if bits * exponent > 2 * budget.coefficient_bits:
        raise TooLargeError("the number is beyond the range of numbers, 1e-308 to 1e308")
    if exponent == 0:
        return Ratio(Fraction(1))
    result = Ratio(
        base.content**exponent,
        {factor: m * exponent for factor, m in base.top.items()},
        {factor: m * exponent for factor, m in base.bottom.items()},
        base.dead_time * exponent,
    )
    return _checked(result, budget)


def total(left: Ratio, right: Ratio, budget: Budget) -> Ratio:
    """left + right over their least common denominator; both have the same dead time, or one is 0.

    A denominator factor that both share is written once: 1/s + 1/s² has one double pole at 0, as a person
    would write it, not a third pole hidden under a zero.
    """
    if left.content == 0 or right.content == 0:
        return right if left.content == 0 else left
    bottom = {f: max(left.bottom.get(f, 0), right.bottom.get(f, 0)) for f in {**left.bottom, **right.bottom}}
    shared = {f: min(m, right.top[f]) for f, m in left.top.items() if f in right.top}
    expanded = plus(
        *(_scaled_numerator(part, bottom, shared, other.content.denominator, budget)
          for part, other in ((left, right), (right, left)))
    )  # fmt: skip
    denominator = left.content.denominator * right.content.denominator
    content, rest = split_content(Fraction(c) for c in expanded)
    top = dict(shared) if len(rest) < 2 else _joined(shared, {rest: 1})
    if content == 0:
        return Ratio(Fraction(0))
    return _checked(Ratio(content / denominator, top, bottom, left.dead_time), budget)


def _scaled_numerator(part: Ratio, bottom: Factors, shared: Factors, scale: int, budget: Budget) -> IntPolynomial:
    expanded: IntPolynomial = (part.content.numerator * scale,)
    lacking = {f: m - part.bottom.get(f, 0) for f, m in bottom.items()}
    own = {f: m - shared.get(f, 0) for f, m in part.top.items()}
    if sum(m * (len(f) - 1) for group in (lacking, own) for f, m in group.items()) > 2 * budget.order:
        raise TooLargeError(f"the sum has more than {budget.order} roots")
    for group in (lacking, own):
        for factor, multiplicity in group.items():
            for _ in range(multiplicity):
                size = max(c.bit_length() for c in expanded) // 500 + max(c.bit_length() for c in factor) // 500
                budget.spend(len(expanded) * len(factor) * (1 + size))
                expanded = times(expanded, factor)
    return expanded


def _joined(left: Factors, right: Factors) -> Factors:
    if not left or not right:
        return left or right
    result = dict(left)
    for factor, multiplicity in right.items():
        result[factor] = result.get(factor, 0) + multiplicity
    return result


def _checked(result: Ratio, budget: Budget) -> Ratio:
    budget.spend(50 + 10 * (len(result.top) + len(result.bottom)))
    for factors in (result.top, result.bottom):
        if sum(m * (len(f) - 1) for f, m in factors.items()) > budget.order:
            raise TooLargeError(f"the order is above {budget.order}")
        if any(c.bit_length() > budget.coefficient_bits for f in factors for c in f):
            raise TooLargeError("the coefficients are out of range; check the units")
    size = max(result.content.numerator.bit_length(), result.content.denominator.bit_length())
    if size > budget.coefficient_bits:
        raise TooLargeError("the number is beyond the range of numbers, 1e-308 to 1e308")
    return result
