"""Levels at a frequency, the worst in a band, and the worst against a mask: extrema polished, not sampled."""

from __future__ import annotations

import math
from dataclasses import dataclass
from itertools import pairwise
from typing import Literal, TypeAlias

import numpy as np

from engine.loop.analysis import Analysis, analysis_of
from engine.loop.closed_loop_gain import Points, Quantity, log_level
from engine.loop.loop_set import LoopSet
from engine.loop.margins import DB
from engine.loop.narrow import narrow_places
from engine.loop.polish import Tasks, around, joined_tasks, polished
from engine.loop.ripples import ripple_tasks
from engine.loop.sections import IntArray
from engine.model.factored import FloatArray

BandQuantity: TypeAlias = Literal[
    "loop_gain_db",
    "loop_phase_deg",
    "sensitivity_db",
    "complementary_sensitivity_db",
    "effort_gain_at_db",
    "load_gain_db",
    "command_gain_db",
]

_QUANTITY = {
    "loop_gain_db": Quantity.LOOP,
    "loop_phase_deg": Quantity.PHASE,
    "sensitivity_db": Quantity.SENSITIVITY,
    "complementary_sensitivity_db": Quantity.COMPLEMENTARY,
    "effort_gain_at_db": Quantity.EFFORT,
    "load_gain_db": Quantity.LOAD,
    # Without a command filter the output follows the command by T.
    "command_gain_db": Quantity.COMPLEMENTARY,
}


@dataclass(frozen=True, slots=True)
class _Segment:
    """A stretch of frequencies with a limit that is a straight line over ln ω."""

    low: float
    high: float
    limit_low: float
    limit_high: float

    @property
    def tilt(self) -> float:
        """Rise of the limit per unit of ln ω."""
        return (self.limit_high - self.limit_low) / math.log(self.high / self.low)

    def limit(self, omega: FloatArray) -> FloatArray:
        share = np.log(omega / self.low) / math.log(self.high / self.low)
        line: FloatArray = self.limit_low + (self.limit_high - self.limit_low) * share
        return line


def level_at(loops: LoopSet, quantity: BandQuantity, omega_rad_s: float) -> FloatArray:
    """(c,) the quantity at one frequency > 0, in dB or degrees; ±inf at an undamped root of the loop."""
    ready = analysis_of(loops)
    case = np.arange(loops.count)
    kind = _QUANTITY[quantity]
    omega = np.full(loops.count, float(omega_rad_s))
    return log_level(_points(ready, kind, case), omega) * _unit(kind)


def extreme_over(
    loops: LoopSet, quantity: BandQuantity, low: float, high: float, which: Literal["greatest", "least"]
) -> tuple[FloatArray, FloatArray]:
    """(c,) greatest or least value over 0 < low ≤ ω ≤ high, in dB or degrees, and the frequencies [rad/s] where."""
    if high <= low:
        return level_at(loops, quantity, low), np.full(loops.count, float(low))
    value, _, at = _worst(loops, quantity, [_Segment(low, high, 0.0, 0.0)], 1.0 if which == "greatest" else -1.0)
    return value, at


