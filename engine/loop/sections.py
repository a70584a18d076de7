"""The factors of a set of models, padded into arrays so that every case is computed at once."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import TypeAlias

import numpy as np
from numpy.typing import NDArray

from engine.model.factored import ComplexArray, Factored, FloatArray

IntArray: TypeAlias = NDArray[np.int64]
BoolArray: TypeAlias = NDArray[np.bool_]


_SCALARS = 6


class Sections:
    """Models as first-order and second-order factors of unity value at s = 0.

    K · s^-integrators · Π(1 + s/corner)^weight · Π(1 + 2·decay·s/ω0² + s²/ω0²)^weight · exp(−s·dead_time_s),
    ω0² = decay² + swing². The last axes belong to the cases (or to single points, see `at`); the first axis
    of the factor arrays counts factors, and a factor of weight 0 is padding.

    All real numbers stand in one block, so that picking cases is one operation; the attributes are views of it.
    """

    __slots__ = (
        "block", "corner", "corner_weight", "corners", "dead_time_s", "decay", "integrators", "log_gain", "low_gain",
        "origin_zeros", "pair_weight", "pairs", "root", "root_weight", "swing", "turn",
    )  # fmt: skip

    def __init__(self, block: FloatArray, root: ComplexArray, corners: int, pairs: int) -> None:
        self.block = block
        self.corners, self.pairs = corners, pairs
        self.log_gain: FloatArray = block[0]
        """(…,) ln|K|."""
        self.low_gain: FloatArray = block[1]
        """(…,) K itself; ±inf or 0 where it exceeds the range of numbers."""
        self.turn: FloatArray = block[2]
        """(…,) argument of K: 0, or −π where K is negative [rad]."""
        self.integrators: FloatArray = block[3]
        """(…,) poles at s = 0 less zeros at s = 0."""
        self.origin_zeros: FloatArray = block[4]
        """(…,) zeros at s = 0."""
        self.dead_time_s: FloatArray = block[5]
        """(…,) [s]."""
        a, b = _SCALARS + corners, _SCALARS + 2 * corners
        self.corner: FloatArray = block[_SCALARS:a]
        """(k, …) minus the real root, signed [rad/s]."""
        self.corner_weight: FloatArray = block[a:b]
        """(k, …) +1 zero, −1 pole, 0 padding."""
        self.decay: FloatArray = block[b : b + pairs]
        """(l, …) minus the real part of the pair, signed [rad/s]."""
        self.swing: FloatArray = block[b + pairs : b + 2 * pairs]
        """(l, …) imaginary part of the pair, > 0 [rad/s]."""
        self.pair_weight: FloatArray = block[b + 2 * pairs : b + 3 * pairs]
        """(l, …) +1 zeros, −1 poles, 0 padding."""
        self.root_weight: FloatArray = block[b + 3 * pairs :]
        """(n, …) +1 zero, −1 pole, 0 padding."""
        self.root: ComplexArray = root
        """(n, …) every root other than 0 [rad/s]."""

    def at(self, case: IntArray) -> Sections:
        """The factors of one case per point: last axis (p,) instead of (c,)."""
        return Sections(self.block.take(case, axis=1), self.root.take(case, axis=1), self.corners, self.pairs)

    def spread(self) -> Sections:
        """The same with a last axis of length 1, to be broadcast over frequencies."""
        return Sections(self.block[..., None], self.root[..., None], self.corners, self.pairs)


def sections_of(models: Sequence[Factored]) -> Sections:
    """Factor arrays of c models, padded to the largest of them; last axis (c,)."""
    split = [_Split(model) for model in models]
    corners = max(len(part.corner) for part in split)
    pairs = max(len(part.decay) for part in split)
    roots = max(len(part.root) for part in split)
    block = np.zeros((_SCALARS + 2 * corners + 3 * pairs + roots, len(models)))
    root = np.full((roots, len(models)), -1.0 + 0.0j)
    whole = Sections(block, root, corners, pairs)
    # Padding has weight 0, and values that do no harm.
    whole.corner[:] = whole.decay[:] = whole.swing[:] = 1.0
    for case, part in enumerate(split):
        block[:_SCALARS, case] = part.scalars
        k, m, n = len(part.corner), len(part.decay), len(part.root)
        whole.corner[:k, case], whole.corner_weight[:k, case] = part.corner, part.corner_weight
        whole.decay[:m, case], whole.swing[:m, case] = part.decay, part.swing
        whole.pair_weight[:m, case] = part.pair_weight
        root[:n, case], whole.root_weight[:n, case] = part.root, part.root_weight
    return whole


def in_series(first: Sections, second: Sections) -> Sections:
    """The product of one model with each of c: both sets of factors side by side."""
    cases = second.block.shape[1]
    repeated = Sections(np.repeat(first.block, cases, axis=1), first.root, first.corners, first.pairs)
    scalars = repeated.block[:_SCALARS] + second.block[:_SCALARS]
    scalars[1] = repeated.low_gain * second.low_gain
    scalars[2, scalars[2] < -4.0] = 0.0
    pieces = [scalars]
    for name in ("corner", "corner_weight", "decay", "swing", "pair_weight", "root_weight"):
        pieces += [getattr(repeated, name), getattr(second, name)]
    root = np.concatenate([np.repeat(first.root, cases, axis=1), second.root])
    return Sections(np.concatenate(pieces), root, first.corners + second.corners, first.pairs + second.pairs)


class _Split:
    """One model sorted into factors."""

    def __init__(self, model: Factored) -> None:
        zeros, poles = np.asarray(model.zeros, np.complex128), np.asarray(model.poles, np.complex128)
        roots = np.concatenate([zeros, poles])
        weight = np.ones(len(roots))
        weight[len(zeros) :] = -1.0
        moving = roots != 0
        origin_zeros = len(zeros) - int(np.count_nonzero(moving[: len(zeros)]))
        origin_poles = len(poles) - int(np.count_nonzero(moving[len(zeros) :]))
        self.root, self.root_weight = roots[moving], weight[moving]
        imaginary = self.root.imag
        real, upper = imaginary == 0, imaginary > 0
        self.corner, self.corner_weight = -self.root.real[real], self.root_weight[real]
        # + 0.0 turns −0.0 into +0.0: an undamped pair is passed on its right, as if barely damped.
        self.decay, self.swing = -self.root.real[upper] + 0.0, imaginary[upper]
        self.pair_weight = self.root_weight[upper]
        right = int(np.count_nonzero(self.corner < 0))
        negative = (model.gain < 0) != (right % 2 == 1)
        mantissa, exponent = _product(model.gain, self.root, self.root_weight)
        log_gain = math.log(mantissa) + exponent * math.log(2.0)
        size = math.ldexp(mantissa, exponent) if exponent < 1024 else math.inf
        self.scalars = (
            log_gain,
            -size if negative else size,
            -math.pi if negative else 0.0,
            float(origin_poles - origin_zeros),
            float(origin_zeros),
            float(model.dead_time_s),
        )


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
