"""Closed-loop responses as sums over the closed-loop roots: y(t) = offset + slope·t + Re Σ weight·e^{exponent·t}.

The weights are residues in factored form, N_P·D_C/χ′ and the like with χ′ = lead·Π(λ_i − λ_k): a root that a zero
hides gets the weight 0 it deserves, and nothing is ever cancelled by hand.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.loop.closed_loop_roots import ClosedLoopRoots
from engine.loop.loop_set import LoopSet
from engine.loop.packed import RootTable, root_table, time_scales
from engine.model.factored import ComplexArray, FloatArray

COMMAND, LOAD, EFFORT = 0, 1, 2
"""Rows of every response array: output to command, output to load at the plant input, effort to command."""


@dataclass(frozen=True, eq=False)
class ModalSums:
    """Responses of c cases, three rows each, for t > 0."""

    exponents: ComplexArray
    """(c, m) [rad/s]; of each conjugate pair the upper one; −1 where padded."""
    weights: ComplexArray
    """(c, 3, m); those of a pair already count for both, those of padding are 0."""
    offset: FloatArray
    """(c, 3) the final value of a stable step response."""
    slope: FloatArray
    """(c, 3) [1/s]; not 0 for ramps only."""

    def of(self, cases: NDArray[np.int64]) -> ModalSums:
        """The sums of some of the cases."""
        if len(cases) == len(self.offset):
            return self
        return ModalSums(self.exponents[cases], self.weights[cases], self.offset[cases], self.slope[cases])

    def size(self) -> FloatArray:
        """(c, 3) Σ|weight|, which bounds how far a stable response strays from its asymptote."""
        total: FloatArray = np.abs(self.weights).sum(axis=2)
        return total

    def quickest_s(self) -> float:
        """1/|exponent| of the fastest mode that is more than a thousandth of its response [s]."""
        size = np.abs(self.weights)
        with np.errstate(invalid="ignore"):
            counts = np.any(size > 1e-3 * size.sum(axis=2, keepdims=True), axis=1)
        fastest = float(np.where(counts, np.abs(self.exponents), 0.0).max(initial=0.0))
        return 1.0 / fastest if fastest > 0.0 else 1.0

    def sample(self, basis: ComplexArray, time_s: FloatArray) -> FloatArray:
        """(c, 3, n) values at `time_s` (n,), where `basis` (c, m, n) is e^{exponent·time}."""
        real = np.concatenate([self.weights.real, -self.weights.imag], axis=2)
        parts = np.concatenate([basis.real, basis.imag], axis=1)
        steady = self.offset[:, :, None] + self.slope[:, :, None] * time_s
        summed: FloatArray = real @ parts + steady
        return summed


@dataclass(frozen=True, eq=False)
class Transfers:
    """The three closed-loop transfer functions in scaled time: gain·numerator/(lead·Π(s − λ))."""

    scale: FloatArray
    """(c,) [rad/s]; s and the roots are divided by it."""
    gain: FloatArray
    """(c, 3) over the leading coefficient of D + N."""
    parts: tuple[RootTable, RootTable, RootTable, RootTable]
    """Zeros and poles of the compensator, zeros and poles of the plant."""
    roots: ComplexArray
    """(c, n) closed-loop roots, scaled; nan where padded."""
    live: NDArray[np.bool_]
    """(c, n)"""
    excess: NDArray[np.int64]
    """(c, 3) degree of the numerator minus that of D + N; above 0 a step causes an impulse."""

    def numerators(self, s: ComplexArray) -> ComplexArray:
        """(c, 3, k) gain·numerator at s (c, k)."""
        zc, pc, zp, pp = (np.multiply.reduce(part.factors(s), axis=0) for part in self.parts)
        products: ComplexArray = self.gain[:, :, None] * np.stack([zc * zp, zp * pc, zc * pp], axis=1)
        return products

    def denominator(self, s: ComplexArray) -> ComplexArray:
        """(c, k) Π(s − λ) at s (c, k)."""
        factors = np.where(self.live.T[:, :, None], s - self.roots.T[:, :, None], 1.0)
        product: ComplexArray = np.multiply.reduce(factors, axis=0)
        return product


def transfers_of(loops: LoopSet, roots: ClosedLoopRoots, scale: FloatArray | None = None) -> Transfers:
    """Transfer functions from the loop parts and the closed-loop roots; dead time left out."""
    scale = time_scales(loops.loops) if scale is None else scale
    plants, compensator = loops.plants, loops.compensator
    parts = tuple(
        root_table(lists).scaled(scale)
        for lists in (
            [compensator.zeros] * loops.count,
            [compensator.poles] * loops.count,
            [plant.zeros for plant in plants],
            [plant.poles for plant in plants],
        )
    )
    zeros_c, poles_c = len(compensator.zeros), len(compensator.poles)
    counts = np.array([(len(plant.zeros), len(plant.poles)) for plant in plants])
    zeros_p, poles_p = counts[:, 0], counts[:, 1]
    gain_p = np.array([plant.gain for plant in plants]) * scale ** (zeros_p - poles_p).astype(np.float64)
    gain_c = compensator.gain * scale ** float(zeros_c - poles_c)
    live = np.arange(roots.roots.shape[1]) < roots.count[:, None]
    scaled_roots = roots.roots / scale[:, None]
    lead = _leading(gain_c * gain_p, zeros_c + zeros_p, poles_c + poles_p, roots.count)
    transfers = Transfers(
        scale,
        np.stack([gain_c * gain_p, gain_p, np.broadcast_to(gain_c, scale.shape)], axis=1),
        (parts[0], parts[1], parts[2], parts[3]),
        scaled_roots,
        live,
        np.stack([zeros_c + zeros_p, zeros_p + poles_c, zeros_c + poles_p], axis=1) - roots.count[:, None],
    )
    if np.isnan(lead).any():
        lead = np.where(np.isnan(lead), _leading_of_algebraic(transfers), lead)
    return Transfers(scale, transfers.gain / lead[:, None], transfers.parts, scaled_roots, live, transfers.excess)


def _leading(
    gain: FloatArray, zeros: NDArray[np.int64], poles: NDArray[np.int64], count: NDArray[np.int64]
) -> FloatArray:
    """Leading coefficient of D + N; nan where the leading ones cancel."""
    lead = np.where(zeros < poles, 1.0, np.where(zeros > poles, gain, 1.0 + gain))
    return np.where(count < np.maximum(zeros, poles), np.nan, lead)


def _leading_of_algebraic(transfers: Transfers) -> FloatArray:
    """(D + N)/Π(s − λ) away from all roots: the coefficient that is left when the leading ones cancel."""
    s = np.full((len(transfers.scale), 1), 3.0 + 0.0j)
    zc, pc, zp, pp = (np.multiply.reduce(part.factors(s), axis=0) for part in transfers.parts)
    total = pc * pp + transfers.gain[:, :1] * zc * zp
    ratio: FloatArray = (total / transfers.denominator(s)).real[:, 0]
    return ratio


def modal_sums(transfers: Transfers, amplitudes: FloatArray, integrations: NDArray[np.int64]) -> ModalSums:
    """Responses to amplitude/s^integrations per row, from simple roots.

    Parameters
    ----------
    amplitudes : (3,) of the command, load and (again) command
    integrations : (3,) 1 for a step, 2 for a ramp
    """
    upper, place, present = _upper_half(transfers)
    cases = np.arange(len(transfers.scale))[:, None]
    gaps = np.where(transfers.live.T[:, :, None], upper - transfers.roots.T[:, :, None], 1.0)
    gaps[place, cases, np.arange(upper.shape[1])] = 1.0
    with np.errstate(all="ignore"):
        points = np.concatenate([upper, np.zeros((len(upper), 1))], axis=1)
        at = transfers.numerators(points) * amplitudes[:, None]
        step = at[:, :, :-1] / (np.multiply.reduce(gaps, axis=0) * upper)[:, None, :]
        final = (at[:, :, -1] / transfers.denominator(points[:, -1:])).real
        twice = np.where(upper.imag > 0.0, 2.0, 1.0)
        weights = np.where(present[:, None, :], step * twice[:, None, :], 0.0)
        exponents = np.where(present, upper * transfers.scale[:, None], -1.0)
        ramp = integrations[:, None] == 2
        if ramp.any():
            weights = np.where(ramp, weights / exponents[:, None, :], weights)
    if not ramp.any():
        return ModalSums(exponents, weights, final, np.zeros(final.shape))
    is_ramp = integrations == 2
    offset = np.where(is_ramp, _slope_at_zero(transfers, amplitudes, final), final)
    return ModalSums(exponents, weights, offset, np.where(is_ramp, final, 0.0))


def _upper_half(transfers: Transfers) -> tuple[ComplexArray, NDArray[np.int64], NDArray[np.bool_]]:
    """(c, m) roots with imaginary part ≥ 0, −1 where padded; where they stand in the list; which are there."""
    wanted = transfers.live & (transfers.roots.imag >= 0.0)
    most = int(wanted.sum(axis=1).max(initial=0))
    place = np.argsort(~wanted, axis=1, kind="stable")[:, :most]
    present = np.take_along_axis(wanted, place, axis=1)
    return np.where(present, np.take_along_axis(transfers.roots, place, axis=1), -1.0), place, present


def _slope_at_zero(transfers: Transfers, amplitudes: FloatArray, final: FloatArray) -> FloatArray:
    """(c, 3) dG/ds at 0 [s], times the amplitude: where the ramp response's asymptote crosses t = 0."""
    zero_sum = [
        (part.mask * np.where(part.roots == 0.0, 0.0, -1.0 / np.where(part.roots == 0.0, 1.0, part.roots))).sum(axis=0)
        for part in transfers.parts
    ]
    at_origin = [np.count_nonzero((part.roots == 0.0) & (part.mask > 0.0), axis=0)[:, 0] for part in transfers.parts]
    zc, pc, zp, pp = (each[:, 0] for each in zero_sum)
    own = np.stack([zc + zp, zp + pc, zc + pp], axis=1)
    nc, dc, np_, dp = at_origin
    multiplicity = np.stack([nc + np_, np_ + dc, nc + dp], axis=1)
    with np.errstate(all="ignore"):
        poles = np.add.reduce(np.where(transfers.live, -1.0 / transfers.roots, 0.0), axis=1)
        log_derivative = (own - poles[:, None]).real
        # One zero at the origin: the derivative is the rest of the numerator there.
        rest = [
            np.multiply.reduce(np.where((part.roots == 0.0) & (part.mask > 0.0), 1.0, -part.roots), axis=0)[:, 0]
            for part in transfers.parts
        ]
        single = transfers.gain * np.stack([rest[0] * rest[2], rest[2] * rest[1], rest[0] * rest[3]], axis=1)
        single = (single / transfers.denominator(np.zeros((len(final), 1), dtype=np.complex128))).real
    slope = np.where(multiplicity == 0, final * log_derivative, np.where(multiplicity == 1, single * amplitudes, 0.0))
    scaled: FloatArray = slope / transfers.scale[:, None]
    return scaled
