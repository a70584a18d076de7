"""Suprema over frequency of |S|, |T|, |C·S| and |(1−L)/(1+L)|, and the bandwidth."""

from __future__ import annotations

from collections.abc import Callable
from itertools import pairwise

import numpy as np
from mpmath import mp, mpc, mpf

from tests.outside import exact_polynomial as polynomial
from tests.outside.closed_loop import loud_from_rad_s
from tests.outside.loop import UNITY, Loop
from tests.outside.polish import bracketed_root
from tests.outside.sector import Axis, Enclosure

KINDS = ("sensitivity", "complementary_sensitivity", "effort", "disk")


def value_at(loop: Loop, kind: str, omega: mpf) -> mpf:
    """|S|, |T|, |C·S| or |(1−L)/(1+L)| at jω, factor by factor."""
    s = mpc(0, omega)
    level = loop.at(s)
    above = {
        "sensitivity": lambda: mpc(1),
        "complementary_sensitivity": lambda: level,
        "effort": lambda: loop.compensator.at(s),
        "disk": lambda: 1 - level,
    }[kind]()
    return abs(above / (1 + level))


def supremum(loop: Loop, kind: str) -> tuple[mpf, mpf]:
    """(sup, ω where it is taken or approached); inf where unbounded; ω may be 0 or inf."""
    return _delayed_supremum(loop, kind) if loop.dead_time_s else _rational_supremum(loop, kind)


def closed_loop_fraction(loop: Loop, kind: str) -> tuple[list, list]:
    """Numerator and denominator polynomials, hidden cancellations kept, of a rational loop."""
    part = loop.rational
    above = {
        "sensitivity": lambda: part.denominator,
        "complementary_sensitivity": lambda: part.numerator,
        "effort": lambda: polynomial.multiply(loop.compensator.numerator, loop.plant.denominator),
        "disk": lambda: polynomial.add(part.denominator, polynomial.scale(part.numerator, mpf(-1))),
    }[kind]()
    return above, loop.closed


def _rational_supremum(loop: Loop, kind: str) -> tuple[mpf, mpf]:
    """Compare ω = 0, ω = ∞ and every stationary point: roots of A'B − AB', where |·|² = A/B in x = ω²."""
    above, below = closed_loop_fraction(loop, kind)
    a, b = polynomial.magnitude_squared(above), polynomial.magnitude_squared(below)
    while a[0] == 0 and b[0] == 0:
        a, b = a[1:], b[1:]
    slope = polynomial.add(
        polynomial.multiply(polynomial.derivative(a), b),
        polynomial.scale(polynomial.multiply(a, polynomial.derivative(b)), mpf(-1)),
    )
    size = polynomial.add(
        polynomial.multiply([abs(x) for x in polynomial.derivative(a)], [abs(x) for x in b]),
        polynomial.multiply([abs(x) for x in a], [abs(x) for x in polynomial.derivative(b)]),
    )
    dust = mpf(2) ** (10 - mp.prec)
    slope = [mpf(0) if abs(x) <= dust * w else x for x, w in zip(slope, size, strict=True)]
    places = polynomial.positive_real_roots(slope) if any(slope) else []
    best = [(polynomial.evaluate(a, x) / polynomial.evaluate(b, x), mp.sqrt(x)) for x in places]
    best.append((a[0] / b[0] if b[0] else mpf("inf"), mpf(0)))
    difference = len(polynomial.trimmed(a)) - len(polynomial.trimmed(b))
    at_infinity = mpf("inf") if difference > 0 else mpf(0) if difference < 0 else a[len(b) - 1] / b[-1]
    best.append((at_infinity, mpf("inf")))
    top, where = max(best, key=lambda pair: pair[0])
    return mp.sqrt(top), where


def _bounds(kind: str, axis: Axis, compensator: Axis, a: np.ndarray, b: np.ndarray) -> np.ndarray:
    """Upper bounds of the quantity over pieces [a, b] from the sector that holds L."""
    if kind == "disk":
        return _disk_bounds(axis, a, b)
    box = axis.enclose(a, b)
    distance = distance_from_minus_one(box)
    with np.errstate(divide="ignore"):
        if kind == "sensitivity":
            return 1 / distance
        if kind == "complementary_sensitivity":
            outer = np.where(box.low > 1, 1 / (1 - 1 / np.maximum(box.low, 1.0)), np.inf)
            return np.minimum(box.high / distance, outer)
        return compensator.enclose(a, b).high / distance


def distance_from_minus_one(box: Enclosure) -> np.ndarray:
    """Least |1 + L| over annular sectors."""
    away = _angle_from(box, 1)
    radius = np.clip(np.cos(away), box.low, box.high)  # nearest to 1 on the ray at that angle
    return np.hypot(radius - np.cos(away), np.sin(away))


def reach_from_minus_one(box: Enclosure) -> np.ndarray:
    """Greatest |1 + L| over annular sectors."""
    away = _angle_from(box, 0)
    ends = [np.hypot(1 + r * np.cos(away), r * np.sin(away)) for r in (box.low, box.high)]
    return np.maximum(*ends)


