"""Intervals that hold one crossing each, and the proof that no others do.

Between two neighbouring frequencies the slope is bounded factor by factor (`slope_bounds`). An interval is settled
when the bound makes the curve monotone there (then the ends decide) or when the cone that the slopes open from both
ends leaves no room for the level. Every other interval is split. What is left at rounding level is a touching.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal, TypeAlias

import numpy as np

from engine.loop.gain_phase import gain_and_phase, slope
from engine.loop.grid import Sampled
from engine.loop.sections import BoolArray, IntArray, Sections
from engine.loop.slope_bounds import gain_slope_bounds, phase_slope_bounds
from engine.model.factored import FloatArray

Kind: TypeAlias = Literal["gain", "phase"]

TURN = 2.0 * math.pi
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

    @staticmethod
    def joined(parts: list[Brackets]) -> Brackets:
        if len(parts) == 1:
            return parts[0]
        return Brackets(*(np.concatenate([getattr(part, name) for part in parts]) for name in _BRACKET_FIELDS))

    def where(self, chosen: BoolArray | IntArray) -> Brackets:
        return Brackets(*(getattr(self, name)[chosen] for name in _BRACKET_FIELDS))


_BRACKET_FIELDS = ("case", "left", "right", "level", "start", "rising")


@dataclass(frozen=True, eq=False)
class _Intervals:
    """Intervals (p,) of the curve y (level 0 for the gain, every integer for the phase), still to be settled."""

    case: IntArray
    left: FloatArray
    right: FloatArray
    y_left: FloatArray
    y_right: FloatArray
    low: FloatArray
    high: FloatArray

    def where(self, chosen: BoolArray) -> _Intervals:
        return _Intervals(
            self.case[chosen],
            self.left[chosen],
            self.right[chosen],
            self.y_left[chosen],
            self.y_right[chosen],
            self.low[chosen],
            self.high[chosen],
        )


def turns(phase: FloatArray) -> FloatArray:
    """Phase in turns from −180°: an integer is a crossing."""
    return (phase + math.pi) / TURN


def isolated(
    samples: Sampled, gain_wanted: BoolArray, phase_wanted: BoolArray
) -> tuple[tuple[Brackets, BoolArray], tuple[Brackets, BoolArray]]:
    """For gain and phase: brackets around every crossing in the wanted (c, n−1) intervals; (c,) curve rests there."""
    loop, nodes = samples.loop, samples.nodes
    omega = nodes.omega_rad_s
    step = np.log(omega[1:] / omega[:-1])
    y_gain, y_phase = nodes.gain, turns(nodes.phase)
    off = np.abs(y_gain)
    near = off[:, :-1] + off[:, 1:] <= nodes.gain_steepness * step
    below = y_gain < 0
    gain_at = np.nonzero(gain_wanted & (near | (below[:, :-1] != below[:, 1:])))
    cell = np.floor(y_phase)
    off = y_phase - cell
    total = off[:, :-1] + off[:, 1:]
    near = np.minimum(total, 2.0 - total) * TURN <= nodes.phase_steepness * step
    phase_at = np.nonzero(phase_wanted & (near | (cell[:, :-1] != cell[:, 1:])) & ~nodes.jump)

    split = len(gain_at[0])
    case, column = np.concatenate([gain_at[0], phase_at[0]]), np.concatenate([gain_at[1], phase_at[1]])
    left, right = omega.take(column), omega.take(column + 1)
    low, high = _slopes_between(loop.at(case), left, right, split)
    # The passage of an undamped pair is no place for a hidden pair of crossings: let the ends decide.
    jump = nodes.jump[case, column]
    if jump.any():
        low, high = np.where(jump, 0.0, low), np.where(jump, 0.0, high)
    results = []
    parts: tuple[tuple[Kind, FloatArray, slice], ...] = (
        ("gain", y_gain, slice(0, split)),
        ("phase", y_phase, slice(split, None)),
    )
    for kind, y, part in parts:
        where, at = case[part], column[part]
        todo = _Intervals(where, left[part], right[part], y[where, at], y[where, at + 1], low[part], high[part])
        results.append(_settled(loop, todo, kind))
    return results[0], results[1]


def _slopes_between(own: Sections, left: FloatArray, right: FloatArray, split: int) -> tuple[FloatArray, FloatArray]:
    """Quick bounds of the slope over intervals, of the gain in the first `split` and of the phase [turns] in the rest.

    The slope in the middle, give or take the bend: each root r bends ln L by t − t², t = s/(s − r), and t is at most
    ω over the distance of jω from r.
    """
    middle = np.sqrt(left) * np.sqrt(right)
    rate = slope(own, middle)
    beyond = np.maximum(np.maximum(left - own.root.imag, own.root.imag - right), 0.0)
    with np.errstate(divide="ignore", invalid="ignore"):
        size = np.abs(own.root_weight) * right / np.sqrt(beyond * beyond + own.root.real * own.root.real)
        bend = np.add.reduce(size + size * size, axis=0) + own.dead_time_s * right
        reach = bend * (0.5000001 * np.log(right / left))
    centre = np.concatenate([rate.real[:split], rate.imag[split:] / TURN])
    reach[split:] /= TURN
    return centre - reach, centre + reach


def _tightened(loop: Sections, part: _Intervals, kind: Kind) -> _Intervals:
    """The same intervals with the slope bounds summed factor by factor."""
    nodes = np.concatenate([part.left[:, None], part.right[:, None]], axis=1)
    low, high = _bounds(loop.at(part.case).spread(), nodes, kind)
    return _Intervals(part.case, part.left, part.right, part.y_left, part.y_right, low[:, 0], high[:, 0])


def _bounds(own: Sections, nodes: FloatArray, kind: Kind) -> tuple[FloatArray, FloatArray]:
    if kind == "gain":
        return gain_slope_bounds(own, nodes)
    low, high = phase_slope_bounds(own, nodes)
    return low / TURN, high / TURN


def _settled(loop: Sections, todo: _Intervals, kind: Kind) -> tuple[Brackets, BoolArray]:
    """Bound more tightly, then split the intervals until each is settled."""
    noise = noise_of(loop, kind)
    flat = np.zeros(len(noise), bool)
    found: list[Brackets] = []
    for round_ in range(_ROUNDS):
        step = np.log(todo.right / todo.left)
        monotone = (todo.low >= 0) | (todo.high <= 0)
        bottom, top = _cone(todo.y_left, todo.y_right, todo.low, todo.high, step)
        tiny = noise[todo.case]
        near = _holds_level(bottom - tiny, top + tiny, kind)
        if not near.all():
            todo, step, monotone, tiny = todo.where(near), step[near], monotone[near], tiny[near]
        rest = ~monotone & (step > 1e-15)
        left_on, right_on = _off_level(todo.y_left, kind) <= tiny, _off_level(todo.y_right, kind) <= tiny
        if (left_on | right_on).any():
            travel = np.maximum(np.abs(todo.low), np.abs(todo.high)) * step
            still = left_on & right_on & (travel <= tiny)
            resting = still & ((step > 1e-4) | (todo.low == todo.high))
            flat[todo.case[resting]] = True
            found.append(_touching(todo, left_on & ~resting, right_on & ~resting))
            rest &= ~still
        found.append(_brackets_of(todo if monotone.all() else todo.where(monotone), kind))
        if not rest.any():
            break
        todo = todo.where(rest)
        todo = _tightened(loop, todo, kind) if round_ == 0 else _split(loop, todo, kind)
        todo = todo if round_ == 0 else _without_flat(todo, noise, kind, flat)
    result = Brackets.joined(found)
    # Where the curve rests on the level, its single nodes are no touching points.
    if not flat.any():
        return result, flat
    return result.where((result.left < result.right) | ~flat[result.case]), flat


def _without_flat(pieces: _Intervals, noise: FloatArray, kind: Kind, flat: BoolArray) -> _Intervals:
    """Drop whole splits that lie on the level within rounding at every node: the curve rests on it there."""
    on = _on_level(pieces, noise[pieces.case], kind)
    whole = on.reshape(-1, _PIECES).all(axis=1) & (pieces.right[::_PIECES] > pieces.left[::_PIECES] * 1.0005)
    if not whole.any():
        return pieces
    flat[pieces.case[::_PIECES][whole]] = True
    return pieces.where(~np.repeat(whole, _PIECES))


def _cone(
    y_left: FloatArray, y_right: FloatArray, low: FloatArray, high: FloatArray, step: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Least and greatest value that the slope bounds allow between the ends."""
    spread = np.maximum(high - low, 1e-300)
    change = y_right - y_left
    falling = np.clip((high * step - change) / spread, 0.0, step)
    rising = np.clip((change - low * step) / spread, 0.0, step)
    bottom = np.minimum(np.minimum(y_left, y_right), y_left + low * falling)
    top = np.maximum(np.maximum(y_left, y_right), y_left + high * rising)
    rises, falls = low >= 0, high <= 0
    return np.where(rises | falls, np.minimum(y_left, y_right), bottom), np.where(
        rises | falls, np.maximum(y_left, y_right), top
    )


