"""Gains of the closed loop at single frequencies: S, T, C·S, P·S and (1−L)/(1+L), with their slopes."""

from __future__ import annotations

from dataclasses import dataclass
from enum import IntEnum

import numpy as np

from engine.loop.gain_phase import gain_and_phase, slope_and_bend
from engine.loop.grid import Sampled
from engine.loop.sections import IntArray, Sections
from engine.model.factored import ComplexArray, FloatArray


class Quantity(IntEnum):
    """What is read from the loop at a frequency."""

    SENSITIVITY = 0
    """|S|"""
    COMPLEMENTARY = 1
    """|T|"""
    EFFORT = 2
    """|C·S|"""
    DISK = 3
    """|(1−L)/(1+L)|"""
    LOAD = 4
    """|P·S|"""
    LOOP = 5
    """|L|"""
    PHASE = 6
    """arg L, in place of a logarithm [rad]"""


@dataclass(frozen=True, eq=False)
class Points:
    """Points (p,), each in one case and for one quantity."""

    quantity: IntArray
    loop: Sections
    """(p,) the factors of each point's own case."""
    side: Sections
    """(p,) C where the quantity is EFFORT, P where it is LOAD; elsewhere without meaning."""
    has_side: FloatArray
    """(p,) 1 where `side` counts, else 0."""

    @staticmethod
    def of(samples: Sampled, quantity: IntArray, case: IntArray) -> Points:
        """The factors for points of the given quantities and cases."""
        load = quantity == Quantity.LOAD
        # Either all points ask for P·S or none: bands and masks are read one quantity at a time.
        side = samples.plant.at(case) if load.any() else samples.compensator.at(np.zeros_like(case))
        return Points(quantity, samples.loop.at(case), side, (load | (quantity == Quantity.EFFORT)).astype(np.float64))


@dataclass(frozen=True, eq=False)
class ClosedLoop:
    """Everything about 1 + L at points: W = L or 1/L, whichever is the smaller."""

    log_gain: FloatArray
    large: FloatArray
    """1.0 where |L| > 1."""
    W: ComplexArray
    one_plus: ComplexArray
    """1 + W."""
    one_minus: ComplexArray
    """1 − W."""


def closed_loop(log_gain: FloatArray, phase: FloatArray) -> ClosedLoop:
    """1 + L without loss of digits near L = −1, and without overflow for any |L|."""
    large = log_gain > 0
    sign = np.where(large, -1.0, 1.0)
    size = -np.abs(log_gain)
    angle = sign * phase
    # 1 + W = 1 − e^(ln|W| + j·(angle ± π)); expm1 keeps the digits that 1 + W would cancel.
    return ClosedLoop(
        log_gain,
        large.astype(np.float64),
        np.exp(size + 1j * angle),
        -np.expm1(size + 1j * _wrapped(angle + np.pi)),
        -np.expm1(size + 1j * _wrapped(angle)),
    )


def log_level(points: Points, omega_rad_s: FloatArray) -> FloatArray:
    """(p,) natural logarithm of each point's quantity."""
    gain, phase = gain_and_phase(points.loop, omega_rad_s)
    return _level(points, omega_rad_s, closed_loop(gain, phase), phase)


def level_slope_bend(points: Points, omega_rad_s: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
    """ln of each point's quantity, and its first and second derivative in ln ω."""
    gain, phase = gain_and_phase(points.loop, omega_rad_s)
    state = closed_loop(gain, phase)
    first, second = slope_and_bend(points.loop, omega_rad_s)
    W, plus, minus = state.W, state.one_plus, state.one_minus
    large = state.large > 0
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        small_part, large_part = W / plus, 1.0 / plus
        S = np.where(large, small_part, large_part)
        T = np.where(large, large_part, small_part)
        product = S * T
        # d ln q / d ln L and its own derivative.
        disk = np.where(large, 2.0, -2.0) * W / (plus * minus)
        disk_bend = -2.0 * W * (1.0 + W * W) / (plus * minus) ** 2
        kind = points.quantity
        open_ = kind >= Quantity.LOOP
        rate = np.select(
            [kind == Quantity.COMPLEMENTARY, kind == Quantity.DISK, kind == Quantity.PHASE, open_],
            [S, disk, -1j, 1.0],
            -T,
        )
        bend = np.select([kind == Quantity.DISK, open_], [disk_bend, 0.0], -product)
        slope = (rate * first).real
        curve = (bend * first * first + rate * second).real
    if points.has_side.any():
        side_first, side_second = slope_and_bend(points.side, omega_rad_s)
        slope = slope + points.has_side * side_first.real
        curve = curve + points.has_side * side_second.real
    return _level(points, omega_rad_s, state, phase), slope, curve


def _level(points: Points, omega_rad_s: FloatArray, state: ClosedLoop, phase: FloatArray) -> FloatArray:
    kind = points.quantity
    with np.errstate(divide="ignore"):
        log_plus = np.log(np.abs(state.one_plus))
        log_minus = np.log(np.abs(state.one_minus))
    excess = np.maximum(state.log_gain, 0.0)
    level: FloatArray = np.select(
        [kind == Quantity.COMPLEMENTARY, kind == Quantity.DISK, kind == Quantity.LOOP],
        [state.log_gain - excess - log_plus, log_minus - log_plus, state.log_gain],
        -log_plus - excess,
    )
    if points.has_side.any():
        level = level + points.has_side * gain_and_phase(points.side, omega_rad_s)[0]
    turning = kind == Quantity.PHASE
    return np.where(turning, phase, level) if turning.any() else level


def _wrapped(angle: FloatArray) -> FloatArray:
    return angle - 2.0 * np.pi * np.rint(angle / (2.0 * np.pi))
