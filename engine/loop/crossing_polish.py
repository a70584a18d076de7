"""Crossings as tasks for the polisher, and their lists once polished."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal, TypeAlias

import numpy as np

from engine.loop.closed_loop_gain import Quantity
from engine.loop.gain_phase import gain_and_phase
from engine.loop.isolation import TURN, Brackets, noise_of
from engine.loop.polish import Tasks
from engine.loop.sections import BoolArray, IntArray, Sections
from engine.model.factored import FloatArray

Kind: TypeAlias = Literal["gain", "phase"]

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
        return self.part(slice(int(first), int(last)))

    def part(self, part: slice) -> Crossings:
        """A stretch of the list."""
        return Crossings(
            self.case[part],
            self.omega_rad_s[part],
            self.gain[part],
            self.phase[part],
            self.direction[part],
        )


def crossing_tasks(brackets: Brackets) -> Tasks:
    """The crossings as levels to be met; touchings stay where they are and are left out."""
    crossing = brackets.left < brackets.right
    moving = brackets if crossing.all() else brackets.where(crossing)
    return Tasks(
        np.where(moving.phase, int(Quantity.PHASE), int(Quantity.LOOP)),
        moving.case,
        moving.left,
        moving.start,
        moving.right,
        np.where(moving.phase, moving.level * TURN - math.pi, moving.level),
        np.where(moving.rising, -1.0, 1.0),
        np.zeros(len(moving.case)),
    )


def in_order(loop: Sections, brackets: Brackets, omega: FloatArray) -> tuple[Crossings, Crossings]:
    """Gain and phase crossings by case and frequency; what rounding cannot tell apart is made one touching.

    omega: polished frequencies in the order of `crossing_tasks`.
    """
    crossing = brackets.left < brackets.right
    place = brackets.start.copy()
    place[crossing] = omega
    index = np.lexsort((place, brackets.case, brackets.phase))
    case, place = brackets.case[index], place[index]
    level, turn = gain_and_phase(loop.at(case), place)
    direction = np.where(crossing, np.where(brackets.rising, 1, -1), 0)[index]
    split = len(index) - int(np.count_nonzero(brackets.phase))
    both = Crossings(case, place, level, turn, direction)
    return (
        _without_echoes(loop, both.part(slice(0, split)), "gain"),
        _without_echoes(loop, both.part(slice(split, None)), "phase"),
    )


def _without_echoes(loop: Sections, points: Crossings, kind: Kind) -> Crossings:
    omega = points.omega_rad_s
    close = (np.diff(points.case) == 0) & (omega[1:] - omega[:-1] <= _SAME_PLACE * omega[1:])
    return _merged(loop, points, close, kind) if close.any() else points


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
    return bool(np.all(off <= noise_of(loop)[0 if kind == "gain" else 1][case]))
