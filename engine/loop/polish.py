"""Extrema and levels of the loop's quantities, polished from brackets: many points in one batch."""

from __future__ import annotations

import math
from dataclasses import dataclass, fields

import numpy as np

from engine.loop.closed_loop_gain import Points, level_slope_bend
from engine.loop.grid import Sampled
from engine.loop.sections import IntArray
from engine.model.factored import FloatArray


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


def polished(samples: Sampled, tasks: Tasks) -> tuple[FloatArray, FloatArray]:
    """Frequencies and values (ln, or rad for a phase): Newton's method kept inside the brackets by the slope's sign.

    An extreme is never reported worse than any value that was met on the way.
    """
    omega = tasks.start.copy()
    if not len(omega):
        return omega, omega
    points = Points.of(samples, tasks.quantity, tasks.case)
    left, right = tasks.left.copy(), tasks.right.copy()
    to_level = ~np.isnan(tasks.level)
    best_omega, best = omega.copy(), np.full(len(omega), -math.inf)
    tilted = bool(tasks.tilt.any())
    for _ in range(60):
        level, slope, bend = level_slope_bend(points, omega)
        height = tasks.sign * (level - tasks.tilt * np.log(omega) if tilted else level)
        slope, bend = tasks.sign * (slope - tasks.tilt), tasks.sign * bend
        miss = tasks.sign * (level - tasks.level)
        better = (height > best) | to_level
        best, best_omega = np.where(better, height, best), np.where(better, omega, best_omega)
        # Seen as falling, a level lies further right as long as the value is above it.
        onward = np.where(to_level, miss > 0, slope > 0)
        left, right = np.where(onward, omega, left), np.where(onward, right, omega)
        with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
            move = np.where(to_level, -miss / slope, np.where(bend < 0, -slope / bend, math.nan))
            after = omega * np.exp(move)
            outside = ~((after > left) & (after < right))
        # An extreme is settled when the step no longer changes the value; the step itself still squares the error.
        with np.errstate(invalid="ignore"):
            still = np.where(to_level, np.abs(move) < 1e-10, np.abs(slope * move) < 1e-12)
        middle = np.where(still, omega, np.sqrt(left) * np.sqrt(right))
        # A step past an end that was never tried goes to that end: if the slope still points out of the bracket
        # there, the extreme is a neighbour's and halving towards the end would only confirm it slowly.
        past = outside & ~still & ~to_level & np.isfinite(move)
        middle = np.where(past & onward & (right == tasks.right), right, middle)
        middle = np.where(past & ~onward & (left == tasks.left), left, middle)
        after = np.where(outside, np.clip(middle, left, right), after)
        at_end = (onward & (omega == tasks.right)) | (~onward & (omega == tasks.left))
        done = still | (right - left <= np.where(to_level, 1e-14, 1e-10) * omega) | (at_end & ~to_level)
        omega = after
        if done.all():
            break
    # The last step of an extreme changes its value by less than rounding.
    return np.where(better, omega, best_omega), np.where(
        to_level, tasks.level, tasks.sign * best + (tasks.tilt * np.log(omega) if tilted else 0.0)
    )
