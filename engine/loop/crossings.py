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

_QUIET = 1e-2
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
    """Where the search for phase crossings stops, and whether LISTED_AT_MOST cut off what may matter.

    With dead time: where |L| stays below 1/100 for good and below what the first crossing with |L| < 1 shows, or where
    `reach` says that no later crossing can be worse.
    """
    end = samples.reach.phase_high
    delay = samples.loop.dead_time_s
    cut = np.zeros(len(delay), bool)
    if not delay.any():
        return end, cut
    end = end.copy()
    for case in np.nonzero(delay)[0].tolist():
        enough = float(end[case])
        quiet = _quiet_from(samples, case)
        most = LISTED_AT_MOST * TURN / float(delay[case])
        wanted = enough if quiet is None else quiet
        end[case] = min(wanted, most)
        cut[case] = end[case] < min(wanted, enough)
    return end, cut


def _quiet_from(samples: Sampled, case: int) -> float | None:
    """Lowest node from which on |L| is proven too small to matter; None where no node is high enough to tell."""
    nodes = samples.nodes
    omega, gain = nodes.omega_rad_s, nodes.gain[case]
    low, high = nodes.gain_slope[0][case], nodes.gain_slope[1][case]
    step = np.log(omega[1:] / omega[:-1])
    ends = np.maximum(gain[:-1], gain[1:])
    with np.errstate(invalid="ignore"):
        top = np.fmax(ends, np.minimum(gain[:-1] + high * step, gain[1:] - low * step))
    ceiling = np.maximum.accumulate(top[::-1])[::-1]
    level = np.floor(turns(nodes.phase[case]))
    first = np.nonzero((level[1:] != level[:-1]) & (ends < 0))[0]
    if not len(first):
        return None
    limit = min(math.log(_QUIET), float(min(gain[first[0]], gain[first[0] + 1])))
    quiet = np.nonzero(ceiling < limit)[0]
    return float(omega[quiet[0]]) if len(quiet) else None
