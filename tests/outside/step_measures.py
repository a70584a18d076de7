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
    """A stable response with its extrema and samples, enough to read every measure."""

    modal: Modal
    times: list[mpf]
    """Start, end and every local extremum, increasing: the response is monotone in between."""
    values: list[mpf]


def features(modal: Modal) -> Features:
    """Split the response into monotone pieces."""
    grid = modal.features_grid()
    _, rate = modal.sampled(grid)
    change = np.nonzero(rate[1:-1] * rate[2:] < 0)[0] + 1
    size = float(max((abs(r) for r in modal.residues), default=mpf(1)))
    y, _ = modal.sampled(grid)
    # Wiggles below 1e-11 of the largest residue are rounding, not extrema.
    change = [i for i in change if abs(float(y[i]) - float(modal.constant)) > 1e-11 * size]
    times = [mpf(0)]
    with mp.workdps(40):
        times += [_extremum(modal, grid[i], grid[i + 1]) for i in change]
        times.append(mpf(grid[-1]))
        return Features(modal, times, [modal.value(t) for t in times])


def _extremum(modal: Modal, a: float, b: float) -> mpf:
    low, high = mpf(float(a)), mpf(float(b))
    try:
        return bracketed_root(modal.rate, low, high)
    except ArithmeticError:  # the sampled sign was rounding: both ends lie on one side
        return (low + high) / 2


def step_measures(found: Features) -> dict[str, mpf]:
    """Measures of a command step response with a final value other than 0."""
    final = found.modal.constant
    levels = [y / final for y in found.values]
    with mp.workdps(40):
        return {
            "overshoot_pct": max(mpf(0), max(levels) - 1) * 100,
            "undershoot_pct": max(mpf(0), -min(levels)) * 100,
            "rise_time_s": first_reach(found, final * mpf("0.9")) - first_reach(found, final * mpf("0.1")),
            "settling_time_s": last_exit(found, abs(final) * mpf("0.02")),
        }


def first_reach(found: Features, level: mpf) -> mpf:
    """First time at which the response crosses `level` from its value at 0+."""
    pairs = list(zip(found.times, found.values, strict=True))
    if pairs[0][1] == level or (pairs[0][1] - level) * (found.modal.constant - level) > 0:
        return mpf(0)  # beyond it from the start
    for (t0, y0), (t1, y1) in pairwise(pairs):
        if (y0 - level) * (y1 - level) <= 0:
            return bracketed_root(lambda t: found.modal.value(t) - level, t0, t1)
    raise ArithmeticError("level is never reached")


def last_exit(found: Features, half_width: mpf) -> mpf:
    """Last time at which the response is outside ±half_width around its final value; 0 if never."""
    final = found.modal.constant
    pairs = list(zip(found.times, found.values, strict=True))
    for (t0, y0), (t1, y1) in zip(pairs[-2::-1], pairs[:0:-1], strict=True):
        if abs(y0 - final) > half_width >= abs(y1 - final):
            edge = final + half_width * mp.sign(y0 - final)
            return bracketed_root(lambda t, edge=edge: found.modal.value(t) - edge, t0, t1)
    if abs(pairs[-1][1] - final) > half_width:
        raise ArithmeticError("not settled at the end of the samples")
    return mpf(0)


def greatest_magnitude(found: Features) -> tuple[mpf, mpf]:
    """(signed value of greatest magnitude from t = 0+, its time)."""
    best = max(range(len(found.times)), key=lambda i: abs(found.values[i]))
    return found.values[best], found.times[best]
