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

from engine.loop.characteristic import Characteristic
from engine.loop.close_roots import exact_closed_loop_roots
from engine.loop.delay_roots import DominantRoots, dominant_roots
from engine.loop.loop_set import LoopSet
from engine.loop.packed import time_scales
from engine.loop.simultaneous import polish_together, with_exact_conjugates
from engine.model.factored import ComplexArray, Factored, FloatArray

IntArray: TypeAlias = NDArray[np.int64]
BoolArray: TypeAlias = NDArray[np.bool_]

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
    dominant: tuple[DominantRoots | None, ...] = ()
    """(c,) how far the roots of a loop with dead time are listed; None for the others."""


def closed_loop_roots(loops: LoopSet) -> ClosedLoopRoots:
    """All closed-loop roots of the loops without dead time, the dominant ones of those with it [rad/s].

    Every root of D(s) + N(s) is listed, those that a zero hides from the loop's response too. A loop whose leading
    coefficients cancel (L(∞) = −1) has fewer roots than poles. An improper loop has as many roots as zeros. With dead
    time and |L(∞)| ≥ 1 endlessly many roots are unstable, and none is listed.
    """
    rational = np.array([loop.dead_time_s == 0.0 for loop in loops.loops])
    lists = [NO_ROOTS] * loops.count
    dominant: list[DominantRoots | None] = [None] * loops.count
    chosen = np.flatnonzero(rational).tolist()
    if chosen:
        for case, each in zip(chosen, rational_roots([loops.loops[case] for case in chosen]), strict=True):
            lists[case] = each
    delayed = [case for case, loop in enumerate(loops.loops) if loop.dead_time_s > 0.0 and _falls_off(loop)]
    if delayed:
        for case, found in zip(delayed, dominant_roots([loops.loops[case] for case in delayed]), strict=True):
            dominant[case] = found
            lists[case] = _sorted_roots(np.concatenate([found.roots, found.roots[found.roots.imag > 0.0].conj()]))
    longest = max((len(each) for each in lists), default=0)
    roots = np.full((loops.count, longest), np.nan + 0.0j)
    for case, each in enumerate(lists):
        roots[case, : len(each)] = each
    count = np.array([len(each) for each in lists], dtype=np.int64)
    return ClosedLoopRoots(roots, count, rational, tuple(dominant))


def _falls_off(loop: Factored) -> bool:
    """Whether |L(∞)| < 1; otherwise dead time makes endlessly many unstable roots, and none dominates."""
    return loop.relative_degree > 0 or (loop.relative_degree == 0 and abs(loop.gain) < 1.0)


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
        roots, error = polish_together(characteristic, starts, live)
        roots = with_exact_conjugates(roots, live)
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
