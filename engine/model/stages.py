"""The kinds of compensator stage, each as a factored model. Damping ratios have no unit."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from engine.errors import DesignError
from engine.model.factored import ComplexArray, Factored
from engine.model.factored_entry import factored_model, finite_number, frequency_rad_s
from engine.model.limits import DEFAULT_LIMITS, LARGEST_ROOT_RAD_S, SMALLEST_ROOT_RAD_S, Limits

_NONE = np.empty(0, dtype=np.complex128)


def lead_lag(zero_rad_s: object, pole_rad_s: object) -> Factored:
    """(1 + s/z) / (1 + s/p): lead where z < p, lag where z > p; 1 at DC."""
    zero = frequency_rad_s(zero_rad_s, "zero_rad_s")
    pole = frequency_rad_s(pole_rad_s, "pole_rad_s")
    return Factored(pole / zero, _real(-zero), _real(-pole))


def proportional_integral(corner_rad_s: object) -> Factored:
    """(s + w) / s: 1 at high frequency."""
    return Factored(1.0, _real(-frequency_rad_s(corner_rad_s, "corner_rad_s")), _real(0.0))


def integrator() -> Factored:
    """1/s."""
    return Factored(1.0, _NONE, _real(0.0))


def real_zero(corner_rad_s: object) -> Factored:
    """1 + s/w."""
    corner = frequency_rad_s(corner_rad_s, "corner_rad_s")
    return Factored(1 / corner, _real(-corner), _NONE)


def real_pole(corner_rad_s: object) -> Factored:
    """1 / (1 + s/w)."""
    corner = frequency_rad_s(corner_rad_s, "corner_rad_s")
    return Factored(corner, _NONE, _real(-corner))


def complex_zeros(natural_rad_s: object, damping: object) -> Factored:
    """(s/w)² + 2ζs/w + 1, ζ >= 0; two real zeros where ζ >= 1."""
    natural = frequency_rad_s(natural_rad_s, "natural_rad_s")
    return Factored(1 / natural**2, _pair(natural, _damping(damping, "damping"), "damping"), _NONE)


def complex_poles(natural_rad_s: object, damping: object) -> Factored:
    """1 / ((s/w)² + 2ζs/w + 1), ζ > 0; two real poles where ζ >= 1."""
    natural = frequency_rad_s(natural_rad_s, "natural_rad_s")
    return Factored(natural**2, _NONE, _pair(natural, _positive_damping(damping, "damping"), "damping"))


def notch(centre_rad_s: object, zero_damping: object, pole_damping: object) -> Factored:
    """(s² + 2ζz·w·s + w²) / (s² + 2ζp·w·s + w²), ζz >= 0, ζp > 0: 1 at DC and at high frequency."""
    centre = frequency_rad_s(centre_rad_s, "centre_rad_s")
    zeros = _pair(centre, _damping(zero_damping, "zero_damping"), "zero_damping")
    poles = _pair(centre, _positive_damping(pole_damping, "pole_damping"), "pole_damping")
    return Factored(1.0, zeros, poles)


def rational(
    zeros: Sequence[object], poles: Sequence[object], gain: object = 1.0, limits: Limits = DEFAULT_LIMITS
) -> Factored:
    """gain · Π(s − zero) / Π(s − pole), as given; complex roots with their conjugates."""
    return factored_model(gain, zeros, poles, 0.0, limits)


def _damping(number: object, where: str) -> float:
    damping = finite_number(number, where)
    if damping < 0:
        raise DesignError(where, f"must be 0 or greater, is {damping:g}")
    return damping


def _positive_damping(number: object, where: str) -> float:
    damping = finite_number(number, where)
    if damping <= 0:
        raise DesignError(where, f"must be greater than 0, is {damping:g}")
    return damping


def _real(root: float) -> ComplexArray:
    return np.array([root], dtype=np.complex128)


def _pair(natural: float, damping: float, where: str) -> ComplexArray:
    """Roots of s² + 2ζws + w²."""
    if damping < 1:
        # (1 − ζ)(1 + ζ) keeps its digits near ζ = 1, where 1 − ζ² loses them.
        root = complex(-damping * natural + 0.0, natural * float(np.sqrt((1 - damping) * (1 + damping))))
        return np.array([root, root.conjugate()], dtype=np.complex128)
    larger = damping + float(np.sqrt(damping - 1)) * float(np.sqrt(damping + 1))
    if larger * natural > LARGEST_ROOT_RAD_S or natural / larger < SMALLEST_ROOT_RAD_S:
        raise DesignError(where, f"is too large, {damping:g}; use two real corners")
    return np.array([-natural / larger, -natural * larger], dtype=np.complex128)
