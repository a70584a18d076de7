"""How far a search for crossings must go, read from the loop's series at ω → 0 and ω → ∞.

Beyond the largest root, ln L(s) = ln g − r·ln s − Σ A_k / (k·s^k) with the power sums A_k = Σ ±root^k; even k
move the gain, odd k the phase. The first sum that is not zero rules once ω is far enough out, and how far that
is follows from the geometric remainder. The same holds below the smallest root with the inverse roots, so both ends
are computed together: arrays (2, c), row 0 for ω → 0 and row 1 for ω → ∞.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from engine.loop.sections import BoolArray, Sections
from engine.model.factored import ComplexArray, FloatArray

# A power sum smaller than this, relative to the number of roots, is taken for zero: it is rounding.
_NOTHING = 1e-12
_HIGHEST_SUM = 8
_QUARTER = 0.5 * math.pi
_FARTHEST = 300.0
"""ln of the frequencies that are searched at most: beyond, squares leave the range of numbers."""


@dataclass(frozen=True, eq=False)
class Reach:
    """Per case (c,): outside [low, high] no crossing of the kind can lie [rad/s]."""

    gain_low: FloatArray
    gain_high: FloatArray
    phase_low: FloatArray
    phase_high: FloatArray
    """With dead time the phase goes on crossing: where the gain has become monotone and one more crossing has come.

    If that one has |L| < 1, it has the largest |L| of all later ones.
    """
    smallest: FloatArray
    """Size of the smallest root other than 0; 1 where there is none."""
    largest: FloatArray
    closed_low: FloatArray
    """Beyond all roots and crossings of L the closed loop still changes down to here: K near −1 makes a slow pole."""
    closed_high: FloatArray
    """… and up to here: L(∞) near −1 makes a fast pole, and a small |T(0)| is left late."""
    relative_degree: FloatArray
    log_high_gain: FloatArray
    """ln|g|, L(s) → g·s^−relative_degree for s → ∞ (dead time left aside)."""
    phase_zero: FloatArray
    """Phase for ω → 0 [rad]."""
    phase_infinite: FloatArray
    """Phase for ω → ∞, dead time left aside [rad]."""
    complete: BoolArray
    """False where the gain crosses 1 at a frequency beyond all numbers that are searched."""


def reach_of(model: Sections) -> Reach:
    """Structural limits of a set of loops, last axis (c,)."""
    weight = model.root_weight
    size = np.abs(model.root)
    present = np.abs(weight)
    count = np.add.reduce(present, axis=0)
    smallest = np.minimum.reduce(np.where(present > 0, size, math.inf), axis=0, initial=math.inf)
    largest = np.maximum.reduce(present * size, axis=0, initial=0.0)
    bare = count == 0
    if bare.any():
        smallest, largest = np.where(bare, 1.0, smallest), np.where(bare, 1.0, largest)
    degree = np.array([-model.integrators, model.integrators - np.add.reduce(weight, axis=0)])
    log_limit = np.array([model.log_gain, model.log_gain - np.add.reduce(weight * np.log(size), axis=0)])
    phase = np.array([model.turn - model.integrators * _QUARTER] * 2)
    # A real root turns the phase by a quarter between the ends, each root of a pair as well.
    phase[1] -= _QUARTER * np.add.reduce(weight * np.where(model.root.real > 0, 1.0, -1.0), axis=0)
    delay = model.dead_time_s
    delayed = delay > 0

    # Distances q < 1 from the ends, as shares of the smallest root's frequency or the inverse of the largest's.
    lag = np.array([delay * smallest, 0.0 * delay])
    sums = _PowerSums(np.array([smallest / model.root, model.root / largest]), weight, lag)
    plain = np.minimum(0.5 / np.sqrt(np.maximum(count, 1.0)), 1.2 / (np.maximum(count, 1.0) + lag))
    full = np.maximum(count + lag, 1.0)
    in_phase = _first_rules(sums, 1, full, _on_level(phase), plain)
    in_gain = _gain_limit(log_limit, degree, sums, full, np.array([np.zeros_like(delayed), delayed]), plain)
    # Beyond the corners the gain follows a straight line, and crosses 1 where that does.
    straight = np.exp(_bounded(log_limit / np.where(degree == 0, 1.0, np.abs(degree))))
    near = np.where(degree[0] < 0, straight[0], np.where(degree[0] > 0, 1.0 / straight[0], math.inf)) / 2.0
    far = np.where(degree[1] > 0, straight[1], np.where(degree[1] < 0, 1.0 / straight[1], 0.0)) * 2.0
    gain_high = np.maximum(largest / in_gain[1], far)
    phase_high = largest / in_phase[1]
    if delayed.any():
        # There the rational part turns by less than a quarter any more: two turns of the dead time cross the level.
        phase_high = np.where(delayed, gain_high + 4.0 * math.pi / np.where(delayed, delay, 1.0), phase_high)
    gap = np.where(degree == 0, _gap(log_limit, phase), 1.0)
    return Reach(
        gain_low=np.minimum(smallest * in_gain[0], near),
        gain_high=gain_high,
        phase_low=smallest * in_phase[0],
        phase_high=phase_high,
        smallest=smallest,
        largest=largest,
        closed_low=smallest * gap[0],
        closed_high=np.maximum(largest / gap[1], _last_bandwidth(model, degree[1], log_limit[1])),
        relative_degree=degree[1],
        log_high_gain=log_limit[1],
        phase_zero=phase[0],
        phase_infinite=phase[1],
        complete=np.logical_and.reduce(np.abs(log_limit) < _FARTHEST * np.maximum(np.abs(degree), 1.0), axis=0),
    )


class _PowerSums:
    """Σ weight·ratio^k over the roots (2, n, c), computed as far as they are asked for; the lag joins the first."""

    def __init__(self, ratio: ComplexArray, weight: FloatArray, lag: FloatArray) -> None:
        self._ratio, self._weight, self._lag = ratio, weight, lag
        self._power = np.ones_like(ratio)
        self._sums: list[FloatArray] = []

    def sum(self, k: int) -> FloatArray:
        """(2, c) the sum for k = 1, 2, …"""
        while len(self._sums) < k:
            self._power = self._power * self._ratio
            total: FloatArray = np.add.reduce(self._weight * self._power.real, axis=1)
            self._sums.append(total if self._sums else total + self._lag)
        return self._sums[k - 1]


def _first_rules(sums: _PowerSums, first: int, full: FloatArray, needed: BoolArray, plain: FloatArray) -> FloatArray:
    """Distance q within which the first sum that is not zero outweighs all later ones, where `needed`.

    first: 1 for the odd sums (phase), 2 for the even ones (gain).
    """
    q = plain
    found = ~needed
    for k in range(first, _HIGHEST_SUM + 1, 2):
        if found.all():
            break
        share = np.abs(sums.sum(k)) / full
        here = ~found & (share > _NOTHING)
        q = np.where(here, np.minimum(plain, 0.9 * np.sqrt(share / (1.0 + share))), q)
        found = found | here
    return q


def _gain_limit(
    log_limit: FloatArray,
    degree: FloatArray,
    sums: _PowerSums,
    full: FloatArray,
    monotone: BoolArray,
    plain: FloatArray,
) -> FloatArray:
    """Distance q beyond which the gain crosses 1 no more, apart from the asymptote's own crossing."""
    finite = degree == 0
    if not finite.any():
        return plain
    level = finite & (np.abs(log_limit) <= 1e-13)
    ruled = _first_rules(sums, 2, full, (level | monotone) & finite, plain)
    clear = np.maximum(np.sqrt(np.abs(log_limit) / full), 1e-7)
    return np.where(finite & ~level, np.minimum(ruled, clear), ruled)


