"""Extremes among the ripples that dead time makes where the grid is too coarse to show them.

At high frequencies e^{−jωθ} turns L through all angles between two nodes while |L| hardly changes. There |S| runs
between 1/(1+|L|) and 1/(1−|L|); the extreme lies at one of the passages of the negative (for a least value, the
positive) real axis next to the extreme of that envelope, which the grid does show.
"""

from __future__ import annotations

import math

import numpy as np

from engine.loop.closed_loop_gain import Quantity
from engine.loop.gain_phase import gain_and_phase, slope
from engine.loop.grid import Sampled
from engine.loop.polish import Tasks
from engine.loop.sections import IntArray, Sections
from engine.model.factored import FloatArray

_COARSE = 0.7
"""Turn of e^{−jωθ} from node to node [rad] from which on the samples no longer show the ripples."""
_NEIGHBOURS = np.arange(-2, 3)


def ripple_tasks(
    samples: Sampled,
    quantities: tuple[Quantity, ...],
    best: FloatArray,
    sign: float = 1.0,
    tilt: float = 0.0,
    band: tuple[float, float] = (0.0, math.inf),
) -> Tasks:
    """Ripples that may beat `best`.

    best: (q, c) greatest sampled sign·(quantity − tilt·ln ω) of each quantity and case.
    """
    omega = samples.nodes.omega_rad_s
    delayed = np.nonzero(samples.loop.dead_time_s > 0)[0]
    delay = samples.loop.dead_time_s[delayed][:, None]
    inside = (omega[1:] >= band[0]) & (omega[1:] <= band[1])
    coarse = (delay * np.diff(omega) > _COARSE) & inside
    first = int(np.argmax(coarse.any(axis=0))) if coarse.any() else len(omega)
    columns = np.arange(first + 1, len(omega))
    if not len(columns):
        return _nothing()
    height = sign * (_envelopes(samples, quantities, delayed, columns, sign) - tilt * np.log(omega[columns]))
    beats = coarse[:, first:] & (height > best[:, delayed][:, :, None])
    if not beats.any():
        return _nothing()
    around = np.pad(np.where(beats, height, -math.inf), ((0, 0), (0, 0), (1, 1)), constant_values=-math.inf)
    row, which, column = np.nonzero(beats & (height >= around[:, :, :-2]) & (height >= around[:, :, 2:]))
    kinds = np.array([int(quantity) for quantity in quantities], dtype=np.int64)[row]
    case, column = delayed[which], columns[column]
    left = np.maximum(omega[column - 1], band[0])
    right = np.minimum(omega[np.minimum(column + 1, len(omega) - 1)], band[1])
    own = samples.loop.at(case)
    centre = _envelope_top(samples, own, kinds, left, right, sign, tilt)
    return _passages(own, kinds, case, centre, sign, tilt, band)


def _nothing() -> Tasks:
    none, nothing = np.empty(0, np.int64), np.empty(0)
    return Tasks(none, none, nothing, nothing, nothing, nothing, nothing, nothing)


def _envelopes(
    samples: Sampled, quantities: tuple[Quantity, ...], cases: IntArray, columns: IntArray, sign: float
) -> FloatArray:
    """(q, d, k) ln of the envelopes where |L| < 1; no extreme is to be found by them elsewhere."""
    gain = samples.nodes.gain[np.ix_(cases, columns)]
    gain_C = samples.compensator_gain[0, columns]
    size = np.exp(np.minimum(gain, 0.0))
    of_S = -np.log1p(-sign * np.minimum(size, 1.0 - 1e-12))
    level = np.empty((len(quantities), *gain.shape))
    for row, quantity in enumerate(quantities):
        if quantity == Quantity.COMPLEMENTARY:
            level[row] = of_S + gain
        elif quantity == Quantity.EFFORT:
            level[row] = of_S + gain_C
        elif quantity == Quantity.LOAD:
            level[row] = of_S + (gain - gain_C)
        elif quantity == Quantity.DISK:
            level[row] = of_S + np.log1p(sign * size)
        else:
            level[row] = of_S
    level[:, gain >= 0] = -sign * math.inf
    return level


def _envelope_top(
    samples: Sampled, own: Sections, kinds: IntArray, left: FloatArray, right: FloatArray, sign: float, tilt: float
) -> FloatArray:
    """Where each envelope is extreme, by bisection of its slope: to half a ripple."""
    ripples = float(np.max(own.dead_time_s * (right - left))) / math.pi
    for _ in range(max(math.ceil(math.log2(max(ripples, 1.0))), 1)):
        middle = np.sqrt(left) * np.sqrt(right)
        gain = gain_and_phase(own, middle)[0]
        rate = slope(own, middle).real
        rate_c = slope(samples.compensator, middle).real
        size = np.exp(np.minimum(gain, -1e-12))
        rise = sign * size / (1.0 - sign * size) * rate
        rise = rise + np.where((kinds == Quantity.COMPLEMENTARY) | (kinds == Quantity.LOAD), rate, 0.0)
        rise = rise + np.where(kinds == Quantity.EFFORT, rate_c, np.where(kinds == Quantity.LOAD, -rate_c, 0.0))
        rise = rise + np.where(kinds == Quantity.DISK, sign * size / (1.0 + sign * size) * rate, 0.0)
        onward = sign * (rise - tilt) > 0
        left, right = np.where(onward, middle, left), np.where(onward, right, middle)
    return np.sqrt(left) * np.sqrt(right)


def _passages(
    own: Sections,
    kinds: IntArray,
    case: IntArray,
    centre: FloatArray,
    sign: float,
    tilt: float,
    band: tuple[float, float],
) -> Tasks:
    """The passages of the real axis on both sides of each centre, each with half a ripple around it."""
    phase = gain_and_phase(own, centre)[1]
    rate = slope(own, centre).imag / centre
    level = math.pi if sign > 0 else 0.0
    nearest = level + 2.0 * math.pi * np.rint((phase - level) / (2.0 * math.pi))
    target = nearest[:, None] + 2.0 * math.pi * _NEIGHBOURS
    at = centre[:, None] + (target - phase[:, None]) / rate[:, None]
    half = np.broadcast_to(2.8 / np.abs(rate)[:, None], at.shape)
    kept = (at > band[0]) & (at < band[1]) & (at > half)
    index = np.nonzero(kept)[0]
    start, half = at[kept], half[kept]
    count = len(index)
    return Tasks(
        kinds[index],
        case[index],
        np.maximum(start - half, band[0]),
        start,
        np.minimum(start + half, band[1]),
        np.full(count, math.nan),
        np.full(count, sign),
        np.full(count, tilt),
    )
