"""Intervals that hold one crossing each, and the proof that no others do.

Between two neighbouring frequencies the slope is bounded factor by factor (`slope_bounds`). An interval is settled
when the bound makes the curve monotone there (then the ends decide) or when the cone that the slopes open from both
ends leaves no room for the level. Every other interval is bounded more tightly, then split. What is left at rounding
level is a touching.

Gain and phase go through together: y is the phase in turns from −180°, or ln|L| in units so large that it stays within
±1/2. So a crossing is an integer y for both, and for the gain that integer is always 0.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from engine.loop.gain_phase import gain_and_phase, slope
from engine.loop.grid import Sampled
from engine.loop.sections import BoolArray, IntArray, Sections
from engine.loop.slope_bounds import gain_slope_bounds, phase_slope_bounds
from engine.model.factored import FloatArray

TURN = 2.0 * math.pi
_GAIN_UNIT = 2.0**11
"""ln|L| = y·_GAIN_UNIT: a power of two scales without rounding."""
_PIECES = 4
_ROUNDS = 40


@dataclass(frozen=True, eq=False)
class Brackets:
    """Intervals with exactly one crossing of `level` (left < right), or touching points (left == right)."""

    case: IntArray
    left: FloatArray
    right: FloatArray
    level: FloatArray
    """0 for the gain; turns from −180° for the phase."""
    start: FloatArray
    """Where the chord meets the level."""
    rising: BoolArray
    phase: BoolArray
    """Whether the phase crosses, else the gain."""

    @staticmethod
    def joined(parts: list[Brackets]) -> Brackets:
        """All in one, in order."""
        if len(parts) == 1:
            return parts[0]
        return Brackets(*(np.concatenate([getattr(part, name) for part in parts]) for name in _BRACKET_FIELDS))

    def where(self, chosen: BoolArray | IntArray) -> Brackets:
        """The chosen ones."""
        return Brackets(*(getattr(self, name)[chosen] for name in _BRACKET_FIELDS))


_BRACKET_FIELDS = ("case", "left", "right", "level", "start", "rising", "phase")


@dataclass(frozen=True, eq=False)
class _Intervals:
    """Intervals (p,) of curves y, still to be settled; low and high bound dy/d ln ω, tiny is rounding in y."""

    case: IntArray
    phase: BoolArray
    tiny: FloatArray
    left: FloatArray
    right: FloatArray
    y_left: FloatArray
    y_right: FloatArray
    low: FloatArray
    high: FloatArray

    def where(self, chosen: BoolArray) -> _Intervals:
        return _Intervals(
            self.case[chosen],
            self.phase[chosen],
            self.tiny[chosen],
            self.left[chosen],
            self.right[chosen],
            self.y_left[chosen],
            self.y_right[chosen],
            self.low[chosen],
            self.high[chosen],
        )


def turns(phase: FloatArray) -> FloatArray:
    """Phase in turns from −180°: an integer is a crossing."""
    return (phase + math.pi) * (1.0 / TURN)


def noise_of(loop: Sections) -> tuple[FloatArray, FloatArray]:
    """(c,) size of rounding, some ulps per factor: in ln|L|, and in the phase [turns]."""
    factors = np.add.reduce(np.abs(loop.root_weight), axis=0) + np.abs(loop.integrators) + 1.0
    ulps: FloatArray = 16.0 * float(np.finfo(float).eps) * factors
    return ulps * (1.0 + np.abs(loop.log_gain)), ulps


def isolated(
    samples: Sampled, gain_range: tuple[FloatArray, FloatArray], phase_range: tuple[FloatArray, FloatArray]
) -> tuple[Brackets, BoolArray]:
    """Brackets around every crossing; (2, c) whether the gain or the phase rests on its level over a stretch.

    The ranges are (c,) lowest and highest frequency at which crossings are wanted [rad/s].
    """
    loop, nodes = samples.loop, samples.nodes
    omega = nodes.omega_rad_s
    step = np.log(omega[1:] / omega[:-1])
    off = np.abs(nodes.gain)
    below = nodes.gain < 0
    near = off[:, :-1] + off[:, 1:] <= nodes.gain_steepness * step
    near |= below[:, :-1] != below[:, 1:]
    gain_case, gain_column = np.nonzero(near)
    y = turns(nodes.phase)
    cell = np.floor(y)
    off = y - cell
    total = off[:, :-1] + off[:, 1:]
    near = np.minimum(total, 2.0 - total) <= nodes.phase_steepness * (step * (1.0 / TURN))
    near |= cell[:, :-1] != cell[:, 1:]
    phase_case, phase_column = np.nonzero(near)

    case, column = np.concatenate([gain_case, phase_case]), np.concatenate([gain_column, phase_column])
    phase = np.arange(len(case)) >= len(gain_case)
    left, right = omega.take(column), omega.take(column + 1)
    low_end = np.where(phase, phase_range[0].take(case), gain_range[0].take(case))
    high_end = np.where(phase, phase_range[1].take(case), gain_range[1].take(case))
    jump = nodes.jump[case, column]
    wanted = (right > low_end) & (left < high_end) & ~(phase & jump)
    case, column, phase, left, right = case[wanted], column[wanted], phase[wanted], left[wanted], right[wanted]
    low, high = _quick_bounds(loop.at(case), left, right, phase)
    if jump.any():
        # The passage of an undamped pair is no place for a hidden pair of crossings: let the ends decide.
        low, high = np.where(jump[wanted], 0.0, low), np.where(jump[wanted], 0.0, high)
    gain_noise, phase_noise = noise_of(loop)
    tiny = np.where(phase, phase_noise.take(case), gain_noise.take(case) / _GAIN_UNIT)
    y_left = np.where(phase, y[case, column], nodes.gain[case, column] / _GAIN_UNIT)
    y_right = np.where(phase, y[case, column + 1], nodes.gain[case, column + 1] / _GAIN_UNIT)
    return _settled(loop, _Intervals(case, phase, tiny, left, right, y_left, y_right, low, high))


def _settled(loop: Sections, todo: _Intervals) -> tuple[Brackets, BoolArray]:
    """Bound more tightly, then split the intervals until each is settled."""
    flat = np.zeros((2, loop.log_gain.shape[0]), bool)
    found: list[Brackets] = []
    for round_ in range(_ROUNDS):
        step = np.log(todo.right / todo.left)
        monotone = (todo.low >= 0) | (todo.high <= 0)
        bottom, top = _cone(todo, monotone, step)
        near = np.ceil(bottom - todo.tiny) <= top + todo.tiny
        if not near.all():
            todo, step, monotone = todo.where(near), step[near], monotone[near]
        rest = ~monotone & (step > 1e-15)
        left_on, right_on = _off_level(todo.y_left) <= todo.tiny, _off_level(todo.y_right) <= todo.tiny
        if (left_on | right_on).any():
            travel = np.maximum(np.abs(todo.low), np.abs(todo.high)) * step
            still = left_on & right_on & (travel <= todo.tiny)
            resting = still & ((step > 1e-4) | (todo.low == todo.high))
            flat[todo.phase[resting].astype(np.int64), todo.case[resting]] = True
            found.append(_touching(todo, left_on & ~resting, right_on & ~resting))
            rest &= ~still
        found.append(_brackets_of(todo if monotone.all() else todo.where(monotone)))
        if not rest.any():
            break
        todo = todo.where(rest)
        todo = _tightened(loop, todo) if round_ == 0 else _without_flat(_split(loop, todo), flat)
    result = Brackets.joined(found)
    if not flat.any():
        return result, flat
    # Where the curve rests on the level, its single nodes are no touching points.
    return result.where((result.left < result.right) | ~flat[result.phase.astype(np.int64), result.case]), flat


def _quick_bounds(
    own: Sections, left: FloatArray, right: FloatArray, phase: BoolArray
) -> tuple[FloatArray, FloatArray]:
    """Bounds of dy/d ln ω: the slope in the middle, give or take the bend.

    Each root r bends ln L by t − t², t = s/(s − r), and t is at most ω over the distance of jω from r.
    """
    middle = np.sqrt(left) * np.sqrt(right)
    rate = slope(own, middle)
    beyond = np.maximum(np.maximum(left - own.root.imag, own.root.imag - right), 0.0)
    with np.errstate(divide="ignore", invalid="ignore"):
        size = np.abs(own.root_weight) * right / np.sqrt(beyond * beyond + own.root.real * own.root.real)
        bend = np.add.reduce(size + size * size, axis=0) + own.dead_time_s * right
        reach = bend * (0.5000001 * np.log(right / left))
    centre = np.where(phase, rate.imag, rate.real)
    unit = np.where(phase, 1.0 / TURN, 1.0 / _GAIN_UNIT)
    return (centre - reach) * unit, (centre + reach) * unit


def _tightened(loop: Sections, part: _Intervals) -> _Intervals:
    """The same intervals with the slope bounds summed factor by factor."""
    nodes = np.concatenate([part.left[:, None], part.right[:, None]], axis=1)
    low, high = _bounds(loop.at(part.case), nodes, part.phase)
    return _Intervals(
        part.case,
        part.phase,
        part.tiny,
        part.left,
        part.right,
        part.y_left,
        part.y_right,
        low[:, 0],
        high[:, 0],
    )


def _bounds(own: Sections, nodes: FloatArray, phase: BoolArray) -> tuple[FloatArray, FloatArray]:
    """(p, m−1) bounds of dy/d ln ω between the (p, m) nodes."""
    low, high = np.empty((nodes.shape[0], nodes.shape[1] - 1)), np.empty((nodes.shape[0], nodes.shape[1] - 1))
    for chosen, bounds, unit in (
        (~phase, gain_slope_bounds, 1.0 / _GAIN_UNIT),
        (phase, phase_slope_bounds, 1.0 / TURN),
    ):
        if chosen.any():
            least, greatest = bounds(own.at(np.nonzero(chosen)[0]).spread(), nodes[chosen])
            low[chosen], high[chosen] = least * unit, greatest * unit
    return low, high


def _split(loop: Sections, part: _Intervals) -> _Intervals:
    share = np.arange(1, _PIECES) / _PIECES
    inner = part.left[:, None] * np.exp(np.log(part.right / part.left)[:, None] * share)
    nodes = np.concatenate([part.left[:, None], inner, part.right[:, None]], axis=1)
    own = loop.at(part.case)
    gain, phase = gain_and_phase(own.spread(), inner)
    y = np.where(part.phase[:, None], turns(phase), gain / _GAIN_UNIT)
    y = np.concatenate([part.y_left[:, None], y, part.y_right[:, None]], axis=1)
    low, high = _bounds(own, nodes, part.phase)
    return _Intervals(
        np.repeat(part.case, _PIECES),
        np.repeat(part.phase, _PIECES),
        np.repeat(part.tiny, _PIECES),
        nodes[:, :-1].ravel(),
        nodes[:, 1:].ravel(),
        y[:, :-1].ravel(),
        y[:, 1:].ravel(),
        low.ravel(),
        high.ravel(),
    )


def _without_flat(pieces: _Intervals, flat: BoolArray) -> _Intervals:
    """Drop whole splits that lie on the level within rounding at every node: the curve rests on it there."""
    on = (_off_level(pieces.y_left) <= pieces.tiny) & (_off_level(pieces.y_right) <= pieces.tiny)
    whole = on.reshape(-1, _PIECES).all(axis=1) & (pieces.right[::_PIECES] > pieces.left[::_PIECES] * 1.0005)
    if not whole.any():
        return pieces
    flat[pieces.phase[::_PIECES][whole].astype(np.int64), pieces.case[::_PIECES][whole]] = True
    return pieces.where(~np.repeat(whole, _PIECES))


def _cone(part: _Intervals, monotone: BoolArray, step: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Least and greatest value that the slope bounds allow between the ends."""
    low, high = part.low, part.high
    bottom, top = np.minimum(part.y_left, part.y_right), np.maximum(part.y_left, part.y_right)
    if monotone.all():
        return bottom, top
    spread = np.maximum(high - low, 1e-300)
    change = part.y_right - part.y_left
    with np.errstate(invalid="ignore", over="ignore"):
        falling = np.minimum(np.maximum((high * step - change) / spread, 0.0), step)
        rising = np.minimum(np.maximum((change - low * step) / spread, 0.0), step)
        lowest, highest = part.y_left + low * falling, part.y_left + high * rising
    # An unbounded slope (nan here) rules nothing out.
    lowest = np.where(np.isnan(lowest), -math.inf, lowest)
    highest = np.where(np.isnan(highest), math.inf, highest)
    return (
        np.where(monotone, bottom, np.minimum(bottom, lowest)),
        np.where(monotone, top, np.maximum(top, highest)),
    )


