"""Gain and phase of factored models: sums over the factors, never unwrapped samples."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from engine.loop.sections import Sections
from engine.model.factored import ComplexArray, FloatArray

HALF_PI = 0.5 * math.pi


@dataclass(frozen=True, eq=False)
class FactorValues:
    """Every factor by itself at each frequency: 2·ln of its size and its argument, weights left aside."""

    corner_size: FloatArray
    corner_angle: FloatArray
    pair_size: FloatArray
    pair_angle: FloatArray


def factor_values(model: Sections, omega_rad_s: FloatArray) -> FactorValues:
    """(k, …) and (l, …) values of the factors at ω > 0, shaped as the frequencies broadcast against the cases."""
    ratio = omega_rad_s / model.corner
    angle = np.arctan(ratio)
    ratio *= ratio
    ratio += 1.0
    squared_decay = model.decay * model.decay
    scale = 1.0 / (squared_decay + model.swing * model.swing)
    # (swing − ω) is an exact difference near resonance: 1 − (ω/ω0)² would lose the digits there.
    real = (squared_decay + (model.swing - omega_rad_s) * (model.swing + omega_rad_s)) * scale
    imaginary = (2.0 * model.decay * scale) * omega_rad_s
    # At an undamped root −inf is right, and the angle is of no account.
    with np.errstate(divide="ignore", invalid="ignore"):
        # The arctangent of the ratio, half a turn on where the real part is negative: much faster than arctan2.
        pair_angle = np.arctan(imaginary / real)
        pair_angle += np.copysign(math.pi, model.decay) * (real < 0)
        real *= real
        imaginary *= imaginary
        real += imaginary
        return FactorValues(np.log(ratio, out=ratio), angle, np.log(real, out=real), pair_angle)


def gain_and_phase(model: Sections, omega_rad_s: FloatArray) -> tuple[FloatArray, FloatArray]:
    """ln|L(jω)| and the phase [rad] at ω > 0, shaped as the frequencies broadcast against the cases.

    The phase is each factor in unity-DC form summed, a negative gain counting −π, hence continuous in ω by
    construction except at undamped pairs, which are passed on their right (±π there). Infinite gain at an
    undamped pole and −infinite at an undamped zero come out as such; where one covers the other, L has no value (nan).
    """
    return summed(model, omega_rad_s, factor_values(model, omega_rad_s))


def summed(model: Sections, omega_rad_s: FloatArray, values: FactorValues) -> tuple[FloatArray, FloatArray]:
    """ln|L| and the phase from the single factors."""
    size = model.log_gain - model.integrators * np.log(omega_rad_s)
    phase = (model.turn - model.integrators * HALF_PI) - model.dead_time_s * omega_rad_s
    if model.corners:
        size = size + 0.5 * np.add.reduce(model.corner_weight * values.corner_size, axis=0)
        phase = phase + np.add.reduce(model.corner_weight * values.corner_angle, axis=0)
    if model.pairs:
        with np.errstate(invalid="ignore"):
            size = size + 0.5 * np.add.reduce(model.pair_weight * values.pair_size, axis=0)
        phase = phase + np.add.reduce(model.pair_weight * values.pair_angle, axis=0)
    return size, phase


def slope(model: Sections, omega_rad_s: FloatArray) -> ComplexArray:
    """d ln L / d ln ω at jω: real part the slope of ln|L|, imaginary part that of the phase [rad]."""
    real, imaginary = root_terms(model, omega_rad_s)
    gain = np.add.reduce(model.root_weight * real, axis=0) - model.integrators
    phase = np.add.reduce(model.root_weight * imaginary, axis=0) - model.dead_time_s * omega_rad_s
    total: ComplexArray = gain + 1j * phase
    return total


def root_terms(model: Sections, omega_rad_s: FloatArray) -> tuple[FloatArray, FloatArray]:
    """(n, …) real and imaginary part of t = s/(s − r) at s = jω: what each root adds to d ln L / d ln s.

    Its own slope in ln ω is t − t². Infinite or nan on an undamped root.
    """
    apart = omega_rad_s - model.root.imag
    real_part = model.root.real
    with np.errstate(divide="ignore", invalid="ignore"):
        share = omega_rad_s / (apart * apart + real_part * real_part)
        return share * apart, -share * real_part
