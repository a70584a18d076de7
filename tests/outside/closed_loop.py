"""Closed-loop poles and stability: polynomial roots, and independently the encirclements of −1."""

from __future__ import annotations

import numpy as np
from mpmath import mp, mpc, mpf

from tests.outside import exact_polynomial as polynomial
from tests.outside.crossings import first_of_interest_rad_s
from tests.outside.loop import Loop
from tests.outside.sector import Axis


def closed_loop_poles(loop: Loop) -> list[mpc]:
    """Roots of N + D (no dead time)."""
    assert not loop.dead_time_s
    return polynomial.roots(loop.closed)


def pole_conditions(loop: Loop, poles: list[mpc]) -> list[mpf]:
    """Relative change of each closed-loop pole per relative change of the roots and the gain."""
    return [
        1 + loop.parameter_weight(pole) / max(abs(pole * loop.log_slope(pole)), mpf(10) ** -40)
        if pole != 0 and pole not in loop.rational.poles + loop.rational.zeros
        else mpf(1)
        for pole in poles
    ]


def unstable_poles_by_roots(loop: Loop) -> int:
    """Closed-loop poles with positive real part."""
    return sum(1 for pole in closed_loop_poles(loop) if mp.re(pole) > 0)


def unstable_poles_by_encirclement(loop: Loop) -> int:
    """Zeros of 1 + L in the open right half plane, counted with the exact dead time (argument principle).

    The contour leaves poles at the origin to the left on a quarter circle (|L| > 1 there), follows the axis, and
    closes where |L| < 1 for good. Pieces of the axis are accepted only when the enclosure of L proves that 1 + L
    stays within a half plane as seen from its value at the start, so that the principal argument is the true turn.
    Poles on the axis other than the origin are not supported.
    """
    part = loop.rational
    assert all(mp.re(p) != 0 or p == 0 for p in part.poles)
    axis = Axis(loop)
    start, end = loud_from_rad_s(loop), _end_rad_s(loop)
    turn = _turn_at_origin(loop, axis, start) + _turn_along(axis, start, end) - _turn_of_arc(loop, axis, end)
    # Twice the upper half, clockwise counted: Z − P = −2·turn/2π.
    open_loop = sum(1 for p in part.poles if mp.re(p) > 0)
    count = open_loop - turn / np.pi
    whole = round(count)
    if abs(count - whole) > 1e-6:
        raise ArithmeticError(f"encirclement count is not whole: {count}")
    return whole


def loud_from_rad_s(loop: Loop) -> float:
    """A frequency below which nothing happens: every root is far above, and |L| > 1000 where it has integrators."""
    start = first_of_interest_rad_s(loop)
    if any(p == 0 for p in loop.rational.poles):
        while abs(loop.at(mpc(0, start))) < 1e3:
            start /= 10
    return start


def _end_rad_s(loop: Loop) -> float:
    """Frequency beyond which L on the axis and on the arc is below 1, or next to L∞ where there is no dead time."""
    sizes = [float(abs(r)) for r in loop.rational.zeros + loop.rational.poles if r != 0]
    end = 1e3 * max(sizes, default=1.0)
    if loop.relative_degree == 0:
        if loop.dead_time_s and abs(loop.rational.gain) >= 1:
            raise ArithmeticError("with dead time and |L∞| >= 1 there are endlessly many unstable poles")
        return end * 1e3
    while abs(loop.rational.at(mpc(0, end))) > 1e-2:
        end *= 2
    return end


def _turn_of_arc(loop: Loop, axis: Axis, omega: float) -> float:
    """Turn of 1 + L from the real axis, along the closing arc, to jω: by its principal argument where |L| < 1."""
    there = 1 + axis.value(np.array([omega]))[0]
    still = loop.relative_degree == 0 and not loop.dead_time_s
    return float(np.angle(there / (1 + float(loop.rational.gain)))) if still else float(np.angle(there))


def _turn_at_origin(loop: Loop, axis: Axis, start: float) -> float:
    """Turn of 1 + L from s = start on the real axis (poles at 0) or s = 0 (none) to j·start."""
    orders = sum(1 for p in loop.rational.poles if p == 0)
    if not orders:
        # From s = 0, where 1 + L is real, in one piece: L hardly changes below a millionth of every root.
        return float(mp.arg((1 + loop.at(mpc(0, start))) / (1 + loop.at(mpc(0, mpf(start) * mpf(10) ** -30)))))
    # arg(1 + L) = arg L + arg(1 + 1/L), |1/L| < 1e-3: the first turns with the poles, the second is principal.
    real, there = loop.at(mpf(start)), loop.at(mpc(0, start))
    turn_of_l = -orders * mp.pi / 2 + mp.arg(there * mp.expjpi(mpf(orders) / 2) / real)
    return float(turn_of_l + mp.arg(1 + 1 / there) - mp.arg(1 + 1 / real))


def _turn_along(axis: Axis, start: float, end: float) -> float:
    a = np.geomspace(start, end, 200)
    a, b = a[:-1], a[1:]
    total = 0.0
    for _ in range(80):
        if not len(a):
            return total
        if len(a) > 60_000:
            break
        box = axis.enclose(a, b)
        extent = (box.high - box.low) + box.high * np.minimum(box.greatest_angle - box.least_angle, np.pi)
        near, far = 1 + axis.value(a), 1 + axis.value(b)
        # Where L is small or large throughout, 1 + L follows 1 or L: proven in the same way.
        proven = (extent < np.abs(near)) | (box.high < 1)
        total += float(np.sum(np.angle(far[proven] / near[proven])))
        outer = ~proven & (box.low > 1) & (box.greatest_angle - box.least_angle < 1)
        total += float(np.sum(_turn_outside(axis, a[outer], b[outer])))
        rest = ~proven & ~outer
        middle = np.sqrt(a[rest] * b[rest])
        a, b = np.concatenate([a[rest], middle]), np.concatenate([middle, b[rest]])
    raise ArithmeticError("encirclements: the curve passes through -1 within rounding")


def _turn_outside(axis: Axis, a: np.ndarray, b: np.ndarray) -> np.ndarray:
    """Turn of 1 + L where |L| > 1 throughout: the turn of L plus principal turns of 1 + 1/L."""
    ratio = np.angle(1 + 1 / axis.value(b)) - np.angle(1 + 1 / axis.value(a))
    return axis.phase(b) - axis.phase(a) + ratio
