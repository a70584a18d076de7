"""Extrema and levels of the loop's quantities, polished from brackets: many points in one batch."""

from __future__ import annotations

from dataclasses import dataclass, fields

import numpy as np

from engine.loop.closed_loop_gain import Points, level_slope_bend
from engine.loop.grid import Sampled
from engine.loop.sections import BoolArray, IntArray
from engine.model.factored import FloatArray

_TWINS = 1e-12


@dataclass(frozen=True, eq=False)
class Tasks:
    """Points (p,) to polish, each inside [left, right]."""

    quantity: IntArray
    case: IntArray
    left: FloatArray
    start: FloatArray
    right: FloatArray
    level: FloatArray
    """The value to be met; nan where an extreme is sought."""
    sign: FloatArray
    """+1 for a greatest value or a level met in falling, −1 for a least value or a level met in rising."""
    tilt: FloatArray
    """The extreme is that of the quantity less tilt·ln ω."""


def joined_tasks(*parts: Tasks) -> Tasks:
    """All points in one batch, in order."""
    return Tasks(*(np.concatenate([getattr(part, field.name) for part in parts]) for field in fields(Tasks)))


def around(omega: FloatArray, column: IntArray) -> tuple[FloatArray, FloatArray]:
    """The neighbours of grid points between which an extreme at them lies.

    Corners of different models may differ in the last digit; between such twins rounding decides which is the higher,
    so the neighbour's neighbour is taken.
    """
    last = len(omega) - 1
    left, right, here = np.maximum(column - 1, 0), np.minimum(column + 1, last), omega[column]
    for _ in range(3):
        twin_left, twin_right = here - omega[left] < _TWINS * here, omega[right] - here < _TWINS * here
        if not (twin_left.any() or twin_right.any()):
            break
        left, right = np.maximum(left - twin_left, 0), np.minimum(right + twin_right, last)
    return omega[left], omega[right]


def polished(samples: Sampled, tasks: Tasks) -> tuple[FloatArray, FloatArray]:
    """Frequencies and values (ln, or rad for a phase): Newton's method kept inside the brackets by the slope's sign.

    An extreme is never reported worse than where it was started.
    """
    omega = tasks.start
    if not len(omega):
        return omega, omega
    points = Points.of(samples, tasks.quantity, tasks.case)
    left, right = tasks.left, tasks.right
    to_level = ~np.isnan(tasks.level)
    goal = np.where(to_level, tasks.level, 0.0)
    closed = np.where(to_level, 1e-15, 1e-10)
    started = tasks.level
    with np.errstate(all="ignore"):
        for round_ in range(80):
            here = omega
            level, slope, bend = level_slope_bend(points, omega)
            if round_ == 0:
                started = level
            # A level seen as falling, and the slope at a greatest value, both fall through zero at the place sought.
            tilted = slope - tasks.tilt
            sought = tasks.sign * np.where(to_level, level - goal, tilted)
            rate = tasks.sign * np.where(to_level, slope, bend)
            falling = rate < 0
            onward = sought > 0
            left, right = np.where(onward, omega, left), np.where(onward, right, omega)
            move = -sought / rate
            # The bend is known: use it where a level is met (Chebyshev's third-order step).
            curl = np.where(to_level, tasks.sign * bend / rate, 0.0)
            move = move - 0.5 * curl * move * move
            after = omega * np.exp(move)
            # What is left of a level after that step is its cube over the square of the curve's own width. A step of
            # 4e-4 of an extreme's width leaves 1e-7 of the width and 1e-11 of the value, once its rise is added.
            cube = (1.0 + rate * rate + curl * curl) * np.abs(move * move * move)
            still = (np.where(to_level, cube * 1e8, sought * move) < 1.5e-7) & falling | (sought == 0)
            good = (after > left) & (after < right) & falling
            if good.all():
                omega, done = after, still
            else:
                omega, at_end = _inside(tasks, omega, after, left, right, good, still, onward, falling)
                done = still | (at_end & ~to_level) | (right - left <= closed * omega)
            if done.all():
                break
        # The last step's own rise, to the third power of that step.
        level = level + np.where(omega == here, 0.0, 0.5 * (slope + tasks.tilt) * np.log(omega / here))
        kept = to_level | (tasks.sign * (level - started - tasks.tilt * np.log(omega / tasks.start)) >= 0)
    return np.where(kept, omega, tasks.start), np.where(to_level, tasks.level, np.where(kept, level, started))


def _inside(
    tasks: Tasks,
    omega: FloatArray,
    after: FloatArray,
    left: FloatArray,
    right: FloatArray,
    good: BoolArray,
    still: BoolArray,
    onward: BoolArray,
    falling: BoolArray,
) -> tuple[FloatArray, BoolArray]:
    """The next frequencies where a step left its bracket, and where the end of a bracket has been tried in vain."""
    middle = np.where(still, omega, np.sqrt(left) * np.sqrt(right))
    # A step past an end that was never tried goes to that end: if the slope still points out of the bracket
    # there, the extreme is a neighbour's and halving towards the end would only confirm it slowly.
    past = falling & ~still & np.isnan(tasks.level)
    middle = np.where(past & onward & (right == tasks.right), right, middle)
    middle = np.where(past & ~onward & (left == tasks.left), left, middle)
    at_end = (onward & (omega == tasks.right)) | (~onward & (omega == tasks.left))
    return np.where(good, after, np.minimum(np.maximum(middle, left), right)), at_end
