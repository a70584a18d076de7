"""How far a search for crossings must go, read from the loop's series at ω → 0 and ω → ∞.

Beyond the largest root, ln L(s) = ln g − r·ln s − Σ A_k / (k·s^k) with the power sums A_k = Σ ±root^k; even k
move the gain, odd k the phase. The first sum that is not zero rules once ω is far enough out, and how far that
is follows from the geometric remainder. The same holds below the smallest root with the inverse roots.
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


def reach_of(model: Sections) -> Reach:
    """Structural limits of a set of loops, last axis (c,)."""
    active = model.root_weight != 0
    size = np.abs(model.root)
    count = np.sum(active, axis=0)
    largest = np.max(np.where(active, size, 0.0), axis=0, initial=0.0)
    smallest = np.min(np.where(active, size, math.inf), axis=0, initial=math.inf)
    bare = count == 0
    largest, smallest = np.where(bare, 1.0, largest), np.where(bare, 1.0, smallest)
    lag = model.dead_time_s * smallest
    high_sums = _PowerSums(model.root / largest, model.root_weight, 0.0)
    low_sums = _PowerSums(smallest / model.root, model.root_weight, lag)
    relative_degree = model.integrators - np.sum(model.root_weight, axis=0)
    log_high_gain = model.log_gain - np.sum(model.root_weight * np.log(size), axis=0)
    phase_zero = model.turn - model.integrators * (0.5 * math.pi)
    phase_infinite = phase_zero + 0.5 * math.pi * (
        np.sum(model.corner_weight * np.sign(model.corner), axis=0)
        + 2.0 * np.sum(model.pair_weight * np.where(model.decay < 0, -1.0, 1.0), axis=0)
    )
    delayed = model.dead_time_s > 0

    plain_high = _plain(count, 0.0 * lag)
    plain_low = _plain(count, lag)
    phase_high = largest / _first_rules(high_sums, 1, count, _on_level(phase_infinite), plain_high)
    gain_high = _gain_limit(log_high_gain, relative_degree, high_sums, count, delayed, plain_high)
    gain_low = _gain_limit(model.log_gain, -model.integrators, low_sums, count, False & delayed, plain_low)
    far = np.where(relative_degree != 0, np.exp(_bounded(log_high_gain / _nonzero(relative_degree))) * 2.0, 0.0)
    near = np.where(
        model.integrators != 0, np.exp(_bounded(model.log_gain / _nonzero(model.integrators))) / 2.0, math.inf
    )
    gain_high_at = np.maximum(largest / gain_high, far)
    return Reach(
        gain_low=np.minimum(smallest * gain_low, near),
        gain_high=gain_high_at,
        phase_low=smallest * _first_rules(low_sums, 1, count + lag, _on_level(phase_zero), plain_low),
        # There the rational part turns by less than a quarter any more: two turns of the dead time cross the level.
        phase_high=np.where(
            delayed, gain_high_at + 4.0 * math.pi / np.where(delayed, model.dead_time_s, 1.0), phase_high
        ),
        closed_low=smallest * np.where(model.integrators == 0, _gap(model.log_gain, phase_zero), 1.0),
        closed_high=np.maximum(
            largest / np.where(relative_degree == 0, _gap(log_high_gain, phase_infinite), 1.0),
            _last_bandwidth(model, relative_degree, log_high_gain),
        ),
        smallest=smallest,
        largest=largest,
        relative_degree=relative_degree,
        log_high_gain=log_high_gain,
        phase_zero=phase_zero,
        phase_infinite=phase_infinite,
    )


class _PowerSums:
    """Σ weight·ratio^k, computed as far as they are asked for."""

    def __init__(self, ratio: ComplexArray, weight: FloatArray, first_extra: float | FloatArray) -> None:
        self._ratio, self._weight, self._extra = ratio, weight, first_extra
        self._power = np.ones_like(ratio)
        self._sums: list[FloatArray] = []

    def sum(self, k: int) -> FloatArray:
        """The sum for k = 1, 2, …"""
        while len(self._sums) < k:
            self._power = self._power * self._ratio
            total: FloatArray = np.add.reduce(self._weight * self._power.real, axis=0)
            self._sums.append(total if self._sums else total + self._extra)
        return self._sums[k - 1]


def _plain(count: FloatArray, lag: FloatArray) -> FloatArray:
    """Distance q < 1 at which all roots together move the gain by under 1/4 and the phase by under 90°."""
    full = np.maximum(count, 1.0) + lag
    return np.minimum(0.5 / np.sqrt(np.maximum(count, 1.0)), 1.2 / full)


def _first_rules(sums: _PowerSums, first: int, count: FloatArray, needed: BoolArray, plain: FloatArray) -> FloatArray:
    """Distance q within which the first sum that is not zero outweighs all later ones, where `needed`.

    first: 1 for the odd sums (phase), 2 for the even ones (gain).
    """
    q = plain
    found = ~needed
    full = np.maximum(count, 1.0)
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
    count: FloatArray,
    monotone: BoolArray,
    plain: FloatArray,
) -> FloatArray:
    """Distance q beyond which the gain crosses 1 no more, apart from the asymptote's own crossing."""
    level = (degree == 0) & (np.abs(log_limit) <= 1e-13)
    ruled = _first_rules(sums, 2, count, (level | monotone) & (degree == 0), plain)
    clear = np.sqrt(np.abs(log_limit) / np.maximum(count, 1.0))
    return np.where((degree == 0) & ~level, np.minimum(ruled, np.maximum(clear, 1e-7)), ruled)


def _gap(log_gain: FloatArray, phase: FloatArray) -> FloatArray:
    """|1 + L| at an end where L is real, in 1e-9 … 1."""
    size = np.exp(np.clip(log_gain, -1.0, 1.0))
    return np.clip(np.where(np.cos(phase) < 0, np.abs(1.0 - size), 1.0), 1e-9, 1.0)


def _last_bandwidth(model: Sections, relative_degree: FloatArray, log_high_gain: FloatArray) -> FloatArray:
    """Where |L|, and |T| with it, has fallen to half of |T(0)|, on the asymptote; 0 where |T(0)| is not below 1."""
    size = np.exp(np.clip(model.log_gain, -300.0, 300.0))
    value = np.where(model.turn < -1.0, -size, size)
    with np.errstate(divide="ignore"):
        level = np.minimum(model.log_gain - np.log(np.abs(1.0 + value)), 0.0) - 0.7
    falling = (model.integrators == 0) & (relative_degree > 0)
    far = np.exp(_bounded((log_high_gain - level) / _nonzero(relative_degree)))
    return np.where(falling & np.isfinite(far), far, 0.0)


def _on_level(phase: FloatArray) -> BoolArray:
    quarter = np.rint(phase / (0.5 * math.pi))
    level: BoolArray = np.mod(quarter, 4) == 2
    return level


def _bounded(exponent: FloatArray) -> FloatArray:
    return np.clip(exponent, -300.0, 300.0)


def _nonzero(degree: FloatArray) -> FloatArray:
    return np.where(degree == 0, 1.0, degree)
