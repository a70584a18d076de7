"""Extrema and band crossings of responses, found between samples and proven not to be missed.

Each case is looked at on a net of instants that grow geometrically. Between two neighbours a response stays within a
known distance of the straight line through them: a mode of weight w and exponent λ leaves its own line over an
interval of length h by no more than |w|·e^{Re λ·t}·min(2, (h·|λ|)²/8). Intervals that this bound rules out are
dropped, the others are split, until what is left is one smooth arc to polish. A lightly damped ripple that
the net steps over is therefore looked at exactly where it can matter, and nowhere else.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Protocol, TypeAlias

import numpy as np
from numpy.typing import NDArray

from engine.model.factored import FloatArray

IntArray: TypeAlias = NDArray[np.int64]
BoolArray: TypeAlias = NDArray[np.bool_]

GREATEST, LAST_OUTSIDE, FIRST_REACHED = 0, 1, 2
SPLIT = 8
MOST_ROUNDS = 14
MOST_INTERVALS = 40_000
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


class Responses(Protocol):
    """What the search needs to know of responses; k points are flat arrays of case, row and time."""

    def glance(self, case: IntArray, row: IntArray, at_s: FloatArray, length_s: FloatArray) -> Glance:
        """Values at (k,) instants and bounds over the intervals that begin there."""
        ...

    def derivatives(self, case: IntArray, row: IntArray, at_s: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
        """y, y′ and y″ at (k,) instants."""
        ...


@dataclass(frozen=True, eq=False)
class Net:
    """Responses at the first instants of the search."""

    time_s: FloatArray
    """(c, k), from 0; the last one lies where every response has settled."""
    value: FloatArray
    """(c, 3, k)"""
    deviation: FloatArray
    """(c, 3, k − 1)"""
    bend: FloatArray
    """(c, 3, k − 1)"""
    turns: FloatArray
    """(c, 3, k − 1)"""
    scale: FloatArray
    """(c, 3) size of each response, against which rounding is judged."""


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
    level: FloatArray
    """For GREATEST: the value that counts if nothing exceeds it (the limit at ∞)."""

    def measure(self, task: IntArray, y: FloatArray) -> FloatArray:
        """g of the tasks at values y."""
        sign = self.sign[task]
        measured: FloatArray = np.where(sign == 0.0, np.abs(y - self.reference[task]), sign * y)
        return measured


@dataclass(eq=False)
class _Intervals:
    task: IntArray
    start: FloatArray
    length: FloatArray
    left: FloatArray
    right: FloatArray
    deviation: FloatArray
    bend: FloatArray
    turns: FloatArray

    def only(self, keep: BoolArray) -> _Intervals:
        return _Intervals(*(getattr(self, name)[keep] for name in self.__dataclass_fields__))

    def beside(self, other: _Intervals) -> _Intervals:
        pairs = ((getattr(self, name), getattr(other, name)) for name in self.__dataclass_fields__)
        return _Intervals(*(np.concatenate(pair) for pair in pairs))


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
        if not unfinished.any() or np.count_nonzero(unfinished) * SPLIT > MOST_INTERVALS:
            break
        intervals = state.pruned(intervals.only(~unfinished).beside(state.split(intervals.only(unfinished))))
    return state.polished(intervals)


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
        y = net.value[tasks.case, tasks.row]
        all_tasks = np.arange(len(tasks.kind))
        g = np.where(tasks.sign[:, None] == 0.0, np.abs(y - tasks.reference[:, None]), tasks.sign[:, None] * y)
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
        deviation = net.deviation[tasks.case, tasks.row]
        upper = np.maximum(g[:, :-1], g[:, 1:]) + deviation
        task, k = np.nonzero(self._possible(all_tasks[:, None], times[:, :-1], times[:, 1:], upper))
        case, row = tasks.case[task], tasks.row[task]
        start = times[task, k]
        return _Intervals(
            task,
            start,
            times[task, k + 1] - start,
            g[task, k],
            g[task, k + 1],
            deviation[task, k],
            net.bend[case, row, k],
            net.turns[case, row, k],
        )

    def _possible(self, task: IntArray, start: FloatArray, end: FloatArray, upper: FloatArray) -> BoolArray:
        """Whether an interval may still hold what its task looks for."""
        level = np.where(self.greatest, self.best + NEGLIGIBLE * self.scale, self.tasks.level)[task]
        late_enough = np.where(self.last, self.outside_until, -np.inf)[task] <= start
        early_enough = np.where(self.first, self.reached_at, np.inf)[task] >= end
        possible: BoolArray = (upper >= level) & late_enough & early_enough
        return possible

    def unfinished(self, intervals: _Intervals) -> BoolArray:
        """(k,) intervals to split: all those of a task that is not down to arcs it can polish."""
        task = intervals.task
        # Stationary points: one arc holds at most one where no living mode turns far.
        arc = intervals.turns <= 0.5
        # Crossings: the slope keeps its sign, and the ends lie on both sides.
        drop = np.where(self.last[task], intervals.left - intervals.right, intervals.right - intervals.left)
        level = self.tasks.level[task]
        low, high = np.minimum(intervals.left, intervals.right), np.maximum(intervals.left, intervals.right)
        bracket = (drop > intervals.bend) & (low < level) & (high >= level)
        tiny = intervals.length <= 4e-16 * (intervals.start + intervals.length)
        ready = np.where(self.greatest[task], arc, bracket) | tiny
        waiting = np.zeros(len(self.scale), dtype=np.bool_)
        waiting[task[~ready]] = True
        unfinished: BoolArray = waiting[task] & ~tiny
        return unfinished

    def split(self, intervals: _Intervals) -> _Intervals:
        """Each interval in SPLIT parts; the running bounds take in the new values."""
        tasks = self.tasks
        task = np.repeat(intervals.task, SPLIT)
        length = np.repeat(intervals.length / SPLIT, SPLIT)
        count = len(intervals.task)
        start = (intervals.start[:, None] + np.arange(SPLIT) * (intervals.length / SPLIT)[:, None]).ravel()
        seen = self.responses.glance(tasks.case[task], tasks.row[task], start, length)
        left = tasks.measure(task, seen.value).reshape(count, SPLIT)
        left[:, 0] = intervals.left
        right = np.concatenate([left[:, 1:], intervals.right[:, None]], axis=1)
        self.take_in(task, start, left.ravel())
        return _Intervals(task, start, length, left.ravel(), right.ravel(), seen.deviation, seen.bend, seen.turns)

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
        upper = np.maximum(intervals.left, intervals.right) + intervals.deviation
        end = intervals.start + intervals.length
        # The ends of split intervals differ from the neighbours' starts by rounding.
        slack = 1e-14 * end
        return intervals.only(self._possible(intervals.task, intervals.start + slack, end - slack, upper))

    def polished(self, intervals: _Intervals) -> Findings:
        """The final values and instants."""
        greatest = self.greatest[intervals.task]
        self._polish_extrema(intervals.only(greatest))
        at = np.where(self.greatest, self.best_at, np.where(self.last, self.outside_until, self.reached_at))
        level = self.tasks.level[intervals.task]
        across = (intervals.left >= level) != (intervals.right >= level)
        crossings = intervals.only(~greatest & across)
        if len(crossings.task):
            crossed = self._crossings(crossings)
            last, first = self.last[crossings.task], self.first[crossings.task]
            np.maximum.at(at, crossings.task[last], crossed[last])
            at[crossings.task[first]] = np.inf
            np.minimum.at(at, crossings.task[first], crossed[first])
        value = np.where(self.greatest, self.best, self.tasks.level)
        none = self.last & (self.outside_until < 0.0)
        return Findings(np.where(none, 0.0, value), np.where(none, 0.0, at))

    def _polish_extrema(self, arcs: _Intervals) -> None:
        if not len(arcs.task):
            return
        case, row = self.tasks.case[arcs.task], self.tasks.row[arcs.task]
        low, high = arcs.start, arcs.start + arcs.length
        at = 0.5 * (low + high)
        for _ in range(6):
            _, slope, curvature = self.responses.derivatives(case, row, at)
            with np.errstate(all="ignore"):
                move = np.where(curvature == 0.0, 0.0, slope / curvature)
            # Away from a maximum Newton's step goes the wrong way: go up instead, as far as the arc goes.
            previous, at = at, np.clip(at - move, low, high)
            if np.all(np.abs(at - previous) <= 1e-9 * arcs.length):
                break
        y, _, _ = self.responses.derivatives(case, row, at)
        self.take_in(arcs.task, at, self.tasks.measure(arcs.task, y))

    def _crossings(self, brackets: _Intervals) -> FloatArray:
        """Newton's method on g = level inside each bracket, halving where it would leave it."""
        task, tasks = brackets.task, self.tasks
        case, row, sign, level = tasks.case[task], tasks.row[task], tasks.sign[task], tasks.level[task]
        low, high = brackets.start.copy(), brackets.start + brackets.length
        rising = brackets.right >= level
        t = low + brackets.length * np.clip((level - brackets.left) / (brackets.right - brackets.left), 0.0, 1.0)
        for _ in range(60):
            y, slope, _ = self.responses.derivatives(case, row, t)
            side = np.where(sign == 0.0, np.where(y >= tasks.reference[task], 1.0, -1.0), sign)
            gap = tasks.measure(task, y) - level
            beyond = (gap >= 0.0) == rising
            low, high = np.where(beyond, low, t), np.where(beyond, t, high)
            with np.errstate(all="ignore"):
                step = t - gap / (side * slope)
            ahead = np.where((step >= low) & (step <= high), step, 0.5 * (low + high))
            done = (np.abs(ahead - t) <= 1e-15 * t) | (np.abs(gap) <= 1e-15 * self.scale[task])
            t = np.where(done, t, ahead)
            if done.all():
                break
        return t
