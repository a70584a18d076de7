"""Modal sums as the response search sees them: values, slopes and bounds anywhere."""

from __future__ import annotations

import numpy as np

from engine.loop.modal import ModalSums
from engine.loop.response_search import Follower, Glance, IntArray, Net
from engine.model.factored import ComplexArray, FloatArray

NET_INSTANTS = 160
# A mode below this share of its response's scale can move no reading.
ASLEEP = 1e-13
# Share of Σ|weight| at which a mode counts as died out, and that of a mode too small to ask for early instants.
DIED_OUT = 1e-14
TOO_SMALL = 1e-9


class ModalResponses:
    """Stable step responses given as modal sums."""

    def __init__(self, sums: ModalSums, scale: FloatArray) -> None:
        # Modes along axis 0: sums then run in one order however many cases there are.
        self._exponents = np.ascontiguousarray(sums.exponents.T)
        self._weights = np.ascontiguousarray(sums.weights.transpose(2, 0, 1))
        self._offset = sums.offset
        self._scale = scale

    def glance(self, case: IntArray, row: IntArray, at_s: FloatArray, length_s: FloatArray) -> Glance:
        """See `Responses`."""
        exponents, weights = self._exponents[:, case], self._weights[:, case, row]
        terms = weights * np.exp(exponents * at_s)
        value = self._offset[case, row] + np.add.reduce(terms.real, axis=0)
        return Glance(value, *_bounds(np.abs(terms), np.abs(exponents) * length_s, self._scale[case, row]))

    def follow(self, case: IntArray, row: IntArray, inside_s: FloatArray) -> Follower:
        """See `Responses`."""
        exponents, offset = self._exponents[:, case], self._offset[case, row]
        weights = self._weights[:, case, row]
        first = weights * exponents
        stacked = np.stack([weights, first, first * exponents], axis=1)

        def at(at_s: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
            summed = np.add.reduce(stacked * np.exp(exponents * at_s)[:, None, :], axis=0).real
            return offset + summed[0], summed[1], summed[2]

        return at


def _bounds(size: FloatArray, turn: FloatArray, scale: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Deviation, bend and turns over intervals on which mode i has at most `size` and turns h·|λ|; modes on axis 0."""
    alive = size > ASLEEP * scale
    awake = np.where(alive, size, 0.0)
    square = turn * turn
    deviation = np.add.reduce(awake * np.minimum(2.0, 0.125 * square), axis=0)
    return deviation, np.add.reduce(awake * square, axis=0), np.max(turn * alive, axis=0, initial=0.0)


def modal_net(sums: ModalSums) -> Net:
    """Instants from well before the fastest mode that counts has moved to where every mode has died out."""
    return late_net(sums, np.zeros(len(sums.offset)))


def late_net(sums: ModalSums, from_s: FloatArray) -> Net:
    """The same from the instants (c,) at which the sums begin to hold."""
    time_s = _net_instants(sums, from_s)
    basis = np.exp(sums.exponents[:, :, None] * time_s[:, None, :])
    value = _values(sums.weights, basis) + sums.offset[:, :, None]
    slope = _values(sums.weights * sums.exponents[:, None, :], basis)
    scale = np.maximum(np.abs(value).max(axis=2), np.abs(sums.offset))
    size = np.abs(sums.weights)
    decay = np.abs(basis[:, :, :-1])
    turn = np.abs(sums.exponents)[:, :, None] * np.diff(time_s, axis=1)[:, None, :]
    square = turn * turn
    deviation = size @ (decay * np.minimum(2.0, 0.125 * square))
    cubic = size @ (decay * np.minimum(2.0 + turn, square * square / 384.0))
    bend = size @ (decay * square)
    turns = _fastest_alive(size, decay, turn, scale)
    return Net(time_s, value, slope, deviation, cubic, bend, turns, scale)


def _values(weights: ComplexArray, basis: ComplexArray) -> FloatArray:
    real = np.concatenate([weights.real, -weights.imag], axis=2)
    values: FloatArray = real @ np.concatenate([basis.real, basis.imag], axis=1)
    return values


def _fastest_alive(size: FloatArray, decay: FloatArray, turn: FloatArray, scale: FloatArray) -> FloatArray:
    """(c, 3, k) h·|λ| of the fastest mode that is alive in any row."""
    with np.errstate(all="ignore"):
        share = np.where(scale[:, :, None] > 0.0, size / scale[:, :, None], 0.0).max(axis=1)
    alive = share[:, :, None] * decay > ASLEEP
    turns = np.max(turn * alive, axis=1, initial=0.0)
    return np.broadcast_to(turns[:, None, :], (*scale.shape, turns.shape[1]))


def _net_instants(sums: ModalSums, from_s: FloatArray) -> FloatArray:
    """(c, k) the first instant and a geometric sequence from there."""
    size = np.abs(sums.weights) * np.exp(sums.exponents.real * from_s[:, None])[:, None, :]
    total = size.sum(axis=2, keepdims=True)
    with np.errstate(divide="ignore", invalid="ignore"):
        share = np.where(total > 0.0, size / total, 0.0).max(axis=1)
        lifetime = np.where(share > DIED_OUT, np.log(share / DIED_OUT) / -sums.exponents.real, 0.0)
        fastest = np.where(share > TOO_SMALL, np.abs(sums.exponents), 0.0).max(axis=1, initial=0.0)
        end = np.where(fastest > 0.0, lifetime.max(axis=1, initial=0.0), 1.0)
        start = np.where(fastest > 0.0, 0.25 / fastest, 1e-3)
    steps = np.linspace(0.0, 1.0, NET_INSTANTS - 1)
    times = np.empty((len(end), NET_INSTANTS))
    times[:, 0] = 0.0
    times[:, 1:] = start[:, None] * (end / start)[:, None] ** steps
    return times + from_s[:, None]
