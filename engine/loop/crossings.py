"""All frequencies at which the gain crosses 1 or the phase crosses −180° (mod 360°): proven, then polished."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from engine.loop.crossing_polish import Crossings, polished_crossings
from engine.loop.grid import Sampled
from engine.loop.isolation import TURN, isolated, turns
from engine.loop.sections import BoolArray
from engine.model.factored import FloatArray

LISTED_AT_MOST = 400
"""Phase crossings with dead time have no end; per case this many are computed."""


@dataclass(frozen=True, eq=False)
class Found:
    """Both kinds of crossings of a loop set, and what was noticed on the way."""

    gain: Crossings
    phase: Crossings
    flat_phase: BoolArray
    """(c,) the phase lies on −180° over a whole stretch."""
    flat_gain: BoolArray
    listed_up_to: FloatArray
    """(c,) with dead time: phase crossings are listed up to here [rad/s]; inf without."""
    shortened: BoolArray
    """(c,) the list was cut at LISTED_AT_MOST."""


def find_crossings(samples: Sampled) -> Found:
    """Every gain and phase crossing at 0 < ω < ∞ of every case."""
    nodes, reach, loop = samples.nodes, samples.reach, samples.loop
    left, right = nodes.omega_rad_s[:-1], nodes.omega_rad_s[1:]
    in_gain = (right > reach.gain_low[:, None]) & (left < reach.gain_high[:, None])
    end, shortened = _end_of_phase_search(samples)
    in_phase = (right > reach.phase_low[:, None]) & (left < end[:, None])
    gain, flat_gain = isolated(loop, nodes.omega_rad_s, nodes.gain, nodes.gain_slope, in_gain, nodes.jump, "gain")
    low, high = nodes.phase_slope
    phase, flat_phase = isolated(
        loop,
        nodes.omega_rad_s,
        turns(nodes.phase),
        (low / TURN, high / TURN),
        in_phase & ~nodes.jump,
        nodes.jump,
        "phase",
    )
    delayed = loop.dead_time_s > 0
    return Found(
        *polished_crossings(loop, gain, phase),
        flat_phase=flat_phase,
        flat_gain=flat_gain,
        listed_up_to=np.where(delayed, end, math.inf),
        shortened=shortened,
    )


def _end_of_phase_search(samples: Sampled) -> tuple[FloatArray, BoolArray]:
    """Where the search for phase crossings stops: with dead time, where |L| stays too small to matter.

    That is below 1/100 and below what the first crossing with |L| < 1 already shows.
    """
    end = samples.reach.phase_high
    delay = samples.loop.dead_time_s
    cut = np.zeros(len(delay), bool)
    if not delay.any():
        return end, cut
    end = end.copy()
    nodes = samples.nodes
    omega = nodes.omega_rad_s
    step = np.diff(np.log(omega))
    for case in np.nonzero(delay)[0].tolist():
        gain = nodes.gain[case]
        rise = np.minimum(nodes.gain_slope[1][case] * step + gain[:-1], gain[1:] - nodes.gain_slope[0][case] * step)
        top = np.maximum(np.maximum(gain[:-1], gain[1:]), rise)
        ceiling = np.maximum.accumulate(top[::-1])[::-1]
        level = np.floor(turns(nodes.phase[case]))
        small = np.maximum(gain[:-1], gain[1:]) < 0
        first = np.nonzero((level[1:] != level[:-1]) & small)[0]
        limit = math.log(1e-2)
        if len(first):
            limit = min(limit, float(min(gain[first[0]], gain[first[0] + 1])))
        quiet = np.nonzero(ceiling < limit)[0]
        last = max(float(samples.reach.phase_high[case]), 0.0)
        if len(quiet):
            end[case] = min(last, float(omega[quiet[0]]))
        else:
            # One full turn beyond the point from which the gain is monotone: the crossing there outdoes all later ones.
            end[case] = last + 2.0 * TURN / delay[case]
        most = LISTED_AT_MOST * TURN / delay[case]
        if end[case] > most:
            end[case], cut[case] = most, True
    return end, cut
