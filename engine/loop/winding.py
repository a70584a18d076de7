"""How many roots a characteristic function has in a rectangle, by the argument principle."""

from __future__ import annotations

import numpy as np

from engine.loop.characteristic import Characteristic, IntArray
from engine.model.factored import ComplexArray, FloatArray

# Neighbouring values must not turn further than this, or points are put between them [rad].
LARGEST_TURN = 0.8
MOST_ROUNDS = 24
POINTS_PER_RADIAN = 2.5


def roots_in_rectangle(p: Characteristic, left: FloatArray, right: FloatArray, top: FloatArray) -> IntArray:
    """(c,) number of roots with left < Re s < right and |Im s| < top, each counted as often as it occurs.

    The function has no poles, so its turn along the upper half of the boundary, from the real axis to the real axis,
    is π times that number. −1 where a root lies too close to the boundary to tell.
    """
    count = len(left)
    case, path = _upper_boundary(p, left, right, top)
    angle = _unit(p, case, path)
    a, b = np.arange(len(path) - 1), np.arange(1, len(path))
    same = case[a] == case[b]
    own, start, end, from_, to = case[a][same], path[a][same], path[b][same], angle[a][same], angle[b][same]
    turn = np.zeros(count)
    unsure = np.zeros(count, dtype=np.bool_)
    for _ in range(MOST_ROUNDS):
        step = np.angle(to * from_.conj())
        fine = np.abs(step) <= LARGEST_TURN
        np.add.at(turn, own[fine], step[fine])
        wide = ~fine
        if not wide.any():
            break
        own, start, end, from_, to = own[wide], start[wide], end[wide], from_[wide], to[wide]
        middle = 0.5 * (start + end)
        between = _unit(p, own, middle)
        own = np.concatenate([own, own])
        start, end = np.concatenate([start, middle]), np.concatenate([middle, end])
        from_, to = np.concatenate([from_, between]), np.concatenate([between, to])
    else:
        unsure[own] = True
    return np.where(unsure, -1, np.rint(turn / np.pi)).astype(np.int64)


def _upper_boundary(
    p: Characteristic, left: FloatArray, right: FloatArray, top: FloatArray
) -> tuple[IntArray, ComplexArray]:
    """Points from the right end on the real axis up, over and down to the left end, case after case."""
    dead_time = np.zeros(len(left)) if p.dead_time is None else p.dead_time
    cases, points = [], []
    for case, (x0, x1, y, theta) in enumerate(zip(left, right, top, dead_time, strict=True)):
        up = max(24, int(POINTS_PER_RADIAN * y * theta))
        # Cubes of a uniform sequence: close together at the real axis, where slow roots stand.
        rising = y * np.linspace(0.0, 1.0, up + 1) ** 3 if y * theta < 30.0 else np.linspace(0.0, y, up + 1)
        across = np.linspace(x1, x0, 16)
        path = np.concatenate([x1 + 1j * rising[:-1], across + 1j * y, x0 + 1j * rising[-2::-1]])
        cases.append(np.full(len(path), case))
        points.append(path)
    return np.concatenate(cases), np.concatenate(points)


def _unit(p: Characteristic, case: IntArray, s: ComplexArray) -> ComplexArray:
    """(k,) direction of the characteristic function at s (k,) of the cases."""
    value, _, _ = p.of_cases(case).newton(s[:, None])
    with np.errstate(all="ignore"):
        unit: ComplexArray = (value / np.abs(value))[:, 0]
    return np.where(np.isfinite(unit), unit, 1.0)
