"""Whether the closed loop is stable, decided twice: from its roots, and from the encirclements of −1.

Policy for the boundary: a loop is said to lie on the stability boundary when a change of L(jω) by one part in
10¹⁰ at some frequency could move a closed-loop pole across the imaginary axis, that is, when at a crossing L comes
that close to −1, or when L hides a pole on the axis. A boundary loop is not stable.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from engine.loop.closed_loop_roots import ClosedLoopRoots
from engine.loop.crossings import Found
from engine.loop.grid import Sampled
from engine.loop.isolation import TURN
from engine.loop.sections import BoolArray, IntArray
from engine.model.factored import FloatArray

BOUNDARY = 1e-10
_HIDDEN = 1e-9
"""A zero this close to a pole (relative) hides it."""
_HIDDEN_MODE = "a hidden mode"
ENDLESS = -1
"""`unstable_poles` of a loop with endlessly many."""


@dataclass(frozen=True, slots=True)
class Stability:
    """The verdict on one case."""

    stable: bool
    sentence: str
    unstable_poles: int
    """Closed-loop poles in the right half plane; −1 for endlessly many."""
    notice: str = ""


def decide_stability(samples: Sampled, found: Found, roots: ClosedLoopRoots) -> tuple[Stability, ...]:
    """The verdict per case."""
    by_roots = np.add.reduce(roots.roots.real > 0, axis=1)
    # A crossing out of all reach (a gain of 1e300) leaves the roots alone to decide.
    alone = roots.complete & ~samples.reach.complete
    counted = np.where(alone, by_roots, encirclement_count(samples, found)).tolist()
    rooted = by_roots.tolist()
    boundary = _boundary_reasons(samples, found)
    hidden = _hidden_modes(samples)
    return tuple(
        _verdict(count, number if complete else None, reason, mode)
        for count, number, complete, reason, mode in zip(
            counted, rooted, roots.complete.tolist(), boundary, hidden, strict=True
        )
    )


def encirclement_count(samples: Sampled, found: Found) -> IntArray:
    """(c,) closed-loop poles in the right half plane from the encirclements of −1, −1 for endlessly many.

    Z = P − 2·(net upward passages of −180° mod 360° while |L| > 1). The phase is continuous, so over each stretch
    with |L| > 1 the net number follows from the phase at its two ends: only the gain crossings are needed. The path
    begins at s = 0+ (0 or −180°, an end on −180° counting half), turns around poles on the axis on
    their right, and closes in the right half plane at infinity.

    Source: H. Nyquist, Regeneration Theory, Bell System Technical Journal 11 (1932).
    """
    loop, nodes, reach = samples.loop, samples.nodes, samples.reach
    cases = len(loop.turn)
    right = (loop.root_weight < 0) & (loop.root.real > 0)
    points = found.gain
    passed = np.bincount(points.case, weights=-points.direction * _levels_below(points.phase), minlength=cases).astype(
        np.float64
    )
    passed -= np.where(nodes.gain[:, 0] >= 0, _levels_below(loop.turn), 0.0)
    improper = np.maximum(-reach.relative_degree, 0.0)
    last = np.rint((reach.phase_infinite / (0.5 * math.pi)) - improper) * (0.5 * math.pi)
    ends_large = nodes.gain[:, -1] >= 0
    passed += np.where(ends_large, _levels_below(last), 0.0)
    count = np.rint(np.sum(right, axis=0) - 2.0 * passed).astype(np.int64)
    return np.where(ends_large & (loop.dead_time_s > 0), ENDLESS, count)


def _levels_below(phase: FloatArray) -> FloatArray:
    """Number of levels −180° + k·360° below a phase, up to a constant; on a level, half of it."""
    turns = (phase + math.pi) / TURN
    nearest = np.rint(turns)
    return np.where(np.abs(turns - nearest) < 1e-12, nearest - 0.5, np.floor(turns))


def _verdict(counted: int, rooted: int | None, boundary: str, hidden: str) -> Stability:
    if boundary and not (boundary.startswith(_HIDDEN_MODE) and (rooted or counted)):
        poles = rooted if rooted is not None else max(counted, 0)
        return Stability(False, f"on the stability boundary: {boundary}", poles)
    if rooted is None and counted == ENDLESS:
        what = "unstable: |L| stays at or above 1 for ω → ∞, so with dead time endlessly many closed-loop poles"
        return Stability(False, what + " lie in the right half plane", ENDLESS)
    poles = counted if rooted is None else max(rooted, counted)
    notice = ""
    if rooted is not None and rooted != counted:
        notice = (
            f"Two ways to count unstable closed-loop poles disagree ({rooted} from the roots, {counted} from the "
            "encirclements of −1): the loop is too close to the boundary to be judged in double precision."
        )
    if poles == 0:
        return Stability(True, "stable", 0, notice)
    if hidden:
        return Stability(False, f"unstable: {hidden}", poles, notice)
    plural = "pole" if poles == 1 else "poles"
    return Stability(False, f"unstable: {poles} closed-loop {plural} in the right half plane", poles, notice)


def _boundary_reasons(samples: Sampled, found: Found) -> list[str]:
    loop, reach = samples.loop, samples.reach
    reasons = [""] * len(loop.turn)
    for points, off in (
        (found.gain, np.abs(np.sin(0.5 * (found.gain.phase + math.pi)))),
        (found.phase, np.abs(found.phase.gain)),
    ):
        for index in np.nonzero(off < BOUNDARY)[0].tolist():
            at = points.omega_rad_s[index]
            reasons[int(points.case[index])] = f"closed-loop poles at ±{at:.6g}j rad/s"
    negative = loop.turn < -1.0
    at_zero = (loop.integrators == 0) & negative & (np.abs(loop.log_gain) < BOUNDARY)
    unit = (reach.relative_degree == 0) & (np.abs(reach.log_high_gain) < BOUNDARY)
    delayed = loop.dead_time_s > 0
    for case in np.nonzero(at_zero | unit)[0].tolist():
        if at_zero[case]:
            reasons[case] = "L(0) = −1 puts a closed-loop pole at 0"
        if unit[case] and delayed[case]:
            reasons[case] = "|L| → 1 for ω → ∞, with dead time a chain of closed-loop poles approaches the axis"
        elif unit[case] and math.cos(reach.phase_infinite[case]) < -0.5:
            reasons[case] = "L(∞) = −1 makes the loop an algebraic one without a solution"
    for case, text in _hidden_on_axis(samples):
        reasons[case] = text
    return reasons


def _hidden_on_axis(samples: Sampled) -> list[tuple[int, str]]:
    loop = samples.loop
    found = []
    origin = np.minimum(loop.origin_zeros, loop.integrators + loop.origin_zeros) > 0
    found += [(case, f"{_HIDDEN_MODE} at 0, where a zero covers a pole") for case in np.nonzero(origin)[0].tolist()]
    axis = (loop.root_weight < 0) & (np.abs(loop.root.real) <= 1e-12 * np.abs(loop.root))
    found += [
        (case, f"{_HIDDEN_MODE} at ±{abs(pole.imag):.6g}j rad/s, where a zero covers a pole")
        for case, pole in _covered(samples, axis)
    ]
    return found


def _hidden_modes(samples: Sampled) -> list[str]:
    """Per case, the sentence on an unstable pole that a zero covers."""
    loop = samples.loop
    reasons = [""] * len(loop.turn)
    for case, pole in _covered(samples, (loop.root_weight < 0) & (loop.root.real > 0)):
        place = f"{pole.real:.6g}" + (f"±{abs(pole.imag):.6g}j" if pole.imag else "")
        reasons[case] = f"hidden unstable mode at {place} rad/s, where a zero covers a pole"
    return reasons


def _covered(samples: Sampled, wanted: BoolArray) -> list[tuple[int, complex]]:
    if not wanted.any():
        return []
    loop = samples.loop
    found = []
    for index, case in zip(*np.nonzero(wanted), strict=True):
        pole = complex(loop.root[index, case])
        zeros = loop.root[loop.root_weight[:, case] > 0, case]
        if np.any(np.abs(zeros - pole) <= _HIDDEN * abs(pole)):
            found.append((int(case), pole))
    return found
