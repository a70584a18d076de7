"""All frequencies at which the gain crosses 1 or the phase crosses −180° (mod 360°): proven, then polished."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from engine.loop.crossing_polish import Crossings, crossing_tasks, in_order
from engine.loop.grid import Sampled
from engine.loop.isolation import TURN, Brackets, isolated, turns
from engine.loop.polish import polished
from engine.loop.sections import BoolArray
from engine.model.factored import FloatArray

_QUIET = 1e-2
LISTED_AT_MOST = 400
"""Phase crossings with dead time have no end; per case this many are computed."""


@dataclass(frozen=True, eq=False)
class Isolated:
    """Every gain and phase crossing in a bracket of its own, and what was noticed on the way."""

    brackets: Brackets
    flat_gain: BoolArray
    """(c,) |L| rests at 1 over a whole stretch."""
    flat_phase: BoolArray
    """(c,) the phase rests on −180° over a whole stretch."""
    listed_up_to: FloatArray
    """(c,) with dead time: phase crossings are listed up to here [rad/s]; inf without."""
    shortened: BoolArray
    """(c,) the list was cut at LISTED_AT_MOST."""


@dataclass(frozen=True, eq=False)
class Found:
    """Both kinds of crossings of a loop set, polished and in order."""

    gain: Crossings
    phase: Crossings


def isolate_crossings(samples: Sampled) -> Isolated:
    """A bracket for every gain and phase crossing at 0 < ω < ∞ of every case."""
    reach = samples.reach
    end, shortened = _end_of_phase_search(samples)
    brackets, flat = isolated(samples, (reach.gain_low, reach.gain_high), (reach.phase_low, end))
    listed_up_to = np.where(samples.loop.dead_time_s > 0, end, math.inf)
    return Isolated(brackets, flat[0], flat[1], listed_up_to, shortened)


def find_crossings(samples: Sampled) -> Found:
    """Every crossing of every case, isolated and polished by itself."""
    brackets = isolate_crossings(samples).brackets
    omega, _ = polished(samples, crossing_tasks(brackets))
    return settled_crossings(samples, brackets, omega)


def settled_crossings(samples: Sampled, brackets: Brackets, omega: FloatArray) -> Found:
    """The lists, from the polished frequencies in the order of `crossing_tasks`."""
    return Found(*in_order(samples.loop, brackets, omega))


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
    ends = np.maximum(gain[:-1], gain[1:])
    # Rising from the left end and falling to the right one as steeply as the bound allows.
    climb = nodes.gain_steepness[case] * np.log(omega[1:] / omega[:-1])
    top = np.maximum(ends, 0.5 * (gain[:-1] + gain[1:] + climb))
    ceiling = np.maximum.accumulate(top[::-1])[::-1]
    level = np.floor(turns(nodes.phase[case]))
    first = np.nonzero((level[1:] != level[:-1]) & (ends < 0))[0]
    if not len(first):
        return None
    limit = min(math.log(_QUIET), float(min(gain[first[0]], gain[first[0] + 1])))
    quiet = np.nonzero(ceiling < limit)[0]
    return float(omega[quiet[0]]) if len(quiet) else None
