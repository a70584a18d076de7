"""Gains of the closed loop for ω → 0 and ω → ∞, from the structure: C ~ c·s^a, P ~ p·s^b."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from engine.loop.grid import Sampled
from engine.loop.sections import Sections
from engine.model.factored import FloatArray


@dataclass(frozen=True, eq=False)
class Limits:
    """Natural logarithms (4, c) of |S|, |T|, |C·S| and |(1−L)/(1+L)|; ±inf for 0 and unbounded."""

    at_zero: FloatArray
    at_infinity: FloatArray
    """With dead time and L(∞) ≠ 0, the supremum over all phases that L goes on taking."""


def limits_of(samples: Sampled) -> Limits:
    """The limits of every case."""
    loop, reach, C = samples.loop, samples.reach, samples.compensator
    still = np.zeros_like(loop.turn, dtype=bool)
    c_degree = -np.sum(C.root_weight, axis=0) + C.integrators
    c_high = C.log_gain - _log_sizes(C)
    return Limits(
        _rows(-loop.integrators, loop.log_gain, np.cos(loop.turn), still, C.integrators, C.log_gain),
        _rows(
            reach.relative_degree,
            reach.log_high_gain,
            np.cos(reach.phase_infinite),
            loop.dead_time_s > 0,
            -c_degree,
            c_high,
        ),
    )


def _rows(
    fading: FloatArray,
    log_gain: FloatArray,
    sign: FloatArray,
    turning: np.ndarray[tuple[int, ...], np.dtype[np.bool_]],
    c_growth: FloatArray,
    c_log_gain: FloatArray,
) -> FloatArray:
    """fading > 0: L → 0, 0: L → ±gain (turning on with dead time), < 0: L → ∞ as the power −fading of the variable.

    The compensator grows as c_log_gain with the power c_growth of the variable that goes to ∞ (1/s or s).
    """
    size = np.exp(np.clip(log_gain, -300.0, 300.0))
    value = np.where(sign < 0, -size, size)
    with np.errstate(divide="ignore", invalid="ignore"):
        near, far = np.log(np.abs(1.0 + value)), np.log(np.abs(1.0 - value))
        nearest, farthest = np.log(np.abs(1.0 - size)), np.log1p(size)
    plus = np.where(turning, nearest, near)
    minus = np.where(turning, farthest, far)
    large, finite = fading < 0, fading == 0
    S = np.where(finite, -plus, np.where(large, -math.inf, 0.0))
    T = np.where(finite, log_gain - plus, np.where(large, 0.0, -math.inf))
    disk = np.where(finite, minus - plus, 0.0)
    # C·S ~ C where L fades, C/L = 1/P where L grows.
    power = c_growth + np.where(large, fading, 0.0)
    level = c_log_gain + np.where(finite, -plus, np.where(large, -log_gain, 0.0))
    effort = np.where(power > 0, math.inf, np.where(power < 0, -math.inf, level))
    return np.stack([S, T, effort, disk])


def _log_sizes(model: Sections) -> FloatArray:
    total: FloatArray = np.sum(model.root_weight * np.log(np.abs(model.root)), axis=0)
    return total
