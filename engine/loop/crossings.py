"""All frequencies at which the gain crosses 1 or the phase crosses −180° (mod 360°): proven, then polished.

Between two neighbouring frequencies the slope is bounded factor by factor (`slope_bounds`). An interval is settled
when the bound makes the curve monotone there (then the ends decide) or when the cone that the slopes open from both
ends leaves no room for the level. Every other interval is split. What is left at rounding level is a touching.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal, TypeAlias

import numpy as np
from numpy.typing import NDArray

from engine.loop.gain_phase import gain_and_phase, slope
from engine.loop.grid import Sampled
from engine.loop.sections import IntArray, Sections
from engine.loop.slope_bounds import gain_slope_bounds, phase_slope_bounds
from engine.model.factored import FloatArray

Kind: TypeAlias = Literal["gain", "phase"]
BoolArray: TypeAlias = NDArray[np.bool_]

TURN = 2.0 * math.pi
_PIECES = 4
_ROUNDS = 40
_SAME_PLACE = 1e-6
"""A touching this close (relative) to a crossing is part of it: rounding hides what lies between."""
LISTED_AT_MOST = 400
"""Phase crossings with dead time have no end; per case this many are computed."""


@dataclass(frozen=True, eq=False)
class Crossings:
    """Points (p,), ordered by case and frequency."""

    case: IntArray
    omega_rad_s: FloatArray
    gain: FloatArray
    """ln|L| there."""
    phase: FloatArray
    """Phase there [rad]."""
    direction: IntArray
    """+1 upward, −1 downward, 0 touching."""

    def of(self, case: int) -> Crossings:
        """The points of one case."""
        first, last = np.searchsorted(self.case, [case, case + 1])
        part = slice(int(first), int(last))
        return Crossings(
            self.case[part],
            self.omega_rad_s[part],
            self.gain[part],
            self.phase[part],
            self.direction[part],
        )


@dataclass(frozen=True, eq=False)
class Found:
    """Both kinds of crossings of a loop set, and what was noticed on the way."""

    gain: Crossings
    phase: Crossings
    flat_phase: BoolArray
    """(c,) the phase lies on −180° over a whole stretch."""
    flat_gain: BoolArray
    listed_up_to: FloatArray
    """(c,) with dead time: phase crossings are listed up to here [rad/s]; inf without."""
    shortened: BoolArray
    """(c,) the list was cut at LISTED_AT_MOST."""


@dataclass(frozen=True, eq=False)
class _Brackets:
    """Intervals with exactly one crossing of `level` (left < right), or touching points (left == right)."""

    case: IntArray
    left: FloatArray
    right: FloatArray
    level: FloatArray

    @staticmethod
    def joined(parts: list[_Brackets]) -> _Brackets:
        return _Brackets(
            np.concatenate([part.case for part in parts]),
            np.concatenate([part.left for part in parts]),
            np.concatenate([part.right for part in parts]),
            np.concatenate([part.level for part in parts]),
        )


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


def find_crossings(samples: Sampled) -> Found:
    """Every gain and phase crossing at 0 < ω < ∞ of every case."""
    nodes, reach, loop = samples.nodes, samples.reach, samples.loop
    left, right = nodes.omega_rad_s[:-1], nodes.omega_rad_s[1:]
    in_gain = (right > reach.gain_low[:, None]) & (left < reach.gain_high[:, None])
    end, shortened = _end_of_phase_search(samples)
    in_phase = (right > reach.phase_low[:, None]) & (left < end[:, None])
    gain, flat_gain = _isolated(loop, nodes.omega_rad_s, nodes.gain, nodes.gain_slope, in_gain, nodes.jump, "gain")
    low, high = nodes.phase_slope
    phase, flat_phase = _isolated(
        loop,
        nodes.omega_rad_s,
        _turns(nodes.phase),
        (low / TURN, high / TURN),
        in_phase & ~nodes.jump,
        nodes.jump,
        "phase",
    )
    delayed = loop.dead_time_s > 0
    return Found(
        *_polished(loop, gain, phase),
        flat_phase=flat_phase,
        flat_gain=flat_gain,
        listed_up_to=np.where(delayed, end, math.inf),
        shortened=shortened,
    )


def _turns(phase: FloatArray) -> FloatArray:
    """Phase in turns from −180°: an integer is a crossing."""
    return (phase + math.pi) / TURN


def _end_of_phase_search(samples: Sampled) -> tuple[FloatArray, BoolArray]:
    """Where the search for phase crossings stops: with dead time, where |L| stays too small to matter.

    That is below 1/100 and below what the first crossing with |L| < 1 already shows.
    """
    end = samples.reach.phase_high
    delay = samples.loop.dead_time_s
    cut = np.zeros(len(delay), bool)
    if not delay.any():
        return end, cut
    end = end.copy()
    nodes = samples.nodes
    omega = nodes.omega_rad_s
    step = np.diff(np.log(omega))
    for case in np.nonzero(delay)[0].tolist():
        gain = nodes.gain[case]
        rise = np.minimum(nodes.gain_slope[1][case] * step + gain[:-1], gain[1:] - nodes.gain_slope[0][case] * step)
        top = np.maximum(np.maximum(gain[:-1], gain[1:]), rise)
        ceiling = np.maximum.accumulate(top[::-1])[::-1]
        level = np.floor(_turns(nodes.phase[case]))
        small = np.maximum(gain[:-1], gain[1:]) < 0
        first = np.nonzero((level[1:] != level[:-1]) & small)[0]
        limit = math.log(1e-2)
        if len(first):
            limit = min(limit, float(min(gain[first[0]], gain[first[0] + 1])))
        quiet = np.nonzero(ceiling < limit)[0]
        last = max(float(samples.reach.phase_high[case]), 0.0)
        if len(quiet):
            end[case] = min(last, float(omega[quiet[0]]))
        else:
            # One full turn beyond the point from which the gain is monotone: the crossing there outdoes all later ones.
            end[case] = last + 2.0 * TURN / delay[case]
        most = LISTED_AT_MOST * TURN / delay[case]
        if end[case] > most:
            end[case], cut[case] = most, True
    return end, cut


def _isolated(
    loop: Sections,
    omega: FloatArray,
    y: FloatArray,
    slopes: tuple[FloatArray, FloatArray],
    wanted: BoolArray,
    jump: BoolArray,
    kind: Kind,
) -> tuple[_Brackets, BoolArray]:
    noise = _noise(loop, kind)
    low, high = slopes
    y_left, y_right = y[:, :-1], y[:, 1:]
    step = np.log(omega[1:] / omega[:-1])
    bottom, top = _cone(y_left, y_right, low, high, step)
    open_ = wanted & _holds_level(bottom, top, kind)
    flat = np.zeros(y.shape[0], bool)
    if not open_.any():
        return _Brackets.joined([_no_brackets()]), flat
    case, column = np.nonzero(open_)
    todo = _Intervals(
        case,
        omega[column],
        omega[column + 1],
        y_left[case, column],
        y_right[case, column],
        # The passage of an undamped pair is no place for a hidden pair of crossings: let the ends decide.
        np.where(jump[case, column], 0.0, low[case, column]),
        np.where(jump[case, column], 0.0, high[case, column]),
    )
    return _settled(loop, todo, noise, kind, flat)


def _settled(
    loop: Sections, todo: _Intervals, noise: FloatArray, kind: Kind, flat: BoolArray
) -> tuple[_Brackets, BoolArray]:
    """Split the intervals until each is settled."""
    found = [_no_brackets()]
    for _ in range(_ROUNDS):
        step = np.log(todo.right / todo.left)
        tiny = noise[todo.case]
        travel = np.maximum(np.abs(todo.low), np.abs(todo.high)) * step
        still = _on_level(todo, tiny, kind) & (travel <= tiny)
        resting = still & ((step > 1e-4) | (todo.low == todo.high))
        flat[todo.case[resting]] = True
        found.append(_touching_nodes(todo.where(~resting), noise, kind))
        monotone = (todo.low >= 0) | (todo.high <= 0)
        found.append(_brackets_of(todo.where(monotone), kind))
        bottom, top = _cone(todo.y_left, todo.y_right, todo.low, todo.high, step)
        rest = ~monotone & _holds_level(bottom, top, kind)
        todo = todo.where(rest & ~still & (step > 1e-15))
        if not len(todo.case):
            break
        todo = _without_flat(_split(loop, todo, kind), noise, kind, flat)
    result = _Brackets.joined(found)
    # Where the curve rests on the level, its single nodes are no touching points.
    single = (result.left < result.right) | ~flat[result.case]
    return _Brackets(result.case[single], result.left[single], result.right[single], result.level[single]), flat


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


def _noise(loop: Sections, kind: Kind) -> FloatArray:
    """(c,) size of rounding in y: some ulps per factor."""
    factors = np.sum(np.abs(loop.root_weight), axis=0) + np.abs(loop.integrators) + 1.0
    ulps: FloatArray = 16.0 * float(np.finfo(float).eps) * factors
    return ulps * (1.0 + np.abs(loop.log_gain)) if kind == "gain" else ulps


def _brackets_of(part: _Intervals, kind: Kind) -> _Brackets:
    """One bracket per level between the ends of intervals in which the curve is monotone."""
    if kind == "gain":
        below_left, below_right = part.y_left < 0, part.y_right < 0
        chosen = below_left != below_right
        return _Brackets(part.case[chosen], part.left[chosen], part.right[chosen], np.zeros(np.count_nonzero(chosen)))
    first, last = np.floor(part.y_left), np.floor(part.y_right)
    count = np.abs(last - first).astype(np.int64)
    if not count.any():
        return _no_brackets()
    index = np.repeat(np.arange(len(count)), count)
    offset = np.arange(len(index)) - np.repeat(np.cumsum(count) - count, count)
    level = np.minimum(first, last)[index] + 1.0 + offset
    return _Brackets(part.case[index], part.left[index], part.right[index], level)


def _touching_nodes(part: _Intervals, noise: FloatArray, kind: Kind) -> _Brackets:
    """Ends that lie on a level within rounding; those beside a true crossing are dropped later."""
    tiny = noise[part.case]
    left = _off_level(part.y_left, kind) <= tiny
    right = _off_level(part.y_right, kind) <= tiny
    if not (left.any() or right.any()):
        return _no_brackets()
    at = np.concatenate([part.left[left], part.right[right]])
    y = np.concatenate([part.y_left[left], part.y_right[right]])
    return _Brackets(np.concatenate([part.case[left], part.case[right]]), at, at, np.rint(y))


def _split(loop: Sections, part: _Intervals, kind: Kind) -> _Intervals:
    share = np.arange(1, _PIECES) / _PIECES
    inner = part.left[:, None] * np.exp(np.log(part.right / part.left)[:, None] * share)
    nodes = np.concatenate([part.left[:, None], inner, part.right[:, None]], axis=1)
    own = loop.at(part.case).spread()
    gain, phase = gain_and_phase(own, inner)
    y = gain if kind == "gain" else _turns(phase)
    y = np.concatenate([part.y_left[:, None], y, part.y_right[:, None]], axis=1)
    low, high = (gain_slope_bounds if kind == "gain" else phase_slope_bounds)(own, nodes)
    if kind == "phase":
        low, high = low / TURN, high / TURN
    return _Intervals(
        np.repeat(part.case, _PIECES),
        nodes[:, :-1].ravel(),
        nodes[:, 1:].ravel(),
        y[:, :-1].ravel(),
        y[:, 1:].ravel(),
        low.ravel(),
        high.ravel(),
    )


def _no_brackets() -> _Brackets:
    return _Brackets(np.empty(0, np.int64), np.empty(0), np.empty(0), np.empty(0))


def _polished(loop: Sections, gain: _Brackets, phase: _Brackets) -> tuple[Crossings, Crossings]:
    """Both kinds in one batch by Newton's method inside the brackets, to a few ulps."""
    both = _Brackets.joined([gain, phase])
    is_gain = np.arange(len(both.case)) < len(gain.case)
    if not len(both.case):
        empty = np.empty(0)
        none = Crossings(both.case, empty, empty, empty, both.case)
        return none, none
    own = loop.at(both.case)
    target = both.level * TURN - math.pi
    left, right = both.left.copy(), both.right.copy()
    crossing = left < right
    y_left = _value(own, left, is_gain, target)
    y_right = _value(own, right, is_gain, target)
    rising = y_right > y_left
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        share = np.clip(y_left / (y_left - y_right), 0.0, 1.0)
        share = np.where(np.isfinite(share), share, 0.5)
    omega = np.where(crossing, left * np.exp(np.log(right / left) * share), left)
    for _ in range(80):
        y = _value(own, omega, is_gain, target)
        rate = slope(own, omega)
        above = (y >= 0) == rising
        right = np.where(above, omega, right)
        left = np.where(above, left, omega)
        with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
            move = -y / np.where(is_gain, rate.real, rate.imag)
            after = omega * np.exp(move)
            bad = ~((after >= left) & (after <= right))
        after = np.where(bad & (np.abs(move) > 1e-14), np.sqrt(left) * np.sqrt(right), np.clip(after, left, right))
        moved = np.abs(after - omega)
        omega = np.where(crossing, after, omega)
        if np.all((moved <= 1e-10 * omega) | ~crossing | (right - left <= 1e-15 * omega)):
            break
    level, turn = gain_and_phase(own, omega)
    direction = np.where(crossing, np.where(rising, 1, -1), 0).astype(np.int64)
    result = Crossings(both.case, omega, level, turn, direction)
    return _in_order(result, is_gain), _in_order(result, ~is_gain)


