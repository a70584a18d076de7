"""The frequencies at which a loop is drawn and searched: a function of the design alone, never of its history."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from engine.loop.gain_phase import gain_and_phase
from engine.loop.loop_set import LoopSet
from engine.loop.reach import Reach, reach_of
from engine.loop.sections import BoolArray, Sections, in_series, sections_of
from engine.loop.slope_bounds import UNDAMPED, gain_slope_bounds, phase_slope_bounds, steepest, undamped_jumps
from engine.model.factored import Factored, FloatArray

_PER_DECADE = 56
_SPARSE = 14
"""Every how many lattice points one is kept far away from all corners."""
_AROUND_CORNERS = 30.0
_DENSE_DECADES = 4.0
_FINEST = 1e-11
"""Nodes around an undamped pair start at this relative distance; see slope_bounds.JUMP_WIDTH."""
_COARSEST = 0.05


@dataclass(frozen=True, eq=False)
class Nodes:
    """One model set sampled at (n,) increasing frequencies, with proven bounds of the slopes between them."""

    omega_rad_s: FloatArray
    gain: FloatArray
    """(c, n) ln|L|."""
    phase: FloatArray
    """(c, n) [rad]."""
    gain_steepness: FloatArray
    """(c, n−1) bound of |d ln|L|/d ln ω|."""
    phase_steepness: FloatArray
    """(c, n−1) bound of |d phase/d ln ω|."""
    jump: BoolArray
    """(c, n−1) the interval is nothing but the passage of an undamped pair."""


@dataclass(frozen=True, eq=False)
class Sampled:
    """A loop set on its grid."""

    loop: Sections
    compensator: Sections
    """(1,) case."""
    plant: Sections
    reach: Reach
    nodes: Nodes
    compensator_gain: FloatArray
    """(1, n) ln|C|."""


@dataclass(frozen=True, eq=False)
class _PlantPart:
    sections: Sections
    nodes: Nodes
    """Bounds and jumps have n+1 columns: with the interval below the first node and the one above the last."""
    undamped: tuple[float, ...]
    """Natural frequencies of undamped pairs of plants and compensator: no node may stand on one [rad/s]."""


def sampled(loops: LoopSet) -> Sampled:
    """The loop set on a grid: a lattice over all corners, more points at each corner and around every lightly
    damped root, and as far out as `reach` says a crossing can lie."""
    compensator = sections_of([loops.compensator])
    part = _plant_part(loops.plants, _undamped(compensator))
    loop = in_series(compensator, part.sections)
    reach = reach_of(loop)
    fresh = _fresh_points(part, compensator, reach)
    return Sampled(loop, compensator, part.sections, reach, *_merged(part, compensator, fresh))


@lru_cache(maxsize=16)
def _plant_part(plants: tuple[Factored, ...], avoided: tuple[float, ...]) -> _PlantPart:
    # Models hash by identity: a drag step that leaves the plants alone finds them here.
    sections = sections_of(plants)
    undamped = (*avoided, *_undamped(sections))
    size = np.abs(sections.root)[sections.root_weight != 0]
    low, high = (float(size.min()), float(size.max())) if len(size) else (1.0, 1.0)
    omega = np.unique(
        np.concatenate([_lattice(low / _AROUND_CORNERS, high * _AROUND_CORNERS, 1), *_around_roots(sections)])
    )
    omega = _clear_of(omega, undamped)
    spread = sections.spread()
    gain, phase = gain_and_phase(spread, np.broadcast_to(omega, (len(plants), len(omega))))
    guarded = np.concatenate([[low * 1e-35], omega, [high * 1e35]])
    guarded = np.broadcast_to(guarded, (len(plants), len(guarded)))
    return _PlantPart(
        sections,
        Nodes(
            omega,
            gain,
            phase,
            _largest_size(gain_slope_bounds(spread, guarded)),
            _largest_size(phase_slope_bounds(spread, guarded)),
            undamped_jumps(spread, guarded),
        ),
        undamped,
    )


def _fresh_points(part: _PlantPart, compensator: Sections, reach: Reach) -> FloatArray:
    """The points that the compensator and the reach of the loop add to the plant's own."""
    own = part.nodes.omega_rad_s
    corner_low, corner_high = float(reach.smallest.min()), float(reach.largest.max())
    low = float(min(reach.gain_low.min(), reach.phase_low.min(), reach.closed_low.min()))
    high = float(max(reach.gain_high.max(), reach.phase_high.max(), reach.closed_high.max()))
    dense_low = min(corner_low / _AROUND_CORNERS, max(low / 10.0, corner_low / 10.0**_DENSE_DECADES))
    dense_high = max(corner_high * _AROUND_CORNERS, min(high * 10.0, corner_high * 10.0**_DENSE_DECADES))
    pieces = _around_roots(compensator)
    if dense_low < own[0]:
        pieces.append(_lattice(dense_low, own[0], 1))
    if dense_high > own[-1]:
        pieces.append(_lattice(own[-1], dense_high, 1))
    if low < dense_low:
        pieces.append(_lattice(low / 2.0, dense_low, _SPARSE))
    if high > dense_high:
        pieces.append(_lattice(dense_high, high * 2.0, _SPARSE))
    return _clear_of(np.unique(np.concatenate(pieces)), part.undamped) if pieces else np.empty(0)


