"""Modal sums as the response search sees them: values, slopes and bounds anywhere."""

from __future__ import annotations

import numpy as np

from engine.loop.modal import ModalSums
from engine.loop.response_search import Follower, Glance, IntArray, Net, interval_bounds
from engine.model.factored import ComplexArray, FloatArray

# Instants of the net: a geometric sequence that grows by 9 % each.
PER_OCTAVE = 8
MOST_OCTAVES = 90
# A mode below this share of its response's scale can move no reading.
ASLEEP = 1e-13
# A ripple below this share moves an extremum by no more than that, and need not be followed turn by turn.
QUIET = 1e-10
# Share of Σ|weight| at which a mode counts as died out, and that of a mode too small to ask for early instants.
DIED_OUT = 1e-14
TOO_SMALL = 1e-9
# Instants times modes computed at once: 16 MB of complex numbers.
MOST_TERMS = 1_000_000


class ModalResponses:
    """Stable step responses given as modal sums."""

    def __init__(self, sums: ModalSums, scale: FloatArray) -> None:
        # Modes along axis 0: sums then run in one order however many cases there are.
        self._exponents = np.ascontiguousarray(sums.exponents.T)
        self._weights = np.ascontiguousarray(sums.weights.transpose(2, 0, 1))
        self._paces = np.abs(self._exponents)
        self._offset = sums.offset
        self._scale = scale

    def glance(self, case: IntArray, row: IntArray, at_s: FloatArray, length_s: FloatArray) -> Glance:
        """See `Responses`."""
        blocks = self._blocks(len(case))
        if len(blocks) > 1:
            parts = [self.glance(case[part], row[part], at_s[part], length_s[part]) for part in blocks]
            return Glance(*(np.concatenate([getattr(part, name) for part in parts]) for name in Glance.__annotations__))
        exponents, weights = self._exponents[:, case], self._weights[:, case, row]
        terms = weights * np.exp(exponents * at_s)
        value = self._offset[case, row] + np.add.reduce(terms.real, axis=0)
        return Glance(value, *_bounds(np.abs(terms), self._paces[:, case] * length_s, self._scale[case, row]))

    def follow(self, case: IntArray, row: IntArray, inside_s: FloatArray) -> Follower:
        """See `Responses`."""
        blocks = self._blocks(len(case))
        if len(blocks) > 1:

            def piecewise(at_s: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
                parts = [self.follow(case[part], row[part], inside_s[part])(at_s[part]) for part in blocks]
                value, slope, bend = (np.concatenate(rows) for rows in zip(*parts, strict=True))
                return value, slope, bend

            return piecewise
        exponents, offset = self._exponents[:, case], self._offset[case, row]
        weights = self._weights[:, case, row]
        first = weights * exponents
        stacked = np.stack([weights, first, first * exponents], axis=1)

        def at(at_s: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
            summed = np.add.reduce(stacked * np.exp(exponents * at_s)[:, None, :], axis=0).real
            return offset + summed[0], summed[1], summed[2]

        return at

    def _blocks(self, count: int) -> list[slice]:
        """Parts of `count` instants, small enough that no array over instants and modes fills the memory."""
        most = max(MOST_TERMS // max(len(self._exponents), 1), 1)
        return [slice(first, first + most) for first in range(0, count, most)]


def _bounds(size: FloatArray, turn: FloatArray, scale: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Deviation, bend and turns over intervals on which mode i has at most `size` and turns h·|λ|; modes on axis 0."""
    awake = np.where(size > ASLEEP * scale, size, 0.0)
    square = turn * turn
    deviation = np.add.reduce(awake * np.minimum(2.0, 0.125 * square), axis=0)
    return deviation, np.add.reduce(awake * square, axis=0), np.max(turn * (size > QUIET * scale), axis=0, initial=0.0)


def modal_net(sums: ModalSums) -> Net:
    """Instants from well before the fastest mode that counts has moved to where every mode has died out."""
    return late_net(sums, np.zeros(len(sums.offset)))


def late_net(sums: ModalSums, from_s: FloatArray) -> Net:
    """The same from the instants (c,) at which the sums begin to hold."""
    size = np.abs(sums.weights)
    since, basis = _net_basis(sums, size, from_s)
    time_s = from_s[:, None] + since
    value = _values(sums.weights, basis) + sums.offset[:, :, None]
    slope = _values(sums.weights * sums.exponents[:, None, :], basis)
    scale = np.maximum(np.abs(value).max(axis=2), np.abs(sums.offset))
    decay = np.abs(basis[:, :, :-1])
    turn = np.abs(sums.exponents)[:, :, None] * np.diff(since, axis=1)[:, None, :]
    square = turn * turn
    deviation = size @ (decay * np.minimum(2.0, 0.125 * square))
    cubic = size @ (decay * np.minimum(2.0 + turn, square * square / 384.0))
    bend = size @ (decay * square)
    turns = _fastest_alive(size, decay, turn, scale)
    high, low = interval_bounds(time_s, value, slope, deviation, cubic)
    return Net(time_s, value, high, low, bend, turns, scale)


def _net_basis(sums: ModalSums, size: FloatArray, from_s: FloatArray) -> tuple[FloatArray, ComplexArray]:
    """(c, k) instants since `from_s`, 0 and a geometric sequence, and (c, m, k) e^{exponent·t} at them.

    From one octave to the next the exponentials are squared, which costs nothing and loses no more digits than
    rounding of exponent·t itself would.
    """
    start, octaves = _net_extent(sums, size, from_s)
    first = start[:, None] * 2.0 ** (np.arange(PER_OCTAVE) / PER_OCTAVE)
    since = np.empty((len(start), 1 + PER_OCTAVE * octaves))
    since[:, 0] = 0.0
    since[:, 1:] = (first[:, None, :] * 2.0 ** np.arange(octaves)[:, None]).reshape(len(start), -1)
    basis = np.empty((*sums.exponents.shape, since.shape[1]), dtype=np.complex128)
    begin = np.exp(sums.exponents * from_s[:, None])[:, :, None]
    basis[:, :, :1] = 1.0
    power = np.exp(sums.exponents[:, :, None] * first[:, None, :])
    for octave in range(octaves):
        basis[:, :, 1 + octave * PER_OCTAVE : 1 + (octave + 1) * PER_OCTAVE] = power
        power = power * power
    return since, basis * begin if from_s.any() else basis


def _values(weights: ComplexArray, basis: ComplexArray) -> FloatArray:
    real = np.concatenate([weights.real, -weights.imag], axis=2)
    values: FloatArray = real @ np.concatenate([basis.real, basis.imag], axis=1)
    return values


def _fastest_alive(size: FloatArray, decay: FloatArray, turn: FloatArray, scale: FloatArray) -> FloatArray:
    """(c, 3, k) h·|λ| of the fastest mode that is alive in any row."""
    with np.errstate(all="ignore"):
        share = np.where(scale[:, :, None] > 0.0, size / scale[:, :, None], 0.0).max(axis=1)
    alive = share[:, :, None] * decay > QUIET
    turns = np.max(turn * alive, axis=1, initial=0.0)
    return np.broadcast_to(turns[:, None, :], (*scale.shape, turns.shape[1]))


def _net_extent(sums: ModalSums, size: FloatArray, from_s: FloatArray) -> tuple[FloatArray, int]:
    """(c,) the first instant after `from_s`, and the number of octaves to where the slowest case has died out."""
    if from_s.any():
        size = size * np.exp(sums.exponents.real * from_s[:, None])[:, None, :]
    total = size.sum(axis=2, keepdims=True)
    with np.errstate(divide="ignore", invalid="ignore"):
        share = np.where(total > 0.0, size / total, 0.0).max(axis=1)
        lifetime = np.where(share > DIED_OUT, np.log(share / DIED_OUT) / -sums.exponents.real, 0.0)
        fastest = np.where(share > TOO_SMALL, np.abs(sums.exponents), 0.0).max(axis=1, initial=0.0)
        end = np.where(fastest > 0.0, lifetime.max(axis=1, initial=0.0), 1.0)
        start = np.where(fastest > 0.0, 0.25 / fastest, 0.5)
    return start, int(min(max(np.ceil(np.log2((end / start).max(initial=1.0))), 1.0), MOST_OCTAVES))
