"""Gains of the closed loop at single frequencies: S, T, C·S, P·S and (1−L)/(1+L), with their slopes."""

from __future__ import annotations

import math
from dataclasses import dataclass
from enum import IntEnum

import numpy as np

from engine.loop.gain_phase import FactorValues, factor_values, root_terms, summed
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
class Side:
    """The part of each point's loop whose gain multiplies S: C for C·S, P for P·S, nothing elsewhere."""

    log_gain: FloatArray
    integrators: FloatArray
    corner_weight: FloatArray
    pair_weight: FloatArray
    root_weight: FloatArray


@dataclass(frozen=True, eq=False)
class Points:
    """Points (p,), each in one case and for one quantity."""

    quantity: IntArray
    loop: Sections
    """(p,) the factors of each point's own case."""
    side: Side | None
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
        loop = samples.loop.at(case)
        effort, load = quantity == _EFFORT, quantity == _LOAD
        open_loop = quantity >= _LOOP
        disk = quantity == _DISK
        return Points(
            quantity,
            loop,
            _side(samples, loop, case, effort, load) if effort.any() or load.any() else None,
            quantity == _COMPLEMENTARY,
            disk,
            open_loop,
            bool(disk.any()),
            not open_loop.any(),
        )


def _side(samples: Sampled, loop: Sections, case: IntArray, effort: BoolArray, load: BoolArray) -> Side:
    """The compensator's factors stand first in the loop: C·S takes those, P·S the rest."""
    C, P = samples.compensator, samples.plant
    of_C, of_P = effort.astype(np.float64), load.astype(np.float64)

    def weights(weight: FloatArray, first: int) -> FloatArray:
        own = weight.copy()
        own[:first] *= of_C
        own[first:] *= of_P
        return own

    return Side(
        of_C * C.log_gain + of_P * P.log_gain[case],
        of_C * C.integrators + of_P * P.integrators[case],
        weights(loop.corner_weight, C.corners),
        weights(loop.pair_weight, C.pairs),
        weights(loop.root_weight, len(C.root)),
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
    values = factor_values(points.loop, omega_rad_s)
    gain, phase = summed(points.loop, omega_rad_s, values)
    return _level(points, omega_rad_s, values, gain, phase, sensitivity(gain, phase))


def level_slope_bend(points: Points, omega_rad_s: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
    """ln of each point's quantity, and its first and second derivative in ln ω (nan where L is ±1 or infinite).

    The caller silences numpy's warnings about those places.
    """
    loop, side = points.loop, points.side
    values = factor_values(loop, omega_rad_s)
    gain, phase = summed(loop, omega_rad_s, values)
    S = sensitivity(gain, phase)
    real, imaginary = root_terms(loop, omega_rad_s)
    bend_real = real - real * real + imaginary * imaginary
    bend_imaginary = imaginary - 2.0 * real * imaginary
    weight, lag = loop.root_weight, loop.dead_time_s * omega_rad_s
    first = (np.add.reduce(weight * real, axis=0) - loop.integrators) + 1j * (
        np.add.reduce(weight * imaginary, axis=0) - lag
    )
    second = np.add.reduce(weight * bend_real, axis=0) + 1j * (np.add.reduce(weight * bend_imaginary, axis=0) - lag)
    rate, bend = _by_loop(points, S)
    slope = (rate * first).real
    curve = (bend * (first * first) + rate * second).real
    if side is not None:
        slope = slope + np.add.reduce(side.root_weight * real, axis=0) - side.integrators
        curve = curve + np.add.reduce(side.root_weight * bend_real, axis=0)
    return _level(points, omega_rad_s, values, gain, phase, S), slope, curve


def _by_loop(points: Points, S: ComplexArray) -> tuple[ComplexArray, ComplexArray]:
    """d ln q / d ln L and its own derivative; dT/d ln L = S·T, and (1−L)/(1+L) = S − T."""
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
    return rate, bend


def _level(
    points: Points,
    omega_rad_s: FloatArray,
    values: FactorValues,
    gain: FloatArray,
    phase: FloatArray,
    S: ComplexArray,
) -> FloatArray:
    with np.errstate(divide="ignore", invalid="ignore"):
        wanted = np.where(points.disk, 2.0 * S - 1.0, S) if points.any_disk else S
        level: FloatArray = np.log(np.abs(wanted)) + np.where(points.complementary, gain, 0.0)
    # Where |L| is beyond the range of numbers T is 1 and S is 1/|L|.
    if gain.max(initial=0.0) > _LARGEST:
        beyond = np.where(points.complementary | points.disk, 0.0, -gain)
        level = np.where(gain > _LARGEST, beyond, level)
    side = points.side
    if side is not None:
        level = level + (side.log_gain - side.integrators * np.log(omega_rad_s))
        with np.errstate(invalid="ignore"):
            level = level + 0.5 * (
                np.add.reduce(side.corner_weight * values.corner_size, axis=0)
                + np.add.reduce(side.pair_weight * values.pair_size, axis=0)
            )
    if points.plain:
        return level
    return np.where(points.open_loop, np.where(points.quantity == _PHASE, phase, gain), level)
