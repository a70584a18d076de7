"""The closed-loop roots: all roots of D(s) + N(s) for L = N/D, with nothing cancelled.

Start values come from a chain of sections (`section_chain`). They are then polished together on the factored
form by the Ehrlich–Aberth iteration (L. W. Ehrlich 1967; O. Aberth 1973), whose corrections keep two start values
from running into one root. Evaluating D and N as products keeps each of them accurate to a few ulps, however wide the
spread of corners, so a simple root ends within a few ulps of its condition. Roots that are close to each other
beyond what double precision resolves are found exactly (`close_roots`).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TypeAlias

import numpy as np
from numpy.typing import NDArray

from engine.loop.close_roots import exact_closed_loop_roots
from engine.loop.loop_set import LoopSet
from engine.loop.packed import RootTable, root_table, time_scales
from engine.loop.section_chain import chain_matrix
from engine.model.factored import ComplexArray, Factored, FloatArray

IntArray: TypeAlias = NDArray[np.int64]
BoolArray: TypeAlias = NDArray[np.bool_]

EPSILON = float(np.finfo(np.float64).eps)
MOST_ITERATIONS = 60
# |1 + L(∞)| below which the loop is taken for an algebraic one: rounding of the gain alone reaches this.
ALGEBRAIC = 1e-13
# A loop with a root less certain than this, relative to its size, is solved exactly.
UNCERTAIN = 1e-10
NO_ROOTS: ComplexArray = np.empty(0, dtype=np.complex128)


@dataclass(frozen=True, eq=False)
class ClosedLoopRoots:
    """Roots of the characteristic equation of each case."""

    roots: ComplexArray
    """(c, n) [rad/s], sorted by size, each complex root followed by its exact conjugate; nan where padded."""
    count: IntArray
    """(c,) number of roots listed."""
    complete: BoolArray
    """(c,) True: all roots there are; False: the dominant ones of a loop with dead time."""


def closed_loop_roots(loops: LoopSet) -> ClosedLoopRoots:
    """All closed-loop roots of the loops without dead time, the dominant ones of those with it [rad/s].

    Every root of D(s) + N(s) is listed, those that a zero hides from the loop's response too. A loop whose leading
    coefficients cancel (L(∞) = −1) has fewer roots than poles. An improper loop has as many roots as zeros.
    """
    rational = np.array([loop.dead_time_s == 0.0 for loop in loops.loops])
    lists = [NO_ROOTS] * loops.count
    chosen = np.flatnonzero(rational).tolist()
    for case, each in zip(chosen, rational_roots([loops.loops[case] for case in chosen]), strict=True):
        lists[case] = each
    longest = max((len(each) for each in lists), default=0)
    roots = np.full((loops.count, longest), np.nan + 0.0j)
    for case, each in enumerate(lists):
        roots[case, : len(each)] = each
    count = np.array([len(each) for each in lists], dtype=np.int64)
    return ClosedLoopRoots(roots, count, rational)


def rational_roots(loops: Sequence[Factored]) -> list[ComplexArray]:
    """All roots of D + N per loop, dead time left out, sorted by size with exact conjugates adjacent [rad/s]."""
    scale = time_scales(loops)
    split = [_without_common(loop) for loop in loops]
    found = _proper_roots([_as_proper(rest) for _, rest in split], scale)
    return [
        _sorted_roots(np.concatenate([common, each])) if len(common) else each
        for (common, _), each in zip(split, found, strict=True)
    ]


def _without_common(loop: Factored) -> tuple[ComplexArray, Factored]:
    """Roots that pole and zero share exactly are closed-loop roots as they stand: set them aside."""
    poles, zeros, common = loop.poles.tolist(), [], []
    if set(poles).isdisjoint(loop.zeros.tolist()):
        return NO_ROOTS, loop
    for zero in loop.zeros.tolist():
        if zero in poles:
            poles.remove(zero)
            common.append(zero)
        else:
            zeros.append(zero)
    rest = Factored(loop.gain, np.array(zeros, dtype=np.complex128), np.array(poles, dtype=np.complex128))
    return np.array(common, dtype=np.complex128), rest


def _as_proper(loop: Factored) -> Factored:
    """1 + L and 1 + 1/L vanish at the same places: turn an improper loop round."""
    if loop.relative_degree >= 0:
        return loop
    return Factored(1.0 / loop.gain, loop.poles, loop.zeros)


def _proper_roots(loops: Sequence[Factored], scale: FloatArray) -> list[ComplexArray]:
    """Roots of D + N of proper loops without common roots."""
    found: list[ComplexArray | None] = [None] * len(loops)
    plain = [case for case, loop in enumerate(loops) if len(loop.poles) and not is_algebraic(loop)]
    for case, loop in enumerate(loops):
        if case not in plain:
            found[case] = exact_closed_loop_roots(loop)
    if plain:
        chosen, scales = [loops[case] for case in plain], scale[plain]
        starts, live = (characteristic := Characteristic.of(chosen, scales)).starts()
        roots, error = _aberth(characteristic, starts, live)
        roots = _conjugate(roots, live)
        with np.errstate(invalid="ignore"):
            sure = np.logical_and.reduce((error <= UNCERTAIN * np.abs(roots)) | ~live, axis=1)
        roots = _in_order(roots * scales[:, None], live)
        for row, case in enumerate(plain):
            exact = None if sure[row] else exact_closed_loop_roots(chosen[row])
            found[case] = roots[row, : len(chosen[row].poles)] if exact is None else exact
    return [NO_ROOTS if each is None else each for each in found]


def is_algebraic(loop: Factored) -> bool:
    """Whether 1 + L(∞) vanishes: the loop then has no unique solution at the instant of a step."""
    return loop.relative_degree == 0 and loop.dead_time_s == 0.0 and abs(1.0 + loop.gain) <= ALGEBRAIC


@dataclass(frozen=True, eq=False)
class Characteristic:
    """D(s) + N(s) of proper loops, in scaled time."""

    poles: RootTable
    zeros: RootTable
    gain: FloatArray
    """(c,) gain in scaled time."""

    @classmethod
    def of(cls, loops: Sequence[Factored], scale: FloatArray) -> Characteristic:
        """The characteristic functions with s divided by `scale` (c,)."""
        degree = np.array([loop.relative_degree for loop in loops])
        gain = np.array([loop.gain for loop in loops]) * scale ** (-degree.astype(np.float64))
        poles = root_table([loop.poles for loop in loops]).scaled(scale)
        zeros = root_table([loop.zeros for loop in loops]).scaled(scale)
        return cls(poles, zeros, gain)

    def newton(self, s: ComplexArray) -> tuple[ComplexArray, ComplexArray, FloatArray]:
        """p, p' and |D| + |N| at s (c, n)."""
        at_poles, at_zeros = self.poles.factors(s), self.zeros.factors(s)
        # A start value exactly on a pole would make 0·∞ of a derivative that is finite.
        if not (at_poles.all() and at_zeros.all()):
            at_poles = np.where(at_poles == 0.0, 1e-200, at_poles)
            at_zeros = np.where(at_zeros == 0.0, 1e-200, at_zeros)
        d = np.multiply.reduce(at_poles, axis=0)
        n = np.multiply.reduce(at_zeros, axis=0) * self.gain[:, None]
        slope = d * np.add.reduce(self.poles.mask / at_poles, axis=0)
        slope = slope + n * np.add.reduce(self.zeros.mask / at_zeros, axis=0)
        return d + n, slope, np.abs(d) + np.abs(n)

    def starts(self) -> tuple[ComplexArray, BoolArray]:
        """(c, n) start values and which of them belong to the case."""
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