def _value(own: Sections, omega: FloatArray, is_gain: BoolArray, target: FloatArray) -> FloatArray:
    gain, phase = gain_and_phase(own, omega)
    return np.where(is_gain, gain, phase - target)


def _in_order(points: Crossings, chosen: BoolArray) -> Crossings:
    """Sorted by case and frequency; touchings that are part of a crossing, or of one another, dropped."""
    index = np.nonzero(chosen)[0]
    index = index[np.lexsort((points.direction[index] == 0, points.omega_rad_s[index], points.case[index]))]
    if (points.direction[index] == 0).any():
        index = _without_echoes(points, index)
    return Crossings(
        points.case[index],
        points.omega_rad_s[index],
        points.gain[index],
        points.phase[index],
        points.direction[index],
    )


def _without_echoes(points: Crossings, index: IntArray) -> IntArray:
    kept: list[int] = []
    crossing = {
        case: points.omega_rad_s[index[(points.case[index] == case) & (points.direction[index] != 0)]]
        for case in np.unique(points.case[index]).tolist()
    }
    for item in index.tolist():
        omega = points.omega_rad_s[item]
        if points.direction[item] == 0:
            true = crossing[int(points.case[item])]
            if np.any(np.abs(true - omega) <= _SAME_PLACE * omega):
                continue
            last = kept[-1] if kept else -1
            near = last >= 0 and abs(points.omega_rad_s[last] - omega) <= _SAME_PLACE * omega
            if near and points.case[last] == points.case[item] and points.direction[last] == 0:
                continue
        kept.append(item)
    return np.array(kept, dtype=np.int64)
