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
from engine.loop.packed import RootTable, packed_models, time_scales
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

    def size(self, from_s: FloatArray) -> FloatArray:
        """(c, 3) Σ|weight| at the instants (c,): bounds how far a stable response strays from its asymptote."""
        decayed = np.exp(np.minimum(self.exponents.real * from_s[:, None], 600.0))
        total: FloatArray = (np.abs(self.weights) * decayed[:, None, :]).sum(axis=2)
        return total

    def quickest_s(self) -> float:
        """1/|exponent| of the fastest mode that is more than a thousandth of its response [s]."""
        size = np.abs(self.weights)
        with np.errstate(invalid="ignore"):
            counts = np.any(size > 1e-3 * size.sum(axis=2, keepdims=True), axis=1)
        fastest = float(np.where(counts, np.abs(self.exponents), 0.0).max(initial=0.0))
        return 1.0 / fastest if fastest > 0.0 else 1.0

    def sample(self, basis: FloatArray, time_s: FloatArray) -> FloatArray:
        """(c, 3, n) values at `time_s` (n,), where `basis` (c, 2m, n) holds Re and Im of e^{exponent·time}."""
        real = np.concatenate([self.weights.real, -self.weights.imag], axis=2)
        summed: FloatArray = real @ basis
        summed += self.offset[:, :, None]
        if self.slope.any():
            summed += self.slope[:, :, None] * time_s
        return summed


@dataclass(frozen=True, eq=False)
class Transfers:
    """The three closed-loop transfer functions in scaled time: gain·numerator/(D + N).

    Without dead time the denominator is Π(s − λ), its leading coefficient taken into the gain.
    """

    scale: FloatArray
    """(c,) [rad/s]; s and the roots are divided by it."""
    gain: FloatArray
    """(c, 3) of the loop, the plant and the compensator; over the leading coefficient of D + N without dead time."""
    parts: tuple[RootTable, RootTable, RootTable, RootTable]
    """Zeros and poles of the compensator, zeros and poles of the plant."""
    roots: ComplexArray
    """(c, n) closed-loop roots, scaled; nan where padded."""
    live: NDArray[np.bool_]
    """(c, n)"""
    excess: NDArray[np.int64]
    """(c, 3) degree of the numerator minus that of D + N; above 0 a step causes an impulse."""
    dead_time_s: FloatArray | None = None
    """(c,) [s], of the plant; None for loops without."""

    @property
    def delay(self) -> FloatArray:
        """(c,) dead time in scaled time."""
        return np.zeros(len(self.scale)) if self.dead_time_s is None else self.dead_time_s * self.scale

    def numerators(self, s: ComplexArray) -> ComplexArray:
        """(c, 3, k) gain·numerator at s (c, k)."""
        zc, pc, zp, pp = (np.multiply.reduce(part.factors(s), axis=0) for part in self.parts)
        if self.dead_time_s is not None:
            # The plant carries the dead time: it is in L and P, not in the effort's numerator.
            zp = zp * np.exp(-s * self.delay[:, None])
        products: ComplexArray = self.gain[:, :, None] * np.stack([zc * zp, zp * pc, zc * pp], axis=1)
        return products

    def denominator(self, s: ComplexArray) -> ComplexArray:
        """(c, k) the denominator at s (c, k)."""
        if self.dead_time_s is not None:
            zc, pc, zp, pp = (np.multiply.reduce(part.factors(s), axis=0) for part in self.parts)
            total: ComplexArray = pc * pp + self.gain[:, :1] * zc * zp * np.exp(-s * self.delay[:, None])
            return total
        factors = np.where(self.live.T[:, :, None], s - self.roots.T[:, :, None], 1.0)
        product: ComplexArray = np.multiply.reduce(factors, axis=0)
        return product

    def slopes(self, s: ComplexArray, place: NDArray[np.int64] | None) -> ComplexArray:
        """(c, k) derivative of the denominator at s (c, k); without dead time s are the roots number `place`."""
        if place is not None:
            gaps = np.where(self.live.T[:, :, None], s - self.roots.T[:, :, None], 1.0)
            gaps[place, np.arange(len(s))[:, None], np.arange(s.shape[1])] = 1.0
            product: ComplexArray = np.multiply.reduce(gaps, axis=0)
            return product
        at = [part.factors(s) for part in self.parts]
        # A root that pole and zero share would make 0·∞ of a derivative that is finite.
        at = [np.where(each == 0.0, 1e-150, each) for each in at]
        zc, pc, zp, pp = (np.multiply.reduce(each, axis=0) for each in at)
        rates = [np.add.reduce(part.mask / each, axis=0) for part, each in zip(self.parts, at, strict=True)]
        n = self.gain[:, :1] * zc * zp * np.exp(-s * self.delay[:, None])
        slope: ComplexArray = pc * pp * (rates[1] + rates[3]) + n * (rates[0] + rates[2] - self.delay[:, None])
        return slope