def _holds_level(bottom: FloatArray, top: FloatArray, kind: Kind) -> BoolArray:
    if kind == "gain":
        return (bottom <= 0) & (top >= 0)
    return np.ceil(bottom) <= top


def _on_level(part: _Intervals, tiny: FloatArray, kind: Kind) -> BoolArray:
    return (_off_level(part.y_left, kind) <= tiny) & (_off_level(part.y_right, kind) <= tiny)


def _off_level(y: FloatArray, kind: Kind) -> FloatArray:
    return np.abs(y) if kind == "gain" else np.abs(y - np.rint(y))


def noise_of(loop: Sections, kind: Kind) -> FloatArray:
    """(c,) size of rounding in y: some ulps per factor."""
    factors = np.sum(np.abs(loop.root_weight), axis=0) + np.abs(loop.integrators) + 1.0
    ulps: FloatArray = 16.0 * float(np.finfo(float).eps) * factors
    return ulps * (1.0 + np.abs(loop.log_gain)) if kind == "gain" else ulps


def _brackets_of(part: _Intervals, kind: Kind) -> Brackets:
    """One bracket per level between the ends of intervals in which the curve is monotone."""
    if kind == "gain":
        index = np.nonzero((part.y_left < 0) != (part.y_right < 0))[0]
        level = np.zeros(len(index))
    else:
        first, last = np.floor(part.y_left), np.floor(part.y_right)
        count = np.abs(last - first).astype(np.int64)
        index = np.repeat(np.arange(len(count)), count)
        offset = np.arange(len(index)) - np.repeat(np.cumsum(count) - count, count)
        level = np.minimum(first, last)[index] + 1.0 + offset
    left, right = part.left[index], part.right[index]
    y_left, y_right = part.y_left[index], part.y_right[index]
    with np.errstate(invalid="ignore", divide="ignore"):
        share = (level - y_left) / (y_right - y_left)
    share = np.where(np.isfinite(share), np.minimum(np.maximum(share, 0.0), 1.0), 0.5)
    start = left * np.exp(np.log(right / left) * share)
    return Brackets(part.case[index], left, right, level, start, y_right > y_left)