def _angle_from(box: Enclosure, half_turn: int) -> np.ndarray:
    """Least distance of the sector's angles from the odd (1) or even (0) multiples of π; 0 where one lies inside."""
    low, high = box.least_angle / np.pi - half_turn, box.greatest_angle / np.pi - half_turn
    inside = np.floor(high / 2) >= np.ceil(low / 2)
    away = np.minimum(np.abs(low - 2 * np.round(low / 2)), np.abs(high - 2 * np.round(high / 2)))
    return np.where(inside, 0.0, np.minimum(away, 1.0) * np.pi)


def _delayed_supremum(loop: Loop, kind: str) -> tuple[mpf, mpf]:
    """Branch and bound over the axis; what survives within 1e-3 of the top is polished and compared."""
    axis, compensator = Axis(loop), Axis(Loop(loop.compensator, UNITY, mpf(0)))
    limits = [(_limit_at_zero(loop, kind), mpf(0)), (_limit_at_infinity(loop, kind), mpf("inf"))]
    top = float(max(value for value, _ in limits))
    if not np.isfinite(top):
        return max(limits, key=lambda pair: pair[0])
    cuts = np.geomspace(loud_from_rad_s(loop), _last_of_interest_rad_s(loop, kind), 400)
    a, b = cuts[:-1], cuts[1:]
    for _ in range(200):
        middle = np.sqrt(a * b)
        top = max(top, float(np.max(_values(kind, axis, compensator, middle), initial=0.0)))
        keep = _bounds(kind, axis, compensator, a, b) > top * 1.001
        if not np.any(keep):
            break
        a, b, middle = a[keep], b[keep], middle[keep]
        a, b = np.concatenate([a, middle]), np.concatenate([middle, b])
        if len(a) > 2_000_000:
            raise ArithmeticError("peak search: too many pieces")
    candidates = [_polish_peak(loop, kind, mpf(w)) for w in _tops(kind, axis, compensator, loop, top)]
    return max(limits + candidates, key=lambda pair: pair[0])


def _disk_bounds(axis: Axis, a: np.ndarray, b: np.ndarray) -> np.ndarray:
    """Upper bound of |(1−L)/(1+L)|: value at the start, plus how far L can move from it."""
    box = axis.enclose(a, b)
    extent = (box.high - box.low) + box.high * np.minimum(box.greatest_angle - box.least_angle, np.pi)
    start = axis.value(a)
    above = np.abs(1 - start) + extent
    below = np.maximum(np.abs(1 + start) - extent, 0.0)
    with np.errstate(divide="ignore"):
        bound = above / below
        outer = (1 + 1 / np.maximum(box.low, 1.0)) / np.where(box.low > 1, 1 - 1 / np.maximum(box.low, 1.0), np.inf)
        inner = np.where(box.high < 1, (1 + box.high) / np.maximum(1 - box.high, 0.0), np.inf)
    return np.minimum(np.minimum(bound, inner), np.where(box.low > 1, outer, np.inf))


def _tops(kind: str, axis: Axis, compensator: Axis, loop: Loop, top: float) -> list[float]:
    """Frequencies near each local maximum that comes within 1 % of the top.

    Sampled finely enough for every lightly damped closed-loop mode that can matter: a maximum within 1 % of the top is
    at least as wide as |1 + L| allows, which moves by at most |L'| per step.
    """
    cuts = np.geomspace(loud_from_rad_s(loop), _last_of_interest_rad_s(loop, kind), 400)
    a, b = cuts[:-1], cuts[1:]
    done: list[np.ndarray] = []
    for _ in range(200):
        bound = _bounds(kind, axis, compensator, a, b)
        keep = bound > top * 0.999
        a, b, bound = a[keep], b[keep], bound[keep]
        small = bound < top * 1.01
        done.append(np.concatenate([a[small], b[small]]))
        middle = np.sqrt(a * b)[~small]
        a, b = np.concatenate([a[~small], middle]), np.concatenate([middle, b[~small]])
        if not len(a):
            break
    places = np.unique(np.concatenate(done))
    values = _values(kind, axis, compensator, places)
    beside = np.maximum(np.append(values[1:], 0.0), np.append(0.0, values[:-1]))
    best = np.nonzero(values >= beside)[0]
    return [float(places[i]) for i in sorted(best, key=lambda i: -values[i])[:8]]


def _values(kind: str, axis: Axis, compensator: Axis, omega: np.ndarray) -> np.ndarray:
    level = axis.value(omega)
    above = {
        "sensitivity": lambda: 1.0,
        "complementary_sensitivity": lambda: level,
        "effort": lambda: compensator.value(omega),
        "disk": lambda: 1 - level,
    }[kind]()
    return np.abs(above / (1 + level))