def _off_level(y: FloatArray) -> FloatArray:
    return np.abs(y - np.rint(y))


def _brackets_of(part: _Intervals) -> Brackets:
    """One bracket per level between the ends of intervals in which the curve is monotone."""
    first, last = np.floor(part.y_left), np.floor(part.y_right)
    count = np.abs(last - first).astype(np.int64)
    index = np.repeat(np.arange(len(count)), count)
    level = np.minimum(first, last)[index] + 1.0
    if count.max(initial=0) > 1:
        level += np.arange(len(index)) - np.repeat(np.cumsum(count) - count, count)
    left, right = part.left[index], part.right[index]
    y_left, y_right = part.y_left[index], part.y_right[index]
    share = np.minimum(np.maximum((level - y_left) / (y_right - y_left), 0.0), 1.0)
    start = left * np.exp(np.log(right / left) * share)
    return Brackets(part.case[index], left, right, level, start, y_right > y_left, part.phase[index])


def _touching(part: _Intervals, left: BoolArray, right: BoolArray) -> Brackets:
    """Ends that lie on a level within rounding; those beside a true crossing are dropped later."""
    at = np.concatenate([part.left[left], part.right[right]])
    y = np.concatenate([part.y_left[left], part.y_right[right]])
    case = np.concatenate([part.case[left], part.case[right]])
    phase = np.concatenate([part.phase[left], part.phase[right]])
    return Brackets(case, at, at, np.rint(y), at, np.zeros(len(at), bool), phase)
