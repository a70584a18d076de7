"""Gains of the closed loop at single frequencies: S, T, C·S, P·S and (1−L)/(1+L), with their slopes."""

from __future__ import annotations

import math
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


_TURN = 2.0 * math.pi
_LARGEST = 300.0
"""ln|L| above which 1/L is all there is to S."""

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
    any_disk: bool
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
        disk = quantity == _DISK
        return Points(
            quantity,
            samples.loop.at(case),
            side,
            (load | effort).astype(np.float64),
            quantity == _COMPLEMENTARY,
            disk,
            open_loop,
            bool(disk.any()),
            not open_loop.any(),
        )


def sensitivity(log_gain: FloatArray, phase: FloatArray) -> ComplexArray:
    """S = 1/(1 + L) without loss of digits near L = −1, and without overflow for any |L|."""
    away = phase + math.pi
    away = away - _TURN * np.rint(away / _TURN)
    # 1 + L = 1 − e^(ln|L| + j·away); expm1 keeps the digits that 1 + L would cancel.
    exponent = np.minimum(log_gain, _LARGEST) + 1j * away
    with np.errstate(divide="ignore", invalid="ignore"):
        inverse: ComplexArray = -1.0 / np.expm1(exponent)
    return inverse


def log_level(points: Points, omega_rad_s: FloatArray) -> FloatArray:
    """(p,) natural logarithm of each point's quantity."""
    gain, phase = gain_and_phase(points.loop, omega_rad_s)
    return _level(points, omega_rad_s, gain, phase, sensitivity(gain, phase))


def level_slope_bend(points: Points, omega_rad_s: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
    """ln of each point's quantity, and its first and second derivative in ln ω."""
    gain, phase = gain_and_phase(points.loop, omega_rad_s)
    first, second = slope_and_bend(points.loop, omega_rad_s)
    S = sensitivity(gain, phase)
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        # d ln q / d ln L and its own derivative; dT/d ln L = S·T, and (1−L)/(1+L) = S − T.
        T = 1.0 - S
        product = S * T
        rate, bend = np.where(points.complementary, S, -T), -product
        if points.any_disk:
            disk = S - T
            quotient = product / disk
            rate = np.where(points.disk, -2.0 * quotient, rate)
            bend = np.where(points.disk, -2.0 * quotient * (disk + 2.0 * quotient), bend)
        if not points.plain:
            rate = np.where(points.open_loop, np.where(points.quantity == _PHASE, -1j, 1.0), rate)
            bend = np.where(points.open_loop, 0.0, bend)
        slope = (rate * first).real
        curve = (bend * (first * first) + rate * second).real
    if points.side is not None:
        side_first, side_second = slope_and_bend(points.side, omega_rad_s)
        slope = slope + points.has_side * side_first.real
        curve = curve + points.has_side * side_second.real
    return _level(points, omega_rad_s, gain, phase, S), slope, curve


def _level(points: Points, omega_rad_s: FloatArray, gain: FloatArray, phase: FloatArray, S: ComplexArray) -> FloatArray:
    with np.errstate(divide="ignore", invalid="ignore"):
        wanted = np.where(points.disk, 2.0 * S - 1.0, S) if points.any_disk else S
        level: FloatArray = np.log(np.abs(wanted)) + np.where(points.complementary, gain, 0.0)
    # Where |L| is beyond the range of numbers T is 1 and S is 1/|L|.
    if gain.max(initial=0.0) > _LARGEST:
        beyond = np.where(points.complementary | points.disk, 0.0, -gain)
        level = np.where(gain > _LARGEST, beyond, level)
    if points.side is not None:
        level = level + points.has_side * gain_and_phase(points.side, omega_rad_s)[0]
    if points.plain:
        return level
    return np.where(points.open_loop, np.where(points.quantity == _PHASE, phase, gain), level)
