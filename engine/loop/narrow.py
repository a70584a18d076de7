"""Places where a peak of the closed loop may hide between two samples of the grid."""

from __future__ import annotations

import math

import numpy as np

from engine.loop.closed_loop_roots import ClosedLoopRoots
from engine.loop.crossings import Found
from engine.loop.grid import Sampled
from engine.loop.sections import IntArray
from engine.model.factored import FloatArray

_WIDEST = 0.03
"""Brackets are no wider than this (relative), so that they hold one extreme only."""


def narrow_places(
    samples: Sampled, found: Found, roots: ClosedLoopRoots
) -> tuple[IntArray, FloatArray, FloatArray, FloatArray]:
    """(p,) case, frequency and bracket of the lightly damped closed-loop poles and the near passages of −1.

    A peak much narrower than the spacing of the samples needs 1 + L small within that width. There L crosses the
    unit circle or the negative real axis, so the complete lists of crossings have a point nearby.
    """
    omega = samples.nodes.omega_rad_s
    size = np.abs(roots.roots)
    with np.errstate(invalid="ignore"):
        light = (roots.roots.imag > 0) & (np.abs(roots.roots.real) < 0.05 * size)
    case, column = np.nonzero(light)
    cases, places = [case], [roots.roots.imag[case, column]]
    for points in (found.gain, found.phase):
        near = np.abs(points.gain) + np.abs(np.sin(0.5 * (points.phase + math.pi))) < 0.35
        if near.any():
            cases.append(points.case[near])
            places.append(points.omega_rad_s[near])
    case, at = np.concatenate(cases), np.concatenate(places)
    inside = (at > omega[0]) & (at < omega[-1])
    case, at = case[inside], at[inside]
    place = np.searchsorted(omega, at)
    left = np.maximum(omega[place - 1], at * (1.0 - _WIDEST))
    right = np.minimum(omega[np.minimum(place + 1, len(omega) - 1)], at * (1.0 + _WIDEST))
    return case, at, left, right
