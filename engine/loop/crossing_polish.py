"""Crossings as tasks for the polisher, and their lists once polished."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from engine.loop.closed_loop_gain import Quantity
from engine.loop.gain_phase import gain_and_phase
from engine.loop.isolation import TURN, Brackets, Kind, noise_of
from engine.loop.polish import Tasks, joined_tasks
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


def crossing_tasks(gain: Brackets, phase: Brackets) -> Tasks:
    """The crossings as levels to be met: gain first, then phase; touchings stay where they are."""
    parts = []
    for brackets, quantity in ((gain, Quantity.LOOP), (phase, Quantity.PHASE)):
        crossing = brackets.left < brackets.right
        moving = brackets if crossing.all() else brackets.where(crossing)
        count = len(moving.case)
        level = moving.level * TURN - math.pi if quantity == Quantity.PHASE else moving.level
        sign = np.where(moving.rising, -1.0, 1.0)
        kind = np.full(count, int(quantity), dtype=np.int64)
        parts.append(Tasks(kind, moving.case, moving.left, moving.start, moving.right, level, sign, np.zeros(count)))
    return joined_tasks(*parts)


def in_order(loop: Sections, gain: Brackets, phase: Brackets, omega: FloatArray) -> tuple[Crossings, Crossings]:
    """Gain and phase crossings by case and frequency; what rounding cannot tell apart is made one touching.

    omega: polished frequencies in the order of `crossing_tasks`.
    """
    moving = [brackets.left < brackets.right for brackets in (gain, phase)]
    first = int(np.count_nonzero(moving[0]))
    places, cases, directions = [], [], []
    for brackets, crossing, found in zip((gain, phase), moving, (omega[:first], omega[first:]), strict=True):
        place = brackets.start.copy()
        place[crossing] = found
        places.append(place)
        cases.append(brackets.case)
        directions.append(np.where(crossing, np.where(brackets.rising, 1, -1), 0).astype(np.int64))
    case, place = np.concatenate(cases), np.concatenate(places)
    level, turn = gain_and_phase(loop.at(case), place)
    split = len(cases[0])
    one = _sorted(Crossings(case[:split], place[:split], level[:split], turn[:split], directions[0]))
    other = _sorted(Crossings(case[split:], place[split:], level[split:], turn[split:], directions[1]))
    return _without_echoes(loop, one, "gain"), _without_echoes(loop, other, "phase")


def _sorted(points: Crossings) -> Crossings:
    index = np.lexsort((points.omega_rad_s, points.case))
    return Crossings(
        points.case[index],
        points.omega_rad_s[index],
        points.gain[index],
        points.phase[index],
        points.direction[index],
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
    return bool(np.all(off <= noise_of(loop, kind)[case]))