def transfers_of(loops: LoopSet, roots: ClosedLoopRoots) -> Transfers:
    """Transfer functions of loops all without, or all with dead time, from their parts and closed-loop roots."""
    scale = time_scales(loops.loops)
    plants, compensator = packed_models(loops.plants), packed_models((loops.compensator,))
    parts = (
        compensator.zeros.scaled(scale),
        compensator.poles.scaled(scale),
        plants.zeros.scaled(scale),
        plants.poles.scaled(scale),
    )
    zeros_c, poles_c = compensator.counts[:, 0]
    zeros_p, poles_p = plants.counts
    gain_p = plants.gain * scale ** (zeros_p - poles_p).astype(np.float64)
    gain_c = compensator.gain * scale ** float(zeros_c - poles_c)
    live = np.arange(roots.roots.shape[1]) < roots.count[:, None]
    scaled_roots = roots.roots / scale[:, None]
    dead_time_s = plants.dead_time_s
    orders = np.maximum(zeros_c + zeros_p, poles_c + poles_p) if dead_time_s.any() else roots.count
    transfers = Transfers(
        scale,
        np.stack([gain_c * gain_p, gain_p, gain_c], axis=1),
        parts,
        scaled_roots,
        live,
        np.stack([zeros_c + zeros_p, zeros_p + poles_c, zeros_c + poles_p], axis=1) - orders[:, None],
        dead_time_s if dead_time_s.any() else None,
    )
    if transfers.dead_time_s is not None:
        return transfers
    lead = _leading(gain_c * gain_p, zeros_c + zeros_p, poles_c + poles_p, roots.count)
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
    """Responses to amplitude/s^integrations per row, from simple roots; with dead time for as late as they suffice.

    Parameters
    ----------
    amplitudes : (3,) of the command, load and (again) command
    integrations : (3,) 1 for a step, 2 for a ramp
    """
    upper, place, present = _upper_half(transfers)
    with np.errstate(all="ignore"):
        points = np.concatenate([upper, np.zeros((len(upper), 1))], axis=1)
        at = transfers.numerators(points) * amplitudes[:, None]
        slopes = transfers.slopes(upper, place if transfers.dead_time_s is None else None)
        step = at[:, :, :-1] / (slopes * upper)[:, None, :]
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
    origin = np.zeros((len(final), 1), dtype=np.complex128)
    n, n_slope, d_slope = _numerators_at_zero(transfers)
    with np.errstate(all="ignore"):
        whole = transfers.denominator(origin).real
        if transfers.dead_time_s is None:
            fall = np.add.reduce(np.where(transfers.live, -1.0 / transfers.roots, 0.0), axis=1).real[:, None]
        else:
            delay = transfers.delay[:, None]
            n_slope = n_slope - delay * n * np.array([1.0, 1.0, 0.0])
            fall = (d_slope + n_slope[:, :1]) / whole
        slope = n_slope * amplitudes / whole - final * fall
    scaled: FloatArray = slope / transfers.scale[:, None]
    return scaled


def _numerators_at_zero(transfers: Transfers) -> tuple[FloatArray, FloatArray, FloatArray]:
    """(c, 3) gain·numerators at 0 and their derivatives without dead time, and (c, 1) the derivative of D."""
    values, slopes = zip(*(_product_and_slope(part) for part in transfers.parts), strict=True)
    pairs = ((0, 2), (2, 1), (0, 3))
    products = transfers.gain * np.stack([values[a] * values[b] for a, b in pairs], axis=1)
    derivatives = transfers.gain * np.stack([values[a] * slopes[b] + slopes[a] * values[b] for a, b in pairs], axis=1)
    return products, derivatives, (values[1] * slopes[3] + slopes[1] * values[3])[:, None]


def _product_and_slope(table: RootTable) -> tuple[FloatArray, FloatArray]:
    """(c,) Π(0 − root) and its derivative."""
    at_origin = (table.roots == 0.0) & (table.mask > 0.0)
    others = np.where(at_origin, 1.0, -table.roots)
    multiplicity = np.count_nonzero(at_origin, axis=0)[:, 0]
    rest = np.multiply.reduce(others, axis=0)[:, 0].real
    log_slope = np.add.reduce(np.where(at_origin, 0.0, table.mask / others), axis=0)[:, 0].real
    value = np.where(multiplicity == 0, rest, 0.0)
    return value, np.where(multiplicity == 0, rest * log_slope, np.where(multiplicity == 1, rest, 0.0))