def _aberth(p: Characteristic, s: ComplexArray, live: BoolArray) -> tuple[ComplexArray, FloatArray]:
    """Polished roots and a bound of the error that rounding leaves in each, both (c, n)."""
    factors = p.poles.mask.shape[0] + p.zeros.mask.shape[0] + 2
    own = np.eye(s.shape[1])[:, None, :]
    mutual = (live.T[:, :, None] & live[None, :, :]) * (1.0 - own)
    settled = ~live
    error = np.zeros(s.shape)
    with np.errstate(all="ignore"):
        for _ in range(MOST_ITERATIONS):
            value, slope, size = p.newton(s)
            # Σ 1/(s_k − s_i) over the others; two in one place give nan, and the loop goes the exact way.
            repulsion = np.add.reduce(mutual / (s.T[:, :, None] - s + own), axis=0)
            move = value / (slope + value * repulsion)
            noise = 2.0 * EPSILON * factors * size / np.abs(slope)
            error = np.where(settled, error, noise)
            s = np.where(settled, s, s - move)
            reached = np.abs(move) <= np.maximum(4.0 * EPSILON * np.abs(s), 0.1 * noise)
            settled = settled | reached
            if settled.all():
                break
    return s, np.where(settled, error, np.inf)


def _conjugate(roots: ComplexArray, live: BoolArray) -> ComplexArray:
    """The same roots with exact conjugates; a root that is its own partner becomes real."""
    with np.errstate(all="ignore"):
        distance = np.abs(roots[:, :, None] - roots.conj()[:, None, :])
    distance[~(live[:, :, None] & live[:, None, :])] = np.inf
    partner = distance.argmin(axis=2)
    mutual = np.take_along_axis(partner, partner, axis=1) == np.arange(roots.shape[1])
    together = 0.5 * (roots + np.take_along_axis(roots, partner, axis=1).conj())
    # A cluster whose members choose each other in a ring is left to `close_roots`.
    return np.where(mutual | ~live, together, np.nan)


def _in_order(roots: ComplexArray, live: BoolArray) -> ComplexArray:
    """(c, n): each row as `_sorted_roots` would list it, what is not live last; no pair occurs twice."""
    size = np.where(live, np.abs(roots), np.inf)
    order = np.lexsort((-roots.imag, np.abs(roots.imag), roots.real, size), axis=1)
    return np.take_along_axis(roots, order, axis=1)


def _sorted_roots(roots: ComplexArray) -> ComplexArray:
    """By size, each complex root of the upper half plane followed by its exact conjugate."""
    upper = roots[roots.imag >= 0.0]
    upper = upper[np.lexsort((upper.real, np.abs(upper)))]
    twice = np.where(upper.imag > 0.0, 2, 1)
    listed = np.repeat(upper, twice)
    second = np.cumsum(twice)[upper.imag > 0.0] - 1
    listed[second] = listed[second].conj()
    return listed
