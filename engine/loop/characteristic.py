"""The characteristic function in factored form, its slope, and start values for its roots."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TypeAlias

import numpy as np
from numpy.typing import NDArray

from engine.loop.packed import RootTable, root_table
from engine.loop.section_chain import chain_matrix
from engine.model.factored import ComplexArray, Factored, FloatArray

IntArray: TypeAlias = NDArray[np.int64]
BoolArray: TypeAlias = NDArray[np.bool_]


@dataclass(frozen=True, eq=False)
class Characteristic:
    """D(s) + N(s)·e^{−s·dead time}, in scaled time."""

    poles: RootTable
    zeros: RootTable
    gain: FloatArray
    """(c,) gain in scaled time."""
    dead_time: FloatArray | None = None
    """(c,) dead time in scaled time; None where there is none."""

    @classmethod
    def of(cls, loops: Sequence[Factored], scale: FloatArray) -> Characteristic:
        """The characteristic functions with s divided by `scale` (c,)."""
        degree = np.array([loop.relative_degree for loop in loops])
        gain = np.array([loop.gain for loop in loops]) * scale ** (-degree.astype(np.float64))
        poles = root_table([loop.poles for loop in loops]).scaled(scale)
        zeros = root_table([loop.zeros for loop in loops]).scaled(scale)
        dead_time = np.array([loop.dead_time_s for loop in loops]) * scale
        return cls(poles, zeros, gain, dead_time if dead_time.any() else None)

    def newton(self, s: ComplexArray) -> tuple[ComplexArray, ComplexArray, FloatArray]:
        """p, p' and |D| + |N| at s (c, n)."""
        at_poles, at_zeros = self.poles.factors(s), self.zeros.factors(s)
        # A start value exactly on a pole would make 0·∞ of a derivative that is finite.
        if not (at_poles.all() and at_zeros.all()):
            at_poles = np.where(at_poles == 0.0, 1e-200, at_poles)
            at_zeros = np.where(at_zeros == 0.0, 1e-200, at_zeros)
        d = np.multiply.reduce(at_poles, axis=0)
        n = np.multiply.reduce(at_zeros, axis=0) * self.gain[:, None]
        slope_n = np.add.reduce(self.zeros.mask / at_zeros, axis=0)
        if self.dead_time is not None:
            n = n * np.exp(-s * self.dead_time[:, None])
            slope_n = slope_n - self.dead_time[:, None]
        slope = d * np.add.reduce(self.poles.mask / at_poles, axis=0) + n * slope_n
        return d + n, slope, np.abs(d) + np.abs(n)

    def of_cases(self, case: IntArray) -> Characteristic:
        """The functions of the cases listed, one a row."""
        return Characteristic(
            self.poles.of_cases(case),
            self.zeros.of_cases(case),
            self.gain[case],
            None if self.dead_time is None else self.dead_time[case],
        )

    def starts(self) -> tuple[ComplexArray, BoolArray]:
        """(c, n) start values and which of them belong to the case; proper loops, dead time left out."""
        poles, zeros = self.poles.roots[:, :, 0].T, self.zeros.roots[:, :, 0].T
        orders = np.stack([self.poles.mask.sum(axis=0)[:, 0], self.zeros.mask.sum(axis=0)[:, 0]]).astype(np.int64)
        width = 2 * ((poles.shape[1] + 1) // 2)
        poles, zeros = _paired(poles, orders[0], width), _paired(zeros, orders[1], width)
        filler = 1.5 * np.abs(poles).max(axis=1) + 1.0
        values = np.linalg.eigvals(chain_matrix(poles, zeros, orders, self.gain, filler)).astype(np.complex128)
        # The filler comes out exactly, being decoupled; put it last and cut it off.
        fillers = values == filler[:, None]
        if fillers.any():
            order = np.argsort(fillers, axis=1, kind="stable")
            values = np.take_along_axis(values, order, axis=1)[:, : self.poles.mask.shape[0]]
        place = np.arange(values.shape[1])
        # Symmetric start values could never leave the symmetry: two on the real axis would stay there.
        turn = np.exp(1j * (0.4 + 1.7 * place))
        return values + 1e-9 * (np.abs(values) + 1e-12) * turn, place < orders[0][:, None]


def _paired(roots: ComplexArray, count: IntArray, width: int) -> ComplexArray:
    """(c, width): complex pairs first, then real roots by size, so that sections hold whole pairs."""
    padded = np.zeros((roots.shape[0], width), dtype=np.complex128)
    padded[:, : roots.shape[1]] = roots
    size = np.abs(padded) + np.where(padded.imag != 0.0, 0.0, 1e150)
    size[np.arange(width) >= count[:, None]] = np.inf
    order = np.argsort(size, axis=1, kind="stable")
    return np.take_along_axis(padded, order, axis=1)
