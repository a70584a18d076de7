"""Places where a peak of the closed loop may hide between two samples of the grid."""

from __future__ import annotations

import math

import numpy as np

from engine.loop.closed_loop_roots import ClosedLoopRoots
from engine.loop.crossings import Found
from engine.loop.gain_phase import gain_and_phase, slope
from engine.loop.grid import Sampled
from engine.loop.sections import IntArray
from engine.model.factored import FloatArray

_WIDEST = 0.03
"""Brackets are no wider than this (relative), so that they hold one extreme only."""


def narrow_places(
    samples: Sampled, found: Found, roots: ClosedLoopRoots
) -> tuple[IntArray, FloatArray, FloatArray, FloatArray]:
    """(p,) case, frequency and bracket of the lightly damped closed-loop poles and the near passages of −1.

    A peak much narrower than the spacing of the samples needs a closed-loop pole close to the axis. Where dead time
    leaves the poles unlisted, 1 + L must be small there, and L crosses the unit circle or the negative real axis
    nearby, so the complete lists of crossings have a point from which one Newton step finds the pole.
    """
    omega = samples.nodes.omega_rad_s
    size = np.abs(roots.roots)
    with np.errstate(invalid="ignore"):
        light = (roots.roots.imag > 0) & (np.abs(roots.roots.real) < 0.05 * size) & (roots.roots.real != 0)
    case, column = np.nonzero(light)
    cases, places = [case], [roots.roots.imag[case, column]]
    if not roots.complete.all():
        for points in (found.gain, found.phase):
            near = np.abs(points.gain) + np.abs(np.sin(0.5 * (points.phase + math.pi))) < 0.35
            near &= ~roots.complete[points.case]
            if near.any():
                cases.append(points.case[near])
                places.append(_pole_nearby(samples, points.case[near], points.omega_rad_s[near]))
    case, at = np.concatenate(cases), np.concatenate(places)
    inside = (at > omega[0]) & (at < omega[-1])
    case, at = case[inside], at[inside]
    place = np.searchsorted(omega, at)
    left = np.maximum(omega[place - 1], at * (1.0 - _WIDEST))
    right = np.minimum(omega[np.minimum(place + 1, len(omega) - 1)], at * (1.0 + _WIDEST))
    return case, at, left, right


def _pole_nearby(samples: Sampled, case: IntArray, omega: FloatArray) -> FloatArray:
    """Imaginary part of the pole that Newton's method on 1 + L sees from jω; ω itself where that is far off."""
    own = samples.loop.at(case)
    gain, phase = gain_and_phase(own, omega)
    rate = slope(own, omega)
    with np.errstate(divide="ignore", invalid="ignore"):
        # (1 + L)/L = 1 + 1/L, and ln L moves by `rate` per unit of ln s.
        step = ((1.0 + np.exp(-gain - 1j * phase)) / rate).real
    seen = omega * (1.0 - np.where(np.isfinite(step), step, 0.0))
    return np.where(np.abs(seen - omega) < 0.1 * omega, seen, omega)
