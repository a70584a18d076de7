"""Crossings polished to a few ulps inside their brackets, and put in order."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from engine.loop.gain_phase import gain_and_phase, slope
from engine.loop.isolation import TURN, Brackets, Kind, noise_of
from engine.loop.sections import BoolArray, IntArray, Sections
from engine.model.factored import FloatArray

_SAME_PLACE = 1e-6
"""Points this close (relative) are judged together: rounding may hide what lies between."""


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


def polished_crossings(loop: Sections, gain: Brackets, phase: Brackets) -> tuple[Crossings, Crossings]:
    """Gain and phase crossings in one batch, by Newton's method inside the brackets."""
    both = Brackets.joined([gain, phase])
    is_gain = np.arange(len(both.case)) < len(gain.case)
    if not len(both.case):
        empty = np.empty(0)
        none = Crossings(both.case, empty, empty, empty, both.case)
        return none, none
    own = loop.at(both.case)
    target = both.level * TURN - math.pi
    crossing = both.left < both.right
    omega, rising = _roots(own, both, is_gain, target)
    level, turn = gain_and_phase(own, omega)
    direction = np.where(crossing, np.where(rising, 1, -1), 0).astype(np.int64)
    result = Crossings(both.case, omega, level, turn, direction)
    return _in_order(loop, result, is_gain), _in_order(loop, result, ~is_gain)


def _roots(own: Sections, brackets: Brackets, is_gain: BoolArray, target: FloatArray) -> tuple[FloatArray, BoolArray]:
    """Frequencies of the crossings, and whether the curve rises through them; touchings stay where they are."""
    left, right = brackets.left.copy(), brackets.right.copy()
    crossing = left < right
    y_left, y_right = _value(own, left, is_gain, target), _value(own, right, is_gain, target)
    rising = y_right > y_left
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        share = y_left / (y_left - y_right)
    share = np.where(np.isfinite(share), np.clip(share, 0.0, 1.0), 0.5)
    omega = np.where(crossing, left * np.exp(np.log(right / left) * share), left)
    for _ in range(80):
        y = _value(own, omega, is_gain, target)
        rate = slope(own, omega)
        above = (y >= 0) == rising
        right, left = np.where(above, omega, right), np.where(above, left, omega)
        with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
            move = -y / np.where(is_gain, rate.real, rate.imag)
            after = omega * np.exp(move)
            inside = (after >= left) & (after <= right)
        there = (y == 0) | (np.abs(move) <= 1e-14)
        after = np.where(inside, after, np.where(there, omega, np.sqrt(left) * np.sqrt(right)))
        done = ~crossing | there | (np.abs(after - omega) <= 1e-10 * omega) | (right - left <= 1e-15 * omega)
        omega = np.where(crossing, np.clip(after, brackets.left, brackets.right), omega)
        if done.all():
            break
    return omega, rising


def _value(own: Sections, omega: FloatArray, is_gain: BoolArray, target: FloatArray) -> FloatArray:
    gain, phase = gain_and_phase(own, omega)
    return np.where(is_gain, gain, phase - target)


def _in_order(loop: Sections, points: Crossings, chosen: BoolArray) -> Crossings:
    """Sorted by case and frequency; what rounding cannot tell apart made one touching."""
    index = np.nonzero(chosen)[0]
    index = index[np.lexsort((points.omega_rad_s[index], points.case[index]))]
    ordered = Crossings(
        points.case[index],
        points.omega_rad_s[index],
        points.gain[index],
        points.phase[index],
        points.direction[index],
    )
    if len(index) < 2:
        return ordered
    omega = ordered.omega_rad_s
    close = (np.diff(ordered.case) == 0) & (omega[1:] - omega[:-1] <= _SAME_PLACE * omega[1:])
    return _merged(loop, ordered, close, "gain" if chosen[0] else "phase") if close.any() else ordered


def _merged(loop: Sections, points: Crossings, close: BoolArray, kind: Kind) -> Crossings:
    """Runs of close points: crossings stay if the curve leaves the level between them by more than rounding.

    A run that is one crossing with touchings is that crossing; a run that rounding alone holds together is one
    touching if it ends on the side it came from, else one crossing.
    """
    kept: list[int] = []
    direction = points.direction.copy()
    run = [0]
    for item in range(1, len(direction) + 1):
        if item < len(direction) and close[item - 1]:
            run.append(item)
            continue
        crossings = [k for k in run if direction[k] != 0]
        if len(crossings) > 1 and _rests_between(loop, points, crossings, kind):
            total = int(np.sum(direction[crossings]))
            middle = crossings[len(crossings) // 2]
            direction[middle] = total
            crossings = [middle]
        kept += crossings or [run[len(run) // 2]]
        run = [item]
    chosen = np.array(kept, dtype=np.int64)
    return Crossings(
        points.case[chosen],
        points.omega_rad_s[chosen],
        points.gain[chosen],
        points.phase[chosen],
        direction[chosen],
    )


def _rests_between(loop: Sections, points: Crossings, items: list[int], kind: Kind) -> bool:
    """Whether the curve stays on the level, within rounding, between neighbouring crossings."""
    omega = points.omega_rad_s[items]
    case = points.case[items][1:]
    gain, phase = gain_and_phase(loop.at(case), 0.5 * (omega[1:] + omega[:-1]))
    turns = (phase + math.pi) / TURN
    off = np.abs(gain) if kind == "gain" else np.abs(turns - np.rint(turns))
    return bool(np.all(off <= noise_of(loop, kind)[case]))