def _gap(log_gain: FloatArray, phase: FloatArray) -> FloatArray:
    """|1 + L| at an end where L is real, in 1e-9 … 1."""
    size = np.exp(np.minimum(np.maximum(log_gain, -1.0), 1.0))
    return np.where(np.cos(phase) < 0, np.minimum(np.maximum(np.abs(1.0 - size), 1e-9), 1.0), 1.0)


def _last_bandwidth(model: Sections, relative_degree: FloatArray, log_high_gain: FloatArray) -> FloatArray:
    """Where |L|, and |T| with it, has fallen to half of |T(0)|, on the asymptote; 0 where |T(0)| is not below 1."""
    falling = (model.integrators == 0) & (relative_degree > 0)
    if not falling.any():
        return np.zeros(len(falling))
    size = np.exp(_bounded(model.log_gain))
    value = np.where(model.turn < -1.0, -size, size)
    with np.errstate(divide="ignore"):
        level = np.minimum(model.log_gain - np.log(np.abs(1.0 + value)), 0.0) - 0.7
    far = np.exp(_bounded((log_high_gain - level) / np.maximum(relative_degree, 1.0)))
    return np.where(falling & np.isfinite(far), far, 0.0)


def _on_level(phase: FloatArray) -> BoolArray:
    level: BoolArray = np.mod(np.rint(phase / _QUARTER), 4.0) == 2.0
    return level


def _bounded(exponent: FloatArray) -> FloatArray:
    return np.minimum(np.maximum(exponent, -_FARTHEST), _FARTHEST)