def _largest_size(bounds: tuple[FloatArray, FloatArray]) -> FloatArray:
    return np.maximum(np.abs(bounds[0]), np.abs(bounds[1]))


def _merged(part: _PlantPart, compensator: Sections, fresh: FloatArray) -> tuple[Nodes, FloatArray]:
    own = part.nodes
    cases = own.gain.shape[0]
    omega, gain, phase = own.omega_rad_s, own.gain, own.phase
    if len(fresh):
        new_gain, new_phase = gain_and_phase(part.sections.spread(), np.broadcast_to(fresh, (cases, len(fresh))))
        both = np.concatenate([omega, fresh])
        order = np.argsort(both, kind="stable")
        omega = both[order]
        first = np.concatenate([[True], omega[1:] > omega[:-1]])
        omega, order = omega[first], order[first]
        gain = np.concatenate([gain, new_gain], axis=1).take(order, axis=1)
        phase = np.concatenate([phase, new_phase], axis=1).take(order, axis=1)
    spread = compensator.spread()
    row = omega[None, :]
    own_gain, own_phase = gain_and_phase(spread, row)
    # A piece of an interval keeps the bounds of the whole: looser, but free.
    parent = np.searchsorted(own.omega_rad_s, omega[:-1], side="right")
    steep = steepest(spread, row)
    jump = own.jump.take(parent, axis=1)
    if part.undamped:
        jump = jump | undamped_jumps(spread, row)
    phase = phase + own_phase
    negative = part.sections.turn + compensator.turn < -4.0
    if negative.any():
        phase[negative] += 2.0 * math.pi
    return (
        Nodes(
            omega,
            gain + own_gain,
            phase,
            own.gain_steepness.take(parent, axis=1) + steep,
            own.phase_steepness.take(parent, axis=1) + steep,
            jump,
        ),
        own_gain,
    )


def _undamped(model: Sections) -> tuple[float, ...]:
    natural = np.hypot(model.decay, model.swing)
    chosen = natural[(model.pair_weight != 0) & (np.abs(model.decay) <= UNDAMPED * natural)]
    return tuple(sorted(set(chosen.tolist())))


def _clear_of(omega: FloatArray, undamped: tuple[float, ...]) -> FloatArray:
    """The frequencies without those that stand on an undamped pair, where L is infinite or 0."""
    for natural in undamped:
        omega = omega[np.abs(omega - natural) > 0.9 * _FINEST * natural]
    return omega


def _lattice(low: float, high: float, step: int) -> FloatArray:
    first = math.floor(math.log10(low) * _PER_DECADE / step)
    last = math.ceil(math.log10(high) * _PER_DECADE / step)
    lattice: FloatArray = np.power(10.0, np.arange(first, last + 1, dtype=np.float64) * (step / _PER_DECADE))
    return lattice


def _around_roots(model: Sections) -> list[FloatArray]:
    """Each corner itself, and points in geometric steps away from each lightly damped pair."""
    pieces: list[FloatArray] = [np.abs(model.corner[model.corner_weight != 0])]
    for index in zip(*np.nonzero(model.pair_weight), strict=True):
        decay, swing = abs(float(model.decay[index])), float(model.swing[index])
        natural = math.hypot(decay, swing)
        start = max(0.5 * decay / natural, _FINEST)
        pieces.append(np.array([natural]) if decay > UNDAMPED * natural else np.empty(0))
        if start < _COARSEST:
            per_side = min(math.ceil(math.log2(_COARSEST / start)), 10)
            steps = start * (_COARSEST / start) ** (np.arange(per_side + 1) / per_side)
            pieces += [swing * (1.0 - steps), swing * (1.0 + steps)]
    return pieces
