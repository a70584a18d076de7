"""Roots polished together: the Ehrlich–Aberth iteration on the factored form, and exact conjugates."""

from __future__ import annotations

import numpy as np

from engine.loop.characteristic import BoolArray, Characteristic
from engine.model.factored import ComplexArray, FloatArray

EPSILON = float(np.finfo(np.float64).eps)
MOST_ITERATIONS = 60


def polish_together(p: Characteristic, s: ComplexArray, live: BoolArray) -> tuple[ComplexArray, FloatArray]:
    """Polished roots and a bound of the error that rounding leaves in each, both (c, n)."""
    factors = p.poles.mask.shape[0] + p.zeros.mask.shape[0] + 2
    own = np.eye(s.shape[1])[:, None, :]
    mutual = (live.T[:, :, None] & live[None, :, :]) * (1.0 - own)
    settled = ~live
    error = np.zeros(s.shape)
    with np.errstate(all="ignore"):
        for _ in range(MOST_ITERATIONS):
            value, slope, size = p.newton(s)
            # Σ 1/(s_k − s_i) over the others; two in one place give nan, and the loop goes the exact way.
            repulsion = np.add.reduce(mutual / (s.T[:, :, None] - s + own), axis=0)
            move = value / (slope + value * repulsion)
            noise = 2.0 * EPSILON * factors * size / np.abs(slope)
            error = np.where(settled, error, noise)
            s = np.where(settled, s, s - move)
            reached = np.abs(move) <= np.maximum(4.0 * EPSILON * np.abs(s), 0.1 * noise)
            settled = settled | reached
            if settled.all():
                break
    return s, np.where(settled, error, np.inf)


def with_exact_conjugates(roots: ComplexArray, live: BoolArray) -> ComplexArray:
    """The same roots with exact conjugates; a root that is its own partner becomes real."""
    with np.errstate(all="ignore"):
        distance = np.abs(roots[:, :, None] - roots.conj()[:, None, :])
    distance[~(live[:, :, None] & live[:, None, :])] = np.inf
    partner = distance.argmin(axis=2)
    mutual = np.take_along_axis(partner, partner, axis=1) == np.arange(roots.shape[1])
    together = 0.5 * (roots + np.take_along_axis(roots, partner, axis=1).conj())
    # A cluster whose members choose each other in a ring is left to `close_roots`.
    return np.where(mutual | ~live, together, np.nan)