def _polish_peak(loop: Loop, kind: str, omega: mpf) -> tuple[mpf, mpf]:
    """The place near a rough maximum where the slope of the logarithm falls through zero."""
    slope = _log_slope(loop, kind)
    a, b = omega * (1 - mpf("1e-9")), omega * (1 + mpf("1e-9"))
    width = mpf("1e-9")
    while slope(a) < 0 or slope(b) > 0:  # widen until the slope falls through zero between a and b
        width *= 2
        a, b = omega * (1 - width), omega * (1 + width)
        if width > mpf("0.2"):
            return value_at(loop, kind, omega), omega
    top = bracketed_root(slope, a, b)
    return value_at(loop, kind, top), top


def _log_slope(loop: Loop, kind: str) -> Callable[[mpf], mpf]:
    """dln|quantity|/dlnω at ω."""

    def slope(omega: mpf) -> mpf:
        s = mpc(0, omega)
        level = loop.at(s)
        change = s * loop.log_slope(s)
        of_s = -level / (1 + level) * change
        if kind == "sensitivity":
            return mp.re(of_s)
        if kind == "complementary_sensitivity":
            return mp.re(of_s + change)
        if kind == "disk":
            return mp.re(of_s - level / (1 - level) * change)
        return mp.re(of_s + s * Loop(loop.compensator, UNITY, mpf(0)).log_slope(s))

    return slope


def _limit_at_zero(loop: Loop, kind: str) -> mpf:
    """The quantity at ω → 0: the dead time does not matter there."""
    above, below = closed_loop_fraction(loop, kind)
    order_above = next((i for i, x in enumerate(above) if x != 0), 0)
    order_below = next(i for i, x in enumerate(below) if x != 0)
    if order_above != order_below:
        return mpf(0) if order_above > order_below else mpf("inf")
    return abs(above[order_above] / below[order_below])


def _limit_at_infinity(loop: Loop, kind: str) -> mpf:
    """lim sup as ω → ∞: a delayed biproper loop turns endlessly on the circle |L∞|."""
    circle = abs(loop.rational.gain) if loop.relative_degree == 0 else mpf(0)
    c = loop.compensator
    excess = len(c.poles) - len(c.zeros)
    effort = mpf("inf") if excess < 0 else abs(c.gain) if excess == 0 else mpf(0)
    return {
        "sensitivity": 1 / (1 - circle),
        "complementary_sensitivity": circle / (1 - circle),
        "effort": effort / (1 - circle),
        "disk": (1 + circle) / (1 - circle),
    }[kind]


def _last_of_interest_rad_s(loop: Loop, kind: str) -> float:
    """Beyond it the quantity stays within 1e-3 of its limit's bound and falls, or follows the limit at infinity."""
    sizes = [float(abs(r)) for r in loop.rational.zeros + loop.rational.poles if r != 0]
    last = 10 * max(sizes, default=1.0)
    if loop.relative_degree == 0:
        return last * 300
    while abs(loop.rational.at(mpc(0, last))) > 1e-3:
        last *= 1.5
    return last


def bandwidth_rad_s(loop: Loop) -> mpf | None:
    """Lowest ω with |T| = |T(0)|/√2; None where there is none."""
    start = _limit_at_zero(loop, "complementary_sensitivity")
    if not mp.isfinite(start) or start == 0:
        return None
    if loop.dead_time_s:
        return _delayed_bandwidth(loop, start / mp.sqrt(2))
    a = polynomial.magnitude_squared(loop.rational.numerator)
    b = polynomial.magnitude_squared(loop.closed)
    difference = polynomial.add(polynomial.scale(b, start**2 / 2), polynomial.scale(a, mpf(-1)))
    places = polynomial.positive_real_roots(difference)
    return mp.sqrt(places[0]) if places else None


def _delayed_bandwidth(loop: Loop, level: mpf) -> mpf | None:
    """Left to right: a piece is passed when the sector proves |T| above the level, else split to the first change."""
    axis = Axis(loop)
    cuts = np.geomspace(loud_from_rad_s(loop), _last_of_interest_rad_s(loop, "sensitivity"), 400)
    waiting = list(pairwise(cuts))[::-1]
    target = float(level)

    def excess(omega: mpf) -> mpf:
        return mp.log(value_at(loop, "complementary_sensitivity", omega) / level)

    while waiting:
        a, b = waiting.pop()
        box = axis.enclose(np.array([a]), np.array([b]))
        near = float(distance_from_minus_one(box)[0])
        far = float(reach_from_minus_one(box)[0])
        if box.low[0] / far > target or (box.low[0] > 1 and 1 / (1 + 1 / box.low[0]) > target):
            continue
        if box.high[0] < target * near:
            raise ArithmeticError("bandwidth: the level was passed unseen")
        if (b - a) / b < 1e-6:
            if excess(mpf(a)) * excess(mpf(b)) <= 0:
                return bracketed_root(excess, mpf(a), mpf(b))
            continue
        middle = float(np.sqrt(a * b))
        waiting += [(middle, b), (a, middle)]
    return None
