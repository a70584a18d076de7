"""Expanded coefficients, for exports only, with the error that expanding causes."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

import numpy as np

from engine.model.evaluate import response
from engine.model.factored import ComplexArray, Factored, FloatArray

_POINTS_PER_DECADE = 40
_DECADES_BEYOND = 2.0


@dataclass(frozen=True, slots=True)
class Coefficients:
    """numerator(s)/denominator(s), highest power first, as doubles."""

    numerator: list[float]
    denominator: list[float]
    largest_relative_response_error: float
    """sup |expanded/factored − 1| on the imaginary axis, over the model's decades and two beyond."""


def expanded(model: Factored) -> Coefficients:
    """Multiply the factors out exactly, round each coefficient once, and say what that cost.

    The error is that of Horner evaluation of the rounded coefficients in double precision, as a colleague's
    script would do it; dead time is left out.
    """
    numerator = [float(Fraction(model.gain) * coefficient) for coefficient in _multiplied(model.zeros)]
    denominator = [float(coefficient) for coefficient in _multiplied(model.poles)]
    return Coefficients(numerator, denominator, _response_error(model, numerator, denominator))


def _multiplied(roots: ComplexArray) -> list[Fraction]:
    """Π(s − root) in exact arithmetic; conjugates are multiplied as pairs, so all coefficients are real."""
    product = [Fraction(1)]
    for root in roots:
        if root.imag < 0:
            continue  # taken with its conjugate
        real, imag = Fraction(float(root.real)), Fraction(float(root.imag))
        factor = [Fraction(1), -2 * real, real * real + imag * imag] if imag else [Fraction(1), -real]
        longer = [Fraction(0)] * (len(product) + len(factor) - 1)
        for i, a in enumerate(product):
            for j, b in enumerate(factor):
                longer[i + j] += a * b
        product = longer
    return product


def _response_error(model: Factored, numerator: list[float], denominator: list[float]) -> float:
    s = 1j * _frequencies(model)
    exact = response(Factored(model.gain, model.zeros, model.poles), s)
    with np.errstate(all="ignore"):
        found = np.polyval(numerator, s) / np.polyval(denominator, s)
        error = np.abs(found / exact - 1)
    error = error[np.isfinite(error)]
    return float(error.max()) if error.size else 0.0


def _frequencies(model: Factored) -> FloatArray:
    corners = np.abs(np.concatenate([model.zeros, model.poles]))
    corners = corners[corners > 0]
    low, high = (corners.min(), corners.max()) if corners.size else (1.0, 1.0)
    first, last = np.log10(low) - _DECADES_BEYOND, np.log10(high) + _DECADES_BEYOND
    return np.logspace(first, last, max(int((last - first) * _POINTS_PER_DECADE), 2))
