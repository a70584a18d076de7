"""Suprema of the closed loop's gains over 0 ≤ ω ≤ ∞, and its bandwidth: extrema, not maxima of samples."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from engine.loop.closed_loop_gain import Points, Quantity, log_level
from engine.loop.closed_loop_roots import ClosedLoopRoots
from engine.loop.grid import Sampled
from engine.loop.isolation import Brackets
from engine.loop.limits import Limits, limits_of
from engine.loop.narrow import narrow_places
from engine.loop.polish import Tasks, around, joined_tasks
from engine.loop.ripples import ripple_tasks
from engine.loop.sections import IntArray
from engine.model.factored import FloatArray

PEAKS = (Quantity.SENSITIVITY, Quantity.COMPLEMENTARY, Quantity.EFFORT, Quantity.DISK)
_WORTH_POLISHING = math.log(0.9)
"""A local maximum of the samples within this of the greatest one may hold the supremum."""
_MOST_PER_ROW = 8
_LARGE = 150.0


@dataclass(frozen=True, eq=False)
class Peaks:
    """Suprema of |S|, |T|, |C·S| and |(1−L)/(1+L)|: rows as in PEAKS, one column a case."""

    log_value: FloatArray
    """(4, c) natural logarithm; +inf where there is no bound."""
    at_rad_s: FloatArray
    """(4, c) 0 for ω → 0, inf for ω → ∞."""
    bandwidth_rad_s: FloatArray
    """(c,) lowest ω with |T| = |T(0)|/√2; nan where there is none."""


def peak_tasks(samples: Sampled, brackets: Brackets, roots: ClosedLoopRoots) -> tuple[Tasks, Limits]:
    """What is to be polished for the suprema and the bandwidth of every case, and the limits they compete with."""
    rows = _sampled_levels(samples)
    highest = rows.max(axis=2)
    limits = limits_of(samples)
    parts = [_grid_candidates(samples, rows, highest), _narrow_candidates(samples, brackets, roots, highest)]
    if samples.loop.dead_time_s.any():
        parts.append(ripple_tasks(samples, PEAKS, np.maximum(highest, limits.best)))
    return joined_tasks(*parts, _bandwidth_tasks(samples, rows[1], limits)), limits


def settled_peaks(tasks: Tasks, limits: Limits, omega: FloatArray, level: FloatArray) -> Peaks:
    """The suprema and bandwidths from the polished tasks."""
    cases = limits.best.shape[1]
    at = np.where(limits.at_zero >= limits.at_infinity, 0.0, math.inf)
    peak = np.isnan(tasks.level)
    # Ordered by value, the greatest of each row is written last. A supremum that the limit reaches as well
    # (within rounding) belongs to the limit.
    order = np.argsort(np.where(peak, level, -math.inf), kind="stable")
    order = order[peak[order]]
    row, case = tasks.quantity[order], tasks.case[order]
    top = np.full((len(PEAKS), cases), -math.inf)
    top_at = np.zeros_like(top)
    top[row, case] = level[order]
    top_at[row, case] = omega[order]
    inner = top > limits.best + 1e-13
    bandwidth = np.full(cases, math.nan)
    bandwidth[tasks.case[~peak]] = omega[~peak]
    return Peaks(np.where(inner, top, limits.best), np.where(inner, top_at, at), bandwidth)


def _sampled_levels(samples: Sampled) -> FloatArray:
    """(4, c, n) ln of the four gains on the grid."""
    gain = np.minimum(np.maximum(samples.nodes.gain, -_LARGE), _LARGE)
    size = np.exp(gain)
    turned = np.cos(samples.nodes.phase)
    square = 1.0 + size * size
    twice = (2.0 * size) * turned
    rows = np.empty((4, *gain.shape))
    # Rounding near −1 (1e-8 in |1 + L|) is all right here: the polisher is exact.
    tiny = 1e-16 * square
    np.log(np.maximum(square + twice, tiny), out=rows[0])
    rows[0] *= -0.5
    np.log(np.maximum(square - twice, tiny), out=rows[3])
    rows[3] *= 0.5
    rows[3] += rows[0]
    np.add(rows[0], gain, out=rows[1])
    np.add(rows[0], samples.compensator_gain, out=rows[2])
    return rows


def _grid_candidates(samples: Sampled, rows: FloatArray, highest: FloatArray) -> Tasks:
    omega = samples.nodes.omega_rad_s
    quantity, case, column = np.nonzero(rows >= (highest + _WORTH_POLISHING)[:, :, None])
    here = rows[quantity, case, column]
    inside = (column > 0) & (column < len(omega) - 1)
    before = rows[quantity, case, np.maximum(column - 1, 0)]
    after = rows[quantity, case, np.minimum(column + 1, len(omega) - 1)]
    local = np.nonzero(inside & (here >= before) & (here > after))[0]
    quantity, case, column = quantity[local], case[local], column[local]
    before, here, after = before[local], here[local], after[local]
    if len(column) > _MOST_PER_ROW * rows.shape[0] * rows.shape[1] // 2:
        kept = _greatest_per_row(rows, quantity, case, column)
        quantity, case, column = quantity[kept], case[kept], column[kept]
        before, here, after = before[kept], here[kept], after[kept]
    # The parabola through three samples (in the index, for speed) starts Newton's method close by.
    with np.errstate(invalid="ignore", over="ignore"):
        lean = 0.5 * (before - after) / np.minimum(before - 2.0 * here + after, -1e-300)
    lean = np.where(np.isfinite(lean), np.minimum(np.maximum(lean, -0.9), 0.9), 0.0)
    mid = omega[column]
    start = mid * np.where(lean > 0, omega[column + 1] / mid, mid / omega[column - 1]) ** lean
    left, right = around(omega, column)
    return _extremes(quantity, case, left, start, right)


def _greatest_per_row(rows: FloatArray, quantity: IntArray, case: IntArray, column: IntArray) -> IntArray:
    order = np.argsort(-rows[quantity, case, column], kind="stable")
    key = quantity * rows.shape[1] + case
    kept: list[int] = []
    seen: dict[int, int] = {}
    for item in order.tolist():
        count = seen.get(int(key[item]), 0)
        if count < _MOST_PER_ROW:
            seen[int(key[item])] = count + 1
            kept.append(item)
    return np.array(kept, dtype=np.int64)


def _narrow_candidates(samples: Sampled, brackets: Brackets, roots: ClosedLoopRoots, highest: FloatArray) -> Tasks:
    """The narrow places at which some gain comes near its greatest sample or exceeds it."""
    case, at, left, right = narrow_places(samples, brackets, roots)
    if not len(case):
        return _extremes(case, case, at, at, at)
    count = len(PEAKS)
    quantity = np.repeat(np.array(PEAKS, dtype=np.int64), len(at))
    case = np.tile(case, count)
    at, left, right = np.tile(at, count), np.tile(left, count), np.tile(right, count)
    level = log_level(Points.of(samples, quantity, case), at)
    worth = level > highest[quantity, case] + _WORTH_POLISHING
    return _extremes(quantity[worth], case[worth], left[worth], at[worth], right[worth])


def _bandwidth_tasks(samples: Sampled, levels: FloatArray, limits: Limits) -> Tasks:
    """One bracket per case around the lowest frequency at which |T| has fallen by √2."""
    omega = samples.nodes.omega_rad_s
    goal = limits.at_zero[1] - 0.5 * math.log(2.0)
    below = levels < goal[:, None]
    column = np.argmax(below, axis=1)
    case = np.nonzero(np.isfinite(goal) & (column > 0))[0]
    column = column[case]
    left, right = omega[column - 1], omega[column]
    high, low = levels[case, column - 1], levels[case, column]
    with np.errstate(invalid="ignore"):
        share = (high - goal[case]) / np.maximum(high - low, 1e-300)
    share = np.where(np.isfinite(share), np.clip(share, 0.0, 1.0), 0.5)
    quantity = np.full(len(case), int(Quantity.COMPLEMENTARY), dtype=np.int64)
    count = len(case)
    start = left * (right / left) ** share
    return Tasks(quantity, case, left, start, right, goal[case], np.ones(count), np.zeros(count))


def _extremes(quantity: IntArray, case: IntArray, left: FloatArray, start: FloatArray, right: FloatArray) -> Tasks:
    count = len(case)
    return Tasks(quantity, case, left, start, right, np.full(count, math.nan), np.ones(count), np.zeros(count))
