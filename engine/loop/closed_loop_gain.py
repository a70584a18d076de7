"""Gains of the closed loop at single frequencies: S, T, C·S, P·S and (1−L)/(1+L), with their slopes."""

from __future__ import annotations

from dataclasses import dataclass
from enum import IntEnum

import numpy as np

from engine.loop.gain_phase import gain_and_phase, slope_and_bend
from engine.loop.grid import Sampled
from engine.loop.sections import BoolArray, IntArray, Sections
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


# Plain numbers: comparing arrays with members of an enumeration is slow.
_COMPLEMENTARY, _EFFORT, _DISK = int(Quantity.COMPLEMENTARY), int(Quantity.EFFORT), int(Quantity.DISK)
_LOAD, _LOOP, _PHASE = int(Quantity.LOAD), int(Quantity.LOOP), int(Quantity.PHASE)


@dataclass(frozen=True, eq=False)
class Points:
    """Points (p,), each in one case and for one quantity."""

    quantity: IntArray
    loop: Sections
    """(p,) the factors of each point's own case."""
    side: Sections | None
    """P where P·S is asked for, C where C·S is: (p,) or one case for all points."""
    has_side: FloatArray
    """(p,) 1 where `side` counts, else 0."""
    complementary: BoolArray
    disk: BoolArray
    open_loop: BoolArray
    """(p,) the quantity is L's own gain or phase."""
    plain: bool
    """No point asks for L itself."""

    @staticmethod
    def of(samples: Sampled, quantity: IntArray, case: IntArray) -> Points:
        """The factors for points of the given quantities and cases."""
        load, effort = quantity == _LOAD, quantity == _EFFORT
        side: Sections | None = None
        # Either all points ask for P·S or none: bands and masks are read one quantity at a time.
        if load.any():
            side = samples.plant.at(case)
        elif effort.any():
            side = samples.compensator
        open_loop = quantity >= _LOOP
        return Points(
            quantity,
            samples.loop.at(case),
            side,
            (load | effort).astype(np.float64),
            quantity == _COMPLEMENTARY,
            quantity == _DISK,
            open_loop,
            not open_loop.any(),
        )


@dataclass(frozen=True, eq=False)
class ClosedLoop:
    """Everything about 1 + L at points: W = L or 1/L, whichever is the smaller."""

    log_gain: FloatArray
    large: BoolArray
    """|L| > 1."""
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
        large,
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
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        over, part = 1.0 / plus, W / plus
        S, T = np.where(state.large, part, over), np.where(state.large, over, part)
        # d ln q / d ln L and its own derivative.
        both = plus * minus
        disk = 2.0 * W / both
        rate = np.where(points.complementary, S, np.where(points.disk, np.where(state.large, disk, -disk), -T))
        bend = np.where(points.disk, -disk * (1.0 + W * W) / both, -S * T)
        if not points.plain:
            rate = np.where(points.open_loop, np.where(points.quantity == _PHASE, -1j, 1.0), rate)
            bend = np.where(points.open_loop, 0.0, bend)
        rate_first = rate * first
        slope = rate_first.real
        curve = (bend * first * first + rate * second).real
    if points.side is not None:
        side_first, side_second = slope_and_bend(points.side, omega_rad_s)
        slope = slope + points.has_side * side_first.real
        curve = curve + points.has_side * side_second.real
    return _level(points, omega_rad_s, state, phase), slope, curve


def _level(points: Points, omega_rad_s: FloatArray, state: ClosedLoop, phase: FloatArray) -> FloatArray:
    with np.errstate(divide="ignore", invalid="ignore"):
        log_plus = np.log(np.abs(state.one_plus))
        log_minus = np.log(np.abs(state.one_minus))
        # |S|, and with it |C·S| and |P·S|; |T| where L is large is 1/|1 + 1/L|.
        level: FloatArray = -log_plus - np.maximum(state.log_gain, 0.0)
        of_T = -log_plus + np.minimum(state.log_gain, 0.0)
    level = np.where(points.complementary, of_T, np.where(points.disk, log_minus - log_plus, level))
    if points.side is not None:
        level = level + points.has_side * gain_and_phase(points.side, omega_rad_s)[0]
    if points.plain:
        return level
    return np.where(points.open_loop, np.where(points.quantity == _PHASE, phase, state.log_gain), level)


def _wrapped(angle: FloatArray) -> FloatArray:
    return angle - 2.0 * np.pi * np.rint(angle / (2.0 * np.pi))
