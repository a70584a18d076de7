"""Gain and phase of factored models: sums over the factors, never unwrapped samples."""

from __future__ import annotations

import math

import numpy as np

from engine.loop.sections import Sections
from engine.model.factored import ComplexArray, FloatArray

HALF_PI = 0.5 * math.pi


def gain_and_phase(model: Sections, omega_rad_s: FloatArray) -> tuple[FloatArray, FloatArray]:
    """ln|L(jω)| and the phase [rad] at ω > 0, shaped as the frequencies broadcast against the cases.

    The phase is each factor in unity-DC form summed, a negative gain counting −π, hence continuous in ω by
    construction except at undamped pairs, which are passed on their right (±π there). Infinite gain at an
    undamped pole and −infinite at an undamped zero come out as such.
    """
    log_omega = np.log(omega_rad_s)
    gain = model.log_gain - model.integrators * log_omega
    phase = model.turn - model.integrators * HALF_PI - model.dead_time_s * omega_rad_s
    if len(model.corner):
        ratio = omega_rad_s / model.corner
        phase = phase + _sum(model.corner_weight, np.arctan(ratio))
        ratio *= ratio
        ratio += 1.0
        gain = gain + 0.5 * _sum(model.corner_weight, np.log(ratio))
    if len(model.decay):
        squared_decay = model.decay * model.decay
        scale = 1.0 / (squared_decay + model.swing * model.swing)
        # (swing − ω) is an exact difference near resonance: 1 − (ω/ω0)² would lose the digits there.
        real = (squared_decay + (model.swing - omega_rad_s) * (model.swing + omega_rad_s)) * scale
        imaginary = (2.0 * model.decay * scale) * omega_rad_s
        phase = phase + _sum(model.pair_weight, np.arctan2(imaginary, real))
        real *= real
        imaginary *= imaginary
        real += imaginary
        # At an undamped root ±inf is right; where a zero covers it, L has no value there (nan).
        with np.errstate(divide="ignore", invalid="ignore"):
            gain = gain + 0.5 * _sum(model.pair_weight, np.log(real))
    return gain, phase


def slope(model: Sections, omega_rad_s: FloatArray) -> ComplexArray:
    """d ln L / d ln ω at jω: real part the slope of ln|L|, imaginary part that of the phase [rad]."""
    return slope_and_bend(model, omega_rad_s)[0]


def slope_and_bend(model: Sections, omega_rad_s: FloatArray) -> tuple[ComplexArray, ComplexArray]:
    """First and second derivative of ln L(jω) with respect to ln ω."""
    lag = 1j * (model.dead_time_s * omega_rad_s)
    first: ComplexArray = (-model.integrators - lag).astype(np.complex128, copy=False)
    second: ComplexArray = (-lag).astype(np.complex128, copy=False)
    if len(model.root):
        # s/(s − r) with s = jω; its own derivative in ln ω is t − t².
        with np.errstate(divide="ignore", invalid="ignore"):
            term = 1.0 / (1.0 + 1j * (model.root / omega_rad_s))
        first = first + np.sum(model.root_weight * term, axis=0)
        second = second + np.sum(model.root_weight * (term - term * term), axis=0)
    return first, second


def _sum(weight: FloatArray, values: FloatArray) -> FloatArray:
    values *= weight
    total: FloatArray = np.add.reduce(values, axis=0)
    return total
