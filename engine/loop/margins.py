"""Gain, phase and delay margins from the complete lists of crossings."""

from __future__ import annotations

import math
from dataclasses import dataclass

from engine.loop.reading import Reading, value, without_value

DB = 20.0 / math.log(10.0)
"""Decibels per unit of natural logarithm."""


@dataclass(frozen=True, slots=True)
class GainCrossover:
    """A place where |L| = 1."""

    rad_s: float
    signed_phase_margin_deg: float
    """Signed distance of the phase from −180° mod 360°, in (−180, 180] [deg]."""
    direction: int
    """+1 upward, −1 downward, 0 touching."""


@dataclass(frozen=True, slots=True)
class PhaseCrossover:
    """A place where the phase is −180° mod 360°."""

    rad_s: float
    """0.0 and inf where L(0) or L(∞) is real and negative."""
    gain_db: float


def signed_distance_deg(phase_rad: float) -> float:
    """Distance of a phase from −180° mod 360°, in (−180, 180] [deg]."""
    off = math.remainder(phase_rad + math.pi, 2.0 * math.pi)
    return math.degrees(math.pi if off <= -math.pi else off)


def phase_margin(crossovers: tuple[GainCrossover, ...]) -> Reading:
    """Least |signed distance| over all gain crossovers [deg]."""
    if not crossovers:
        return without_value("unlimited", "|L| never crosses 1, so no phase lag at a crossover limits the loop")
    least = min(crossovers, key=lambda point: abs(point.signed_phase_margin_deg))
    return value(abs(least.signed_phase_margin_deg), at_rad_s=least.rad_s)


def delay_margin(crossovers: tuple[GainCrossover, ...], high_gain: float) -> Reading:
    """Least extra dead time that brings a crossover to −180° [s].

    high_gain: |L(∞)|, inf for an improper loop. From 1 on, any dead time makes endlessly many poles unstable.

    Source: Åström & Murray, Feedback Systems, 2nd ed., section 10.3.
    """
    if high_gain >= 1.0:
        return value(0.0, why="|L| stays at or above 1 for ω → ∞: the slightest dead time is too much")
    if not crossovers:
        return without_value("unlimited", "|L| never crosses 1, so no dead time makes the loop unstable")
    delays = [(math.radians(point.signed_phase_margin_deg % 360.0) / point.rad_s, point.rad_s) for point in crossovers]
    least, at = min(delays)
    return value(least, at_rad_s=at)


def gain_margins(crossovers: tuple[PhaseCrossover, ...], limit_db: float | None) -> tuple[Reading, Reading]:
    """Least increase and least reduction of the gain that reach −1, both positive [dB].

    limit_db: with dead time and a biproper loop, 20·log10|L(∞)|: L comes as near as one likes to −|L(∞)|.
    """
    increase = max((point for point in crossovers if point.gain_db <= 0), key=_gain, default=None)
    reduction = min((point for point in crossovers if point.gain_db > 0), key=_gain, default=None)
    up = _margin(increase, "no increase of the gain brings L to −1: no phase crossover with |L| < 1")
    down = _margin(reduction, "no reduction of the gain brings L to −1: no phase crossover with |L| > 1")
    if limit_db is not None and limit_db < 0 and (up.value is None or -limit_db <= up.value):
        up = value(-limit_db, why="approached for ω → ∞, where the dead time turns L through all angles")
    return up, down


def crossover(crossovers: tuple[GainCrossover, ...]) -> Reading:
    """The first downward crossing of 0 dB [rad/s]."""
    for point in crossovers:
        if point.direction < 0:
            return value(point.rad_s, at_rad_s=point.rad_s)
    return without_value("absent", "|L| never falls through 1")


def last_crossover(crossovers: tuple[GainCrossover, ...]) -> Reading:
    """The last crossing of 0 dB in either direction [rad/s]."""
    if not crossovers:
        return without_value("absent", "|L| never crosses 1")
    return value(crossovers[-1].rad_s, at_rad_s=crossovers[-1].rad_s)


def _gain(point: PhaseCrossover) -> float:
    return point.gain_db


def _margin(point: PhaseCrossover | None, missing: str) -> Reading:
    if point is None:
        return without_value("unlimited", missing)
    if math.isinf(point.rad_s):
        return value(abs(point.gain_db), why="read at ω → ∞")
    return value(abs(point.gain_db), at_rad_s=point.rad_s)
