"""The factors of a set of models, padded into arrays so that every case is computed at once."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TypeAlias, TypeVar

import numpy as np
from numpy.typing import NDArray

from engine.model.factored import ComplexArray, Factored, FloatArray

IntArray: TypeAlias = NDArray[np.int64]
BoolArray: TypeAlias = NDArray[np.bool_]
_Number = TypeVar("_Number", np.float64, np.complex128)


@dataclass(frozen=True, eq=False)
class Sections:
    """Models as first-order and second-order factors of unity value at s = 0.

    K · s^-integrators · Π(1 + s/corner)^weight · Π(1 + 2·decay·s/ω0² + s²/ω0²)^weight · exp(−s·dead_time_s),
    ω0² = decay² + swing². The last axes belong to the cases (or to single points, see `at`); the first axis
    of the factor arrays counts factors, and a factor of weight 0 is padding.
    """

    log_gain: FloatArray
    """(…,) ln|K|."""
    low_gain: FloatArray
    """(…,) K itself; ±inf or 0 where it exceeds the range of numbers."""
    turn: FloatArray
    """(…,) argument of K: 0, or −π where K is negative [rad]."""
    integrators: FloatArray
    """(…,) poles at s = 0 less zeros at s = 0."""
    origin_zeros: FloatArray
    """(…,) zeros at s = 0."""
    dead_time_s: FloatArray
    """(…,) [s]."""
    corner: FloatArray
    """(k, …) minus the real root, signed [rad/s]."""
    corner_weight: FloatArray
    """(k, …) +1 zero, −1 pole, 0 padding."""
    decay: FloatArray
    """(l, …) minus the real part of the pair, signed [rad/s]."""
    swing: FloatArray
    """(l, …) imaginary part of the pair, > 0 [rad/s]."""
    pair_weight: FloatArray
    """(l, …) +1 zeros, −1 poles, 0 padding."""
    root: ComplexArray
    """(n, …) every root other than 0 [rad/s]."""
    root_weight: FloatArray
    """(n, …) +1 zero, −1 pole, 0 padding."""

    def at(self, case: IntArray) -> Sections:
        """The factors of one case per point: last axis (p,) instead of (c,)."""
        return Sections(
            self.log_gain[case],
            self.low_gain[case],
            self.turn[case],
            self.integrators[case],
            self.origin_zeros[case],
            self.dead_time_s[case],
            self.corner[:, case],
            self.corner_weight[:, case],
            self.decay[:, case],
            self.swing[:, case],
            self.pair_weight[:, case],
            self.root[:, case],
            self.root_weight[:, case],
        )

    def spread(self) -> Sections:
        """The same with a last axis of length 1, to be broadcast over frequencies."""
        return Sections(
            self.log_gain[..., None],
            self.low_gain[..., None],
            self.turn[..., None],
            self.integrators[..., None],
            self.origin_zeros[..., None],
            self.dead_time_s[..., None],
            self.corner[..., None],
            self.corner_weight[..., None],
            self.decay[..., None],
            self.swing[..., None],
            self.pair_weight[..., None],
            self.root[..., None],
            self.root_weight[..., None],
        )


def sections_of(models: Sequence[Factored]) -> Sections:
    """Factor arrays of c models, padded to the largest of them; last axis (c,)."""
    split = [_Split(model) for model in models]
    return Sections(
        log_gain=np.array([part.log_gain for part in split]),
        low_gain=np.array([part.low_gain for part in split]),
        turn=np.array([part.turn for part in split]),
        integrators=np.array([float(part.integrators) for part in split]),
        origin_zeros=np.array([float(part.origin_zeros) for part in split]),
        dead_time_s=np.array([float(model.dead_time_s) for model in models]),
        corner=_padded([part.corner for part in split], 1.0),
        corner_weight=_padded([part.corner_weight for part in split], 0.0),
        decay=_padded([part.decay for part in split], 1.0),
        swing=_padded([part.swing for part in split], 1.0),
        pair_weight=_padded([part.pair_weight for part in split], 0.0),
        root=_padded_complex([part.root for part in split], -1.0),
        root_weight=_padded([part.root_weight for part in split], 0.0),
    )


def in_series(first: Sections, second: Sections) -> Sections:
    """The product; a set of one model is repeated for every case of the other."""
    cases = max(first.log_gain.shape[0], second.log_gain.shape[0])

    def both(a: FloatArray, b: FloatArray) -> FloatArray:
        return np.concatenate([_repeated(a, cases), _repeated(b, cases)])

    turn = first.turn + second.turn
    return Sections(
        log_gain=first.log_gain + second.log_gain,
        low_gain=first.low_gain * second.low_gain,
        turn=np.where(turn < -4.0, 0.0, turn),
        integrators=first.integrators + second.integrators,
        origin_zeros=first.origin_zeros + second.origin_zeros,
        dead_time_s=first.dead_time_s + second.dead_time_s,
        corner=both(first.corner, second.corner),
        corner_weight=both(first.corner_weight, second.corner_weight),
        decay=both(first.decay, second.decay),
        swing=both(first.swing, second.swing),
        pair_weight=both(first.pair_weight, second.pair_weight),
        root=np.concatenate([_repeated(first.root, cases), _repeated(second.root, cases)]),
        root_weight=both(first.root_weight, second.root_weight),
    )


class _Split:
    """One model sorted into factors."""

    def __init__(self, model: Factored) -> None:
        zeros, poles = np.asarray(model.zeros, complex), np.asarray(model.poles, complex)
        roots = np.concatenate([zeros, poles])
        weight = np.concatenate([np.ones(len(zeros)), -np.ones(len(poles))])
        moving = roots != 0
        self.origin_zeros = int(np.count_nonzero(zeros == 0))
        self.integrators = int(np.count_nonzero(poles == 0)) - self.origin_zeros
        self.root, self.root_weight = roots[moving], weight[moving]
        real = self.root.imag == 0
        upper = self.root.imag > 0
        self.corner, self.corner_weight = -self.root[real].real, self.root_weight[real]
        # + 0.0 turns −0.0 into +0.0: an undamped pair is passed on its right, as if barely damped.
        self.decay, self.swing = -self.root[upper].real + 0.0, self.root[upper].imag
        self.pair_weight = self.root_weight[upper]
        right = np.count_nonzero(self.corner < 0)
        negative = (model.gain < 0) != (right % 2 == 1)
        self.turn = -math.pi if negative else 0.0
        mantissa, exponent = _product(model.gain, self.root, self.root_weight)
        self.log_gain = math.log(mantissa) + exponent * math.log(2.0)
        size = math.ldexp(mantissa, exponent) if exponent < 1024 else math.inf
        self.low_gain = -size if negative else size


def _product(gain: float, roots: ComplexArray, weight: FloatArray) -> tuple[float, int]:
    """|gain·Π root^weight| as mantissa and power of 2: exact to a few ulps and safe at any order."""
    mantissa, exponent = math.frexp(abs(gain))
    for size, sign in zip(np.abs(roots).tolist(), weight.tolist(), strict=True):
        part, power = math.frexp(size)
        mantissa, carry = math.frexp(mantissa * part if sign > 0 else mantissa / part)
        exponent += carry + (power if sign > 0 else -power)
    if mantissa < math.sqrt(0.5):
        mantissa, exponent = 2 * mantissa, exponent - 1
    return mantissa, exponent


def _padded(rows: list[FloatArray], filler: float) -> FloatArray:
    return np.ascontiguousarray(_padded_complex([row.astype(complex) for row in rows], filler).real)


def _padded_complex(rows: list[ComplexArray], filler: float) -> ComplexArray:
    width = max((len(row) for row in rows), default=0)
    block = np.full((width, len(rows)), filler, np.complex128)
    for column, row in enumerate(rows):
        block[: len(row), column] = row
    return block


def _repeated(block: NDArray[_Number], cases: int) -> NDArray[_Number]:
    return block if block.shape[1] == cases else np.broadcast_to(block, (block.shape[0], cases))
