"""Extrema and band crossings of responses, found between samples and proven not to be missed.

Each case is looked at on a net of instants that grow geometrically. Between two neighbours a response stays within a
known distance of the straight line through them: a mode of weight w and exponent λ leaves its own line over an
interval of length h by no more than |w|·e^{Re λ·t}·min(2, (h·|λ|)²/8). The cubic that also meets the slopes is closer
still where h·|λ| is small, (h·|λ|)⁴/384, and stays below the greatest of its four control values. Intervals that these
bounds rule out are dropped, the others are split, until what is left is one smooth arc to polish. A lightly damped
ripple that the net steps over is therefore looked at exactly where it can matter, and nowhere else.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property
from typing import Protocol, TypeAlias

import numpy as np
from numpy.typing import NDArray

from engine.model.factored import FloatArray

IntArray: TypeAlias = NDArray[np.int64]
BoolArray: TypeAlias = NDArray[np.bool_]

GREATEST, LAST_OUTSIDE, FIRST_REACHED = 0, 1, 2
SPLIT = 8
# h·|λ| up to which an interval is one smooth arc, and how many of them one is cut into at once.
ARC = 1.0
MOST_PARTS = 64
MOST_ROUNDS = 14
# Newton's steps in an arc; one that has not settled by then goes back and forth between its ends.
ARC_STEPS = 6
MOST_STEPS = 60
MOST_INTERVALS = 5_000
# Below this share of the response's scale a difference is rounding.
NEGLIGIBLE = 1e-12


@dataclass(frozen=True, eq=False)
class Glance:
    """Values of responses at the left ends of intervals, and what holds over each interval."""

    value: FloatArray
    deviation: FloatArray
    """Largest distance from the chord over the interval."""
    bend: FloatArray
    """Bound of |y″|·h over the interval, times h: the slope times h varies by no more than this."""
    turns: FloatArray
    """h·|λ| of the fastest mode that is still alive."""


Follower: TypeAlias = Callable[[FloatArray], tuple[FloatArray, FloatArray, FloatArray]]


class Responses(Protocol):
    """What the search needs to know of responses; k points are flat arrays of case, row and time."""

    def glance(self, case: IntArray, row: IntArray, at_s: FloatArray, length_s: FloatArray) -> Glance:
        """Values at (k,) instants and bounds over the intervals that begin there."""
        ...

    def follow(self, case: IntArray, row: IntArray, inside_s: FloatArray) -> Follower:
        """A function that gives y, y′ and y″ at (k,) instants, each in the smooth piece that holds `inside_s`."""
        ...


@dataclass(frozen=True, eq=False)
class Net:
    """Responses at the first instants of the search, and what holds between these."""

    time_s: FloatArray
    """(c, k), from 0; the last one lies where every response has settled."""
    value: FloatArray
    """(c, 3, k)"""
    high: FloatArray
    """(c, 3, k − 1) no response rises above this over the interval,"""
    low: FloatArray
    """(c, 3, k − 1) nor falls below this."""
    bend: FloatArray
    """(c, 3, k − 1)"""
    turns: FloatArray
    """(c, 3, k − 1)"""
    scale: FloatArray
    """(c, 3) size of each response, against which rounding is judged."""


def interval_bounds(
    time_s: FloatArray, value: FloatArray, slope: FloatArray, deviation: FloatArray, cubic_deviation: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """(c, 3, k − 1) highest and lowest values over the intervals of a net.

    Parameters
    ----------
    time_s : (c, k)
    value, slope : (c, 3, k) y and dy/dt
    deviation : (c, 3, k − 1) largest distance from the chord
    cubic_deviation : (c, 3, k − 1) and from the cubic with the values and slopes of both ends
    """
    third = np.diff(time_s, axis=1)[:, None, :] / 3.0
    left, right = value[:, :, :-1], value[:, :, 1:]
    after, before = left + third * slope[:, :, :-1], right - third * slope[:, :, 1:]
    top, bottom = np.maximum(left, right), np.minimum(left, right)
    high = np.minimum(top + deviation, np.maximum(top, np.maximum(after, before)) + cubic_deviation)
    low = np.maximum(bottom - deviation, np.minimum(bottom, np.minimum(after, before)) - cubic_deviation)
    return high, low


@dataclass(frozen=True, eq=False)
class Tasks:
    """What to find: of g = |y − reference| or sign·y, its greatest value, the last instant at which it reaches
    `level`, or the first."""

    kind: IntArray
    case: IntArray
    row: IntArray
    sign: FloatArray
    """±1, or 0 for |y − reference|."""
    reference: FloatArray
    """0 where sign is not 0."""
    level: FloatArray
    """For GREATEST: the value that counts if nothing exceeds it (the limit at ∞)."""

    def measure(self, task: IntArray, y: FloatArray) -> FloatArray:
        """g of the tasks at values y."""
        away = y - self.reference[task]
        up, down = self._factors
        measured: FloatArray = np.maximum(up[task] * away, down[task] * away)
        return measured

    def bound(self, task: IntArray, high: FloatArray, low: FloatArray) -> FloatArray:
        """The highest g of the tasks where y lies between `low` and `high`."""
        reference = self.reference[task]
        up, down = self._factors
        ends = np.where(up[task] > 0.0, high, low) - reference, np.where(down[task] > 0.0, high, low) - reference
        highest: FloatArray = np.maximum(up[task] * ends[0], down[task] * ends[1])
        return highest

    @cached_property
    def _factors(self) -> tuple[FloatArray, FloatArray]:
        """g is the greater of these two times the distance from the reference."""
        both = self.sign == 0.0
        return np.where(both, 1.0, self.sign), np.where(both, -1.0, self.sign)


@dataclass(eq=False)
class _Intervals:
    """Intervals that may hold what their tasks look for."""

    task: IntArray
    table: FloatArray
    """(7, k): start, length, g at both ends, then deviation, bend and turns as in `Glance`."""

    def only(self, keep: BoolArray) -> _Intervals:
        return _Intervals(self.task[keep], self.table[:, keep])

    def beside(self, other: _Intervals) -> _Intervals:
        return _Intervals(np.concatenate([self.task, other.task]), np.concatenate([self.table, other.table], axis=1))


@dataclass(eq=False)
class Findings:
    """(t,) value and instant per task. LAST_OUTSIDE without any instant outside: value and instant 0."""

    value: FloatArray
    at_s: FloatArray


def search(tasks: Tasks, net: Net, responses: Responses) -> Findings:
    """Carry out all tasks together."""
    state = _Search(tasks, net, responses)
    intervals = state.first_intervals()
    for _ in range(MOST_ROUNDS):
        unfinished = state.unfinished(intervals)
        if not unfinished.any() or np.count_nonzero(unfinished) > MOST_INTERVALS:
            break
        parts = state.split(intervals if unfinished.all() else intervals.only(unfinished))
        intervals = state.pruned(parts if unfinished.all() else intervals.only(~unfinished).beside(parts))
    return state.polished(intervals)


def _rows(array: FloatArray) -> FloatArray:
    """(3c, k) of (c, 3, k)."""
    return array.reshape(-1, array.shape[-1])


class _Search:
    """The running bounds of each task: the best value, the last instant outside, the first reached."""

    def __init__(self, tasks: Tasks, net: Net, responses: Responses) -> None:
        self.tasks, self.net, self.responses = tasks, net, responses
        self.scale = net.scale[tasks.case, tasks.row]
        self.greatest = tasks.kind == GREATEST
        self.last = tasks.kind == LAST_OUTSIDE
        self.first = tasks.kind == FIRST_REACHED
        self.best = tasks.level.copy()
        self.best_at = np.full(len(tasks.kind), np.inf)
        self.outside_until = np.full(len(tasks.kind), -1.0)
        self.reached_at = np.full(len(tasks.kind), np.inf)

    def first_intervals(self) -> _Intervals:
        """The intervals of the net that no bound rules out."""
        tasks, net = self.tasks, self.net
        all_tasks = np.arange(len(tasks.kind))
        flat = tasks.case * 3 + tasks.row
        column = all_tasks[:, None]
        g = tasks.measure(column, _rows(net.value)[flat])
        times = net.time_s[tasks.case]
        at = g.argmax(axis=1)
        higher = self.greatest & (g[all_tasks, at] > self.best + NEGLIGIBLE * self.scale)
        self.best = np.where(higher, g[all_tasks, at], self.best)
        self.best_at = np.where(higher, times[all_tasks, at], self.best_at)
        reached = g >= tasks.level[:, None]
        some = reached.any(axis=1)
        last = g.shape[1] - 1 - reached[:, ::-1].argmax(axis=1)
        self.outside_until = np.where(some, times[all_tasks, last], -1.0)
        self.reached_at = np.where(some, times[all_tasks, reached.argmax(axis=1)], np.inf)
        upper = tasks.bound(column, _rows(net.high)[flat], _rows(net.low)[flat])
        task, k = np.nonzero(self._possible(column, times[:, :-1], times[:, 1:], upper))
        own = flat[task]
        start = times[task, k]
        left, right = g[task, k], g[task, k + 1]
        beyond = upper[task, k] - np.maximum(left, right)
        bounds = beyond, _rows(net.bend)[own, k], _rows(net.turns)[own, k]
        return _Intervals(task, np.stack([start, times[task, k + 1] - start, left, right, *bounds]))

    def _possible(self, task: IntArray, start: FloatArray, end: FloatArray, upper: FloatArray) -> BoolArray:
        """Whether an interval may still hold what its task looks for."""
        level = np.where(self.greatest, self.best + NEGLIGIBLE * self.scale, self.tasks.level)[task]
        late_enough = np.where(self.last, self.outside_until, -np.inf)[task] <= start
        early_enough = np.where(self.first, self.reached_at, np.inf)[task] >= end
        possible: BoolArray = (upper >= level) & late_enough & early_enough
        return possible

    def unfinished(self, intervals: _Intervals) -> BoolArray:
        """(k,) intervals to split: what is no arc yet; for a crossing, all that its task is left with besides one."""
        task = intervals.task
        start, length, left, right, _, bend, turns = intervals.table
        # Crossings: the slope keeps its sign, and the ends lie on both sides. Stationary points: one arc holds at most
        # one where no living mode turns far.
        level = self.tasks.level[task]
        bracket = (np.abs(right - left) > bend) & ((left >= level) != (right >= level))
        tiny = length <= 4e-16 * (start + length)
        ready = np.where(self.greatest[task], turns <= ARC, bracket) | tiny
        waiting = np.zeros(len(self.scale), dtype=np.bool_)
        waiting[task[~ready]] = True
        unfinished: BoolArray = np.where(self.greatest[task], ~ready, waiting[task] & ~tiny)
        return unfinished

    def split(self, intervals: _Intervals) -> _Intervals:
        """Each interval in parts, as many as make arcs of it; the running bounds take in the new values."""
        tasks = self.tasks
        first, whole, left, right, _, _, turns = intervals.table
        wanted = np.minimum(np.maximum(np.ceil(turns / ARC), 2.0), MOST_PARTS)
        parts = np.where(self.greatest[intervals.task], wanted, SPLIT).astype(np.int64)
        ends = np.cumsum(parts)
        task = np.repeat(intervals.task, parts)
        length = np.repeat(whole / parts, parts)
        start = np.repeat(first, parts) + (np.arange(len(task)) - np.repeat(ends - parts, parts)) * length
        seen = self.responses.glance(tasks.case[task], tasks.row[task], start, length)
        begin = tasks.measure(task, seen.value)
        begin[ends - parts] = left
        end = np.append(begin[1:], 0.0)
        end[ends - 1] = right
        self.take_in(task, start, begin)
        return _Intervals(task, np.stack([start, length, begin, end, seen.deviation, seen.bend, seen.turns]))

    def take_in(self, task: IntArray, at_s: FloatArray, g: FloatArray) -> None:
        """Update the running bounds by values g of tasks at instants."""
        before = self.best.copy()
        greatest = self.greatest[task]
        # The limit at ∞ counts for no instant, so only what truly exceeds it does.
        over = g > self.tasks.level[task] + NEGLIGIBLE * self.scale[task]
        greatest &= over
        np.maximum.at(self.best, task[greatest], g[greatest])
        top = greatest & (g == self.best[task]) & (g > before[task])
        self.best_at[task[top]] = at_s[top]
        reached = g >= self.tasks.level[task]
        np.maximum.at(self.outside_until, task[reached], at_s[reached])
        np.minimum.at(self.reached_at, task[reached], at_s[reached])

    def pruned(self, intervals: _Intervals) -> _Intervals:
        """Without the intervals that the bounds rule out by now."""
        start, length, left, right, deviation, _, _ = intervals.table
        end = start + length
        # The ends of split intervals differ from the neighbours' starts by rounding.
        slack = 1e-14 * end
        upper = np.maximum(left, right) + deviation
        return intervals.only(self._possible(intervals.task, start + slack, end - slack, upper))

    def polished(self, intervals: _Intervals) -> Findings:
        """The final values and instants."""
        level = self.tasks.level[intervals.task]
        across = (intervals.table[2] >= level) != (intervals.table[3] >= level)
        chosen = intervals.only(self.greatest[intervals.task] | across)
        at = np.where(self.last, self.outside_until, self.reached_at)
        if len(chosen.task):
            found, y = self._newton(chosen)
            arcs = self.greatest[chosen.task]
            self.take_in(chosen.task[arcs], found[arcs], self.tasks.measure(chosen.task, y)[arcs])
            last, first = self.last[chosen.task], self.first[chosen.task]
            np.maximum.at(at, chosen.task[last], found[last])
            at[chosen.task[first]] = np.inf
            np.minimum.at(at, chosen.task[first], found[first])
        at = np.where(self.greatest, self.best_at, at)
        value = np.where(self.greatest, self.best, self.tasks.level)
        none = self.last & (self.outside_until < 0.0)
        return Findings(np.where(none, 0.0, value), np.where(none, 0.0, at))

    def _newton(self, pieces: _Intervals) -> tuple[FloatArray, FloatArray]:
        """Newton's method in every piece together: on y′ = 0 in arcs, on g = level in brackets; (k,) instants and y."""
        task, tasks = pieces.task, self.tasks
        start, length, left, right = pieces.table[:4]
        level, arc = tasks.level[task], self.greatest[task]
        # A bracket lies on one side of the reference.
        side = tasks.sign[task]
        follow = self.responses.follow(tasks.case[task], tasks.row[task], start + 0.5 * length)
        low, high, rising = start.copy(), start + length, right >= level
        # A step this short leaves its square, which is nothing.
        close = np.where(arc, 1e-5, 1e-8) * length
        with np.errstate(all="ignore"):
            t = low + length * np.where(arc, 0.5, np.clip((level - left) / (right - left), 0.0, 1.0))
            for turn in range(MOST_STEPS):
                y, slope, curvature = follow(t)
                if turn == 0:
                    side = np.where(side == 0.0, np.where(y >= tasks.reference[task], 1.0, -1.0), side)
                    target = tasks.reference[task] + side * level
                gap = y - target
                beyond = arc | ((side * gap >= 0.0) == rising)
                low, high = np.where(beyond, low, t), np.where(beyond & ~arc, t, high)
                move = np.where(arc, slope / curvature, gap / slope)
                step = t - np.where(np.isfinite(move), move, 0.0)
                # An arc without a stationary point has its greatest value at an end.
                inside = np.where(arc | ((step >= low) & (step <= high)), step, 0.5 * (low + high))
                ahead = np.minimum(np.maximum(inside, low), high)
                done = (np.abs(ahead - t) <= close) | (arc & (turn >= ARC_STEPS))
                by, t = ahead - t, ahead
                if done.all():
                    break
        # What the last step was too short to change is not computed again.
        return t, y + by * (slope + 0.5 * by * curvature)
