"""Places where a peak of the closed loop may hide between two samples of the grid."""

from __future__ import annotations

import math

import numpy as np

from engine.loop.closed_loop_roots import ClosedLoopRoots
from engine.loop.gain_phase import gain_and_phase, slope
from engine.loop.grid import Sampled
from engine.loop.isolation import Brackets
from engine.loop.sections import BoolArray, IntArray, Sections
from engine.model.factored import FloatArray

_WIDEST = 0.03
"""Brackets are no wider than this (relative), so that they hold one extreme only."""


def narrow_places(
    samples: Sampled, brackets: Brackets, roots: ClosedLoopRoots
) -> tuple[IntArray, FloatArray, FloatArray, FloatArray]:
    """(p,) case, frequency and bracket of closed-loop poles whose peak is narrower than the samples around it.

    A peak much narrower than the spacing of the samples needs a closed-loop pole close to the axis. Where dead time
    leaves the poles unlisted, 1 + L must be small there, and L crosses the unit circle or the negative real axis
    nearby, so the complete lists of crossings have a point from which one Newton step finds the pole.
    """
    omega = samples.nodes.omega_rad_s
    with np.errstate(invalid="ignore"):
        light = (roots.roots.imag > 0) & (np.abs(roots.roots.real) < 0.05 * roots.roots.imag)
        light &= (roots.roots.real != 0) & (roots.roots.imag > omega[0]) & (roots.roots.imag < omega[-1])
    case, column = np.nonzero(light)
    found = roots.roots[case, column]
    place = np.searchsorted(omega, found.imag)
    # Samples within 0.3 half-widths of the top see 96 % of it: the search on the grid has the peak then.
    hidden = omega[place] - omega[place - 1] > 0.6 * np.abs(found.real)
    case, at = case[hidden], found.imag[hidden]
    unlisted = np.array([found is None or not found.counted for found in roots.dominant]) & ~roots.complete
    if unlisted.any():
        more_cases, more = _near_passages(samples, brackets, unlisted)
        case, at = np.concatenate([case, more_cases]), np.concatenate([at, more])
    place = np.searchsorted(omega, at)
    left = np.maximum(omega[place - 1], at * (1.0 - _WIDEST))
    right = np.minimum(omega[np.minimum(place + 1, len(omega) - 1)], at * (1.0 + _WIDEST))
    return case, at, left, right


def _near_passages(samples: Sampled, brackets: Brackets, unlisted: BoolArray) -> tuple[IntArray, FloatArray]:
    """Poles seen from the crossings near −1 of the loops whose poles are not listed."""
    omega = samples.nodes.omega_rad_s
    chosen = unlisted[brackets.case]
    case, start = brackets.case[chosen], brackets.start[chosen]
    own = samples.loop.at(case)
    gain, phase = gain_and_phase(own, start)
    near = np.abs(gain) + np.abs(np.sin(0.5 * (phase + math.pi))) < 0.35
    case, start = case[near], start[near]
    seen = _pole_nearby(own.at(np.nonzero(near)[0]), start, gain[near], phase[near])
    inside = (seen > omega[0]) & (seen < omega[-1])
    return case[inside], seen[inside]


def _pole_nearby(own: Sections, omega: FloatArray, gain: FloatArray, phase: FloatArray) -> FloatArray:
    """Imaginary part of the pole that Newton's method on 1 + L sees from jω; ω itself where that is far off."""
    rate = slope(own, omega)
    with np.errstate(divide="ignore", invalid="ignore"):
        # (1 + L)/L = 1 + 1/L, and ln L moves by `rate` per unit of ln s.
        step = ((1.0 + np.exp(-gain - 1j * phase)) / rate).real
    seen = omega * (1.0 - np.where(np.isfinite(step), step, 0.0))
    return np.where(np.abs(seen - omega) < 0.1 * omega, seen, omega)
