"""Gain and phase crossovers: all of them, from polynomial roots or (phase, with dead time) a proven search."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from mpmath import mp, mpc, mpf

from tests.outside import exact_polynomial as polynomial
from tests.outside.loop import Loop
from tests.outside.sector import Axis


@dataclass(frozen=True)
class GainCrossing:
    rad_s: mpf
    signed_phase_margin_deg: mpf
    direction: int
    """+1 where |L| rises through 1, −1 where it falls, 0 where it only touches."""
    condition: mpf
    """Relative change of rad_s per relative change of the roots and the gain."""
    phase_condition_deg: mpf
    """Change of the phase margin [deg] per relative change of the roots and the gain."""


@dataclass(frozen=True)
class PhaseCrossing:
    rad_s: mpf
    gain_db: mpf
    condition: mpf
    gain_condition_db: mpf


def gain_crossings(loop: Loop) -> list[GainCrossing]:
    """All ω with |N(jω)|² = |D(jω)|²: the positive roots of a real polynomial in ω²."""
    part = loop.rational
    difference = polynomial.add(
        polynomial.magnitude_squared(part.numerator),
        polynomial.scale(polynomial.magnitude_squared(part.denominator), mpf(-1)),
    )
    squares = polynomial.positive_real_roots(_without_dust(difference, part))
    return [_gain_crossing(loop, mp.sqrt(x)) for x in squares]


def _without_dust(difference: list, part: object) -> list:
    """Leading coefficients that cancel exactly (|L(∞)| = 1) are only rounding: drop them."""
    numerator = polynomial.magnitude_squared(part.numerator)
    denominator = polynomial.magnitude_squared(part.denominator)
    size = max(len(numerator), len(denominator))
    numerator += [mpf(0)] * (size - len(numerator))
    denominator += [mpf(0)] * (size - len(denominator))
    dust = mpf(2) ** (8 - mp.prec)
    return [
        mpf(0) if abs(x) <= dust * max(abs(n), abs(d)) else x
        for x, n, d in zip(difference, numerator, denominator, strict=True)
    ]


def _gain_crossing(loop: Loop, omega: mpf) -> GainCrossing:
    s = mpc(0, omega)
    slopes = loop.log_slope(s) * s  # dln|L|/dlnω = Re, dφ/dlnω = Im
    margin = signed_margin_deg(loop.at(s))
    steep, weight = abs(mp.re(slopes)), loop.parameter_weight(s)
    touching = steep < mpf(2) ** -(polynomial.ACCURACY_BITS // 3)
    condition = mpf("inf") if touching else 1 + weight / steep
    turn = (abs(mp.im(slopes)) * condition + weight) * 180 / mp.pi
    return GainCrossing(omega, margin, 0 if touching else int(mp.sign(mp.re(slopes))), condition, turn)


def signed_margin_deg(value: mpc) -> mpf:
    """Distance of the argument from −180° mod 360°, in (−180, 180]."""
    return mp.arg(-value) * 180 / mp.pi


def phase_crossings(loop: Loop, last_rad_s: mpf | None = None) -> list[PhaseCrossing]:
    """All 0 < ω < ∞ with L(jω) real and negative; with dead time those up to `last_rad_s`."""
    if loop.dead_time_s:
        assert last_rad_s is not None
        places = _delayed_phase_places(loop, last_rad_s)
    else:
        places = _rational_phase_places(loop)
    return [_phase_crossing(loop, omega) for omega in places]


def _rational_phase_places(loop: Loop) -> list[mpf]:
    """Positive roots of Im(N·conj D) with Re(N·conj D) < 0."""
    part = loop.rational
    above = polynomial.on_axis(part.numerator)
    below = [mp.conj(x) for x in polynomial.on_axis(part.denominator)]
    product = polynomial.multiply(above, below)
    imaginary = [mp.im(x) for x in product]
    bound = polynomial.multiply([abs(x) for x in above], [abs(x) for x in below])
    dust = mpf(2) ** (8 - mp.prec)
    imaginary = [mpf(0) if abs(x) <= dust * b else x for x, b in zip(imaginary, bound, strict=True)]
    if not any(imaginary):
        return []  # L is real everywhere on the axis
    first = next(i for i, x in enumerate(imaginary) if x != 0)
    in_square = imaginary[first::2]  # the other parity is zero: N·conj D has coefficients of alternating kind
    assert not any(imaginary[first + 1 :: 2])
    places = [mp.sqrt(x) for x in polynomial.positive_real_roots(in_square)]
    return [w for w in places if _on_negative_axis(loop, w)]


def _on_negative_axis(loop: Loop, omega: mpf) -> bool:
    s = mpc(0, omega)
    if any(abs(s - r) < mpf(10) ** -30 * omega for r in loop.rational.zeros + loop.rational.poles):
        return False  # L is zero or infinite there: no crossing of the negative axis
    return mp.re(loop.at(s)) < 0


def _phase_crossing(loop: Loop, omega: mpf) -> PhaseCrossing:
    s = mpc(0, omega)
    slopes = loop.log_slope(s) * s
    weight = loop.parameter_weight(s)
    turn = abs(mp.im(slopes))
    condition = 1 + weight / turn if turn > mpf(10) ** -15 else mpf("inf")
    decibels = 20 * mp.log10(abs(loop.at(s)))
    wobble = (abs(mp.re(slopes)) * condition + weight) * 20 / mp.log(10)
    return PhaseCrossing(omega, decibels, condition, wobble)


def _delayed_phase_places(loop: Loop, last_rad_s: mpf) -> list[mpf]:
    """Proven: a piece is dropped when its phase stays between odd multiples of π, kept when its phase is monotone."""
    axis = Axis(loop)
    first = first_of_interest_rad_s(loop)
    cuts = np.unique(np.concatenate([[first, float(last_rad_s)], np.abs(axis.nu[axis.sigma == 0])]))
    cuts = cuts[(cuts >= first) & (cuts <= float(last_rad_s))]
    a, b = cuts[:-1], cuts[1:]
    # Stand off by a hair from roots on the axis, where the argument jumps.
    a, b = a * (1 + 1e-12), b * (1 - 1e-12)
    places: list[mpf] = []
    for _ in range(200):
        if not len(a):
            return sorted(places)
        box = axis.enclose(a, b)
        turn = (np.floor((box.greatest_angle / np.pi + 1) / 2) - np.ceil((box.least_angle / np.pi + 1) / 2)) >= 0
        a, b = a[turn], b[turn]
        low, high = axis.phase_slope_range(a, b)
        monotone = (low > 0) | (high < 0)
        for left, right in zip(a[monotone], b[monotone], strict=True):
            places += _monotone_places(loop, axis, left, right)
        middle = (a[~monotone] + b[~monotone]) / 2
        if len(middle) and np.min((b - a)[~monotone] / middle) < 1e-13:
            raise ArithmeticError(f"phase touches -180 degrees near {middle[0]} rad/s")
        a, b = np.concatenate([a[~monotone], middle]), np.concatenate([middle, b[~monotone]])
    raise ArithmeticError("phase crossings: too many splits")


def first_of_interest_rad_s(loop: Loop) -> float:
    """A frequency below which no phase crossover can lie, and |L| keeps its low-frequency asymptote.

    Below a millionth of every root the phase differs from its asymptote by less than (order + ω·delay)·1e-6 rad and
    the asymptote is a multiple of 90°: a loop that starts on the negative axis leaves it on one side, monotonically.
    """
    sizes = [float(abs(r)) for r in loop.rational.zeros + loop.rational.poles if r != 0]
    if loop.dead_time_s:
        sizes.append(1 / float(loop.dead_time_s))
    return min(sizes, default=1.0) * 1e-6


def _monotone_places(loop: Loop, axis: Axis, left: float, right: float) -> list[mpf]:
    """The crossings of odd multiples of π within a piece of monotone phase."""
    ends = axis.phase(np.array([left, right])) / np.pi
    low, high = min(ends), max(ends)
    odd = 2 * np.arange(np.ceil((low - 1) / 2), np.floor((high - 1) / 2) + 1) + 1
    places = []
    for target in odd:
        a, b = left, right
        falling = ends[1] < ends[0]
        for _ in range(80):
            middle = (a + b) / 2
            above = axis.phase(np.array([middle]))[0] / np.pi > target
            a, b = (middle, b) if above == falling else (a, middle)
        places.append(_polish_phase(loop, mpf((a + b) / 2)))
    return places


def _polish_phase(loop: Loop, omega: mpf) -> mpf:
    """Newton on arg(−L) = 0."""
    for _ in range(12):
        s = mpc(0, omega)
        step = mp.arg(-loop.at(s)) / mp.re(loop.log_slope(s))
        omega -= step
        if abs(step) < mpf(10) ** -(mp.dps - 8) * omega:
            return omega
    raise ArithmeticError(f"phase crossing at {omega} does not settle")
