"""Gains of the closed loop for ω → 0 and ω → ∞, from the structure: C ~ c·s^a, P ~ p·s^b."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from engine.loop.grid import Sampled
from engine.loop.sections import BoolArray, Sections
from engine.model.factored import FloatArray


@dataclass(frozen=True, eq=False)
class Limits:
    """Natural logarithms (4, c) of |S|, |T|, |C·S| and |(1−L)/(1+L)|; ±inf for 0 and unbounded."""

    at_zero: FloatArray
    at_infinity: FloatArray
    """With dead time and L(∞) ≠ 0, the supremum over all phases that L goes on taking."""
    best: FloatArray
    """The greater of the two."""


def limits_of(samples: Sampled) -> Limits:
    """The limits of every case, both ends in one computation: row 0 for ω → 0, row 1 for ω → ∞."""
    loop, reach, C = samples.loop, samples.reach, samples.compensator
    cases = len(loop.turn)
    c_degree = C.integrators - np.add.reduce(C.root_weight, axis=0)
    c_high = C.log_gain - _log_sizes(C)
    rows = _rows(
        np.stack([-loop.integrators, reach.relative_degree]),
        np.stack([loop.log_gain, reach.log_high_gain]),
        np.cos(np.stack([loop.turn, reach.phase_infinite])),
        np.stack([np.zeros(cases, bool), loop.dead_time_s > 0]),
        np.stack([C.integrators, -c_degree]),
        np.stack([C.log_gain, c_high]),
    )
    return Limits(rows[:, 0], rows[:, 1], np.maximum(rows[:, 0], rows[:, 1]))


def _rows(
    fading: FloatArray,
    log_gain: FloatArray,
    sign: FloatArray,
    turning: BoolArray,
    c_growth: FloatArray,
    c_log_gain: FloatArray,
) -> FloatArray:
    """(4, 2, c) limits, from arguments (2, c).

    fading > 0: L → 0, 0: L → ±gain (turning on with dead time), < 0: L → ∞ as the power −fading of the variable.
    The compensator grows as c_log_gain with the power c_growth of the variable that goes to ∞ (1/s or s).
    """
    size = np.exp(np.minimum(np.maximum(log_gain, -300.0), 300.0))
    value = np.where(sign < 0, -size, size)
    with np.errstate(divide="ignore"):
        plus = np.log(np.abs(1.0 + np.where(turning, -size, value)))
        minus = np.log(np.abs(1.0 - np.where(turning, -size, value)))
    large, finite = fading < 0, fading == 0
    S = np.where(finite, -plus, np.where(large, -math.inf, 0.0))
    T = np.where(finite, log_gain - plus, np.where(large, 0.0, -math.inf))
    with np.errstate(invalid="ignore"):
        disk = np.where(finite, minus - plus, 0.0)
    # C·S ~ C where L fades, C/L = 1/P where L grows.
    power = c_growth + np.where(large, fading, 0.0)
    level = c_log_gain + np.where(finite, -plus, np.where(large, -log_gain, 0.0))
    effort = np.where(power > 0, math.inf, np.where(power < 0, -math.inf, level))
    return np.stack([S, T, effort, disk])


def _log_sizes(model: Sections) -> FloatArray:
    total: FloatArray = np.add.reduce(model.root_weight * np.log(np.abs(model.root)), axis=0)
    return total
