"""Overshoot, undershoot, rise and settling time, peak: extrema and exits polished, by the contract's definitions."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from mpmath import mp, mpf

from tests.outside.polish import bracketed_root
from tests.outside.responses import Modal


@dataclass(frozen=True)
class Features:
    """A stable response cut at its extrema: monotone in between. The values only find places, so doubles serve."""

    modal: Modal
    times: list[float]
    """Start, end and every local extremum, increasing."""
    values: list[float]


def features(modal: Modal) -> Features:
    """Split the response into monotone pieces."""
    grid = modal.features_grid()
    y, rate = modal.sampled(grid)
    change = np.nonzero(rate[1:-1] * rate[2:] < 0)[0] + 1
    size = float(max((abs(r) for r in modal.residues), default=mpf(1)))
    # Wiggles below 1e-11 of the largest residue are rounding, not extrema.
    change = change[np.abs(y[change] - float(modal.constant)) > 1e-11 * size]
    low, high = grid[change], grid[change + 1]
    falling = rate[change] > 0
    for _ in range(24):
        middle = (low + high) / 2
        _, there = modal.sampled(middle)
        later = (there > 0) == falling
        low, high = np.where(later, middle, low), np.where(later, high, middle)
    times = np.concatenate([[0.0], (low + high) / 2, [grid[-1]]])
    values, _ = modal.sampled(times)
    return Features(modal, times.tolist(), [float(v) for v in values])


def extreme(found: Features, sign: int) -> mpf:
    """Greatest (sign +1) or least (−1) value from t = 0+, polished."""
    best = max(range(len(found.times)), key=lambda i: sign * found.values[i])
    return found.modal.value(_polished(found, best))


def _polished(found: Features, index: int) -> mpf:
    """The time of extremum number `index`: where the rate changes sign; the ends stand as they are."""
    t = mpf(found.times[index])
    if index in (0, len(found.times) - 1):
        return t
    width = t * mpf("1e-9")
    try:
        return bracketed_root(found.modal.rate, t - width, t + width)
    except ArithmeticError:  # closer to the extremum than rounding of its time can tell
        return t


def step_measures(found: Features) -> dict[str, mpf]:
    """Measures of a command step response with a final value other than 0."""
    final = found.modal.constant
    up = int(mp.sign(final))
    with mp.workdps(40):
        return {
            "overshoot_pct": max(mpf(0), extreme(found, up) / final - 1) * 100,
            "undershoot_pct": max(mpf(0), -extreme(found, -up) / final) * 100,
            "rise_time_s": first_reach(found, final * mpf("0.9")) - first_reach(found, final * mpf("0.1")),
            "settling_time_s": last_exit(found, abs(final) * mpf("0.02")),
        }


def first_reach(found: Features, level: mpf) -> mpf:
    """First time at which the response crosses `level` from its value at 0+."""
    pairs = list(zip(found.times, found.values, strict=True))
    if (pairs[0][1] - float(level)) * (found.modal.constant - level) >= 0:
        return mpf(0)  # beyond it from the start
    for (t0, y0), (t1, y1) in pairwise(pairs):
        if (y0 - level) * (y1 - level) <= 0:
            return bracketed_root(lambda t: found.modal.value(t) - level, mpf(t0), mpf(t1))
    raise ArithmeticError("level is never reached")


def last_exit(found: Features, half_width: mpf) -> mpf:
    """Last time at which the response is outside ±half_width around its final value; 0 if never."""
    final = found.modal.constant
    pairs = list(zip(found.times, found.values, strict=True))
    for (t0, y0), (t1, y1) in zip(pairs[-2::-1], pairs[:0:-1], strict=True):
        if abs(y0 - final) > half_width >= abs(y1 - final):
            edge = final + half_width * mp.sign(y0 - final)
            return bracketed_root(lambda t, edge=edge: found.modal.value(t) - edge, mpf(t0), mpf(t1))
    if abs(pairs[-1][1] - final) > half_width:
        raise ArithmeticError("not settled at the end of the samples")
    return mpf(0)


def greatest_magnitude(found: Features) -> mpf:
    """Greatest |y| from t = 0+."""
    with mp.workdps(40):
        return max(abs(extreme(found, 1)), abs(extreme(found, -1)))