def worst_against_mask(
    loops: LoopSet, quantity: BandQuantity, mask: FloatArray, side: Literal["at_most", "at_least"]
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """(c,) value, limit and frequency where the quantity is nearest to, or furthest past, a mask.

    mask: (k, 2) rows of ω > 0 [rad/s], not falling, and limit [dB or deg], joined by straight lines over log ω;
    two rows at one frequency make a step, both of whose limits hold there.
    """
    rows = np.asarray(mask, dtype=np.float64).tolist()
    segments = [_Segment(a[0], b[0], a[1], b[1]) for a, b in pairwise(rows) if b[0] > a[0]]
    if not segments:
        value, at = level_at(loops, quantity, rows[0][0]), np.full(loops.count, rows[0][0])
        limits = [row[1] for row in rows]
        return value, np.full(loops.count, min(limits) if side == "at_most" else max(limits)), at
    return _worst(loops, quantity, segments, 1.0 if side == "at_most" else -1.0)


def _worst(
    loops: LoopSet, quantity: BandQuantity, segments: list[_Segment], sign: float
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Where sign·(value − limit) is greatest: value, limit and frequency per case."""
    ready = analysis_of(loops)
    kind = _QUANTITY[quantity]
    unit = _unit(kind)
    row = _sampled_row(ready, kind)
    tasks, owner = [], []
    for index, segment in enumerate(segments):
        part = _candidates(ready, kind, row, segment, sign, segment.tilt / unit)
        tasks.append(part)
        owner.append(np.full(len(part.case), index))
    task = joined_tasks(*tasks)
    omega, level = polished(ready.samples, task)
    place = np.concatenate(owner)
    value = level * unit
    limit = np.empty_like(value)
    for index, segment in enumerate(segments):
        mine = place == index
        limit[mine] = segment.limit(omega[mine])
    excess = sign * (value - limit)
    best = np.full(loops.count, -1, dtype=np.int64)
    # Written in rising order, the worst of each case stays.
    order = np.argsort(excess, kind="stable")
    best[task.case[order]] = order
    return value[best], limit[best], omega[best]


def _candidates(ready: Analysis, kind: Quantity, row: FloatArray, segment: _Segment, sign: float, tilt: float) -> Tasks:
    """The ends, the local extremes of the samples between them, and places where a narrow one may hide."""
    count = row.shape[0]
    omega = ready.samples.nodes.omega_rad_s
    inside = np.nonzero((omega > segment.low) & (omega < segment.high))[0]
    height = sign * (row[:, inside] - tilt * np.log(omega[inside]))
    case, end = np.repeat(np.arange(count), 2), np.tile([segment.low, segment.high], count)
    at_ends = sign * (log_level(_points(ready, kind, case), end) - tilt * np.log(end))
    found = [(case, end, end, end), _local_extremes(omega, inside, height, segment)]
    where, at, before, after = narrow_places(ready.samples, ready.isolated.brackets, ready.roots)
    held = (at > segment.low) & (at < segment.high)
    found.append((where[held], before[held], at[held], after[held]))
    cases, left, start, right = (np.concatenate(parts) for parts in zip(*found, strict=True))
    size = len(cases)
    tasks = Tasks(
        np.full(size, int(kind), dtype=np.int64),
        cases,
        np.maximum(left, segment.low),
        start,
        np.minimum(right, segment.high),
        np.full(size, math.nan),
        np.full(size, sign),
        np.full(size, tilt),
    )
    if kind in (Quantity.LOOP, Quantity.PHASE):
        return tasks
    best = np.maximum(at_ends.reshape(count, 2).max(axis=1), height.max(axis=1, initial=-math.inf))
    band = (segment.low, segment.high)
    return joined_tasks(tasks, ripple_tasks(ready.samples, (kind,), best[None, :], sign, tilt, band))


def _local_extremes(
    omega: FloatArray, inside: IntArray, height: FloatArray, segment: _Segment
) -> tuple[IntArray, FloatArray, FloatArray, FloatArray]:
    """Case, bracket and start of each local maximum of the samples; the middle where no sample lies inside."""
    count = height.shape[0]
    if not len(inside):
        middle = np.full(count, math.sqrt(segment.low) * math.sqrt(segment.high))
        return np.arange(count), np.full(count, segment.low), middle, np.full(count, segment.high)
    padded = np.pad(height, ((0, 0), (1, 1)), constant_values=-math.inf)
    case, column = np.nonzero((height >= padded[:, :-2]) & (height >= padded[:, 2:]))
    column = inside[column]
    left, right = around(omega, column)
    return case, left, omega[column], right


def _sampled_row(ready: Analysis, kind: Quantity) -> FloatArray:
    """(c, n) ln of the quantity (radians for the phase) on the grid."""
    nodes = ready.samples.nodes
    shape = nodes.gain.shape
    case = np.repeat(np.arange(shape[0]), shape[1])
    points = _points(ready, kind, case)
    return log_level(points, np.tile(nodes.omega_rad_s, shape[0])).reshape(shape)


def _points(ready: Analysis, kind: Quantity, case: IntArray) -> Points:
    return Points.of(ready.samples, np.full(len(case), int(kind), dtype=np.int64), case)


def _unit(kind: Quantity) -> float:
    return math.degrees(1.0) if kind == Quantity.PHASE else DB
