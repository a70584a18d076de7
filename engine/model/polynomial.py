"""Models given as numerator and denominator coefficients."""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction

from engine.errors import DesignError
from engine.model.exact import IntPolynomial
from engine.model.factored import Factored
from engine.model.factored_entry import dead_time
from engine.model.limits import DEFAULT_LIMITS, Limits
from engine.model.roots import exact_polynomial, roots_of_exact


def from_coefficients(
    numerator: Sequence[object],
    denominator: Sequence[object],
    dead_time_s: object = 0.0,
    limits: Limits = DEFAULT_LIMITS,
) -> Factored:
    """numerator(s) / denominator(s) · exp(−s · dead_time_s) as gain, zeros and poles; nothing is cancelled.

    Parameters
    ----------
    numerator, denominator : real numbers, highest power first; leading zeros only lower the order
    dead_time_s : >= 0 [s]

    Raises DesignError: `numerator`, `numerator[k]`, `denominator`, `denominator[k]`, `dead_time_s`.
    """
    delay = dead_time(dead_time_s)
    top_gain, top = _read(numerator, "numerator", limits)
    bottom_gain, bottom = _read(denominator, "denominator", limits)
    return from_exact(top_gain / bottom_gain, top, bottom, delay)


def from_exact(gain: Fraction, numerator: IntPolynomial, denominator: IntPolynomial, dead_time_s: float) -> Factored:
    """gain · numerator / denominator, both taken with leading coefficient 1."""
    roots = []
    for polynomial, where in ((numerator, "numerator"), (denominator, "denominator")):
        try:
            roots.append(roots_of_exact(polynomial))
        except DesignError as error:
            raise error.within(where) from None
    return Factored(gain_number(gain, "numerator"), roots[0], roots[1], dead_time_s)


def gain_number(gain: Fraction, where: str) -> float:
    """An exact gain other than 0 as a double; DesignError where it is beyond a double's range."""
    try:
        number = float(gain)
    except OverflowError:
        number = 0.0
    if number == 0:
        raise DesignError(where, "gives a gain beyond 1e±308; scale the units of the model")
    return number


def _read(coefficients: Sequence[object], where: str, limits: Limits) -> tuple[Fraction, IntPolynomial]:
    try:
        return exact_polynomial(coefficients, limits)
    except DesignError as error:
        raise error.within(where) from None