def _touching(part: _Intervals, left: BoolArray, right: BoolArray) -> Brackets:
    """Ends that lie on a level within rounding; those beside a true crossing are dropped later."""
    at = np.concatenate([part.left[left], part.right[right]])
    y = np.concatenate([part.y_left[left], part.y_right[right]])
    case = np.concatenate([part.case[left], part.case[right]])
    return Brackets(case, at, at, np.rint(y), at, np.zeros(len(at), bool))


def _split(loop: Sections, part: _Intervals, kind: Kind) -> _Intervals:
    share = np.arange(1, _PIECES) / _PIECES
    inner = part.left[:, None] * np.exp(np.log(part.right / part.left)[:, None] * share)
    nodes = np.concatenate([part.left[:, None], inner, part.right[:, None]], axis=1)
    own = loop.at(part.case).spread()
    gain, phase = gain_and_phase(own, inner)
    y = gain if kind == "gain" else turns(phase)
    y = np.concatenate([part.y_left[:, None], y, part.y_right[:, None]], axis=1)
    low, high = _bounds(own, nodes, kind)
    return _Intervals(
        np.repeat(part.case, _PIECES),
        nodes[:, :-1].ravel(),
        nodes[:, 1:].ravel(),
        y[:, :-1].ravel(),
        y[:, 1:].ravel(),
        low.ravel(),
        high.ravel(),
    )


def no_brackets() -> Brackets:
    nothing = np.empty(0)
    return Brackets(np.empty(0, np.int64), nothing, nothing, nothing, nothing, np.empty(0, bool))
