"""The first few dead times of a response, exactly: the method of steps.

Between the j-th and the next dead time only j round trips count:
T/s = Σ (−1)^{k+1} L₀^k e^{−kθs}/s and so on. Each term is a sum over the open-loop poles, repeated up to k-fold. The
part of each group of poles is an integral round it; with 64 nodes on a circle the trapezoidal rule gives that integral
to rounding (Trefethen & Weideman, SIAM Review 56, 2014), and its expansion about the circle's centre c turns it into
e^{cτ} times a polynomial in τ/θ, τ the time since the last dead time.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise
from math import lgamma

import numpy as np
from numpy.typing import NDArray

from engine.loop.loop_set import LoopSet
from engine.loop.modal import Transfers
from engine.loop.rings import NODES, Rings, rings_round
from engine.model.factored import ComplexArray, FloatArray

# Terms of the polynomials: as many as the widest circle needs, radius^q/q! being what is left out.
DEGREES = (24, 36, 56)
LEFT_OUT = 1e-13
# Link distances tried, in dead-time radians; the first whose rounding stays below this share of the peak is taken.
LINKS = (0.5, 0.3, 0.8, 2.0)
ROUNDING = 1e-10
# e-folds to the right over all dead times that a circle may have.
MOST_GROWTH = 14.0


@dataclass(frozen=True, eq=False)
class DelayedSteps:
    """Responses over the first dead times: Re Σ_g e^{rate·τ}·Σ_q coefficient·(τ/θ)^q in each of them."""

    dead_time_s: FloatArray
    """(c,)"""
    edges_s: FloatArray
    """(c, j + 1) 0, θ, … jθ"""
    rates: ComplexArray
    """(c, g) [rad/s]; 0 where padded."""
    coefficients: ComplexArray
    """(c, j, 3, g, q)"""

    def of(self, cases: NDArray[np.int64]) -> DelayedSteps:
        """Those of some of the cases."""
        return DelayedSteps(self.dead_time_s[cases], self.edges_s[cases], self.rates[cases], self.coefficients[cases])

    def over(self, late: FloatArray, time_s: FloatArray) -> FloatArray:
        """(c, 3, n) `late`, with the first dead times at instants `time_s` (n,) in its place."""
        curves = late.copy()
        for case, edges in enumerate(self.edges_s):
            starts = np.searchsorted(time_s, edges)
            for step, (first, last) in enumerate(pairwise(starts.tolist())):
                if last > first:
                    since = time_s[first:last] - edges[step]
                    curves[case, :, first:last] = self.segment(case, step, since)
        return curves

    def slopes(self) -> DelayedSteps:
        """The derivatives."""
        lowered = np.zeros_like(self.coefficients)
        lowered[..., :-1] = self.coefficients[..., 1:] * np.arange(1, self.coefficients.shape[-1])
        rates, theta = self.rates[:, None, None, :, None], self.dead_time_s[:, None, None, None, None]
        return DelayedSteps(self.dead_time_s, self.edges_s, self.rates, rates * self.coefficients + lowered / theta)

    def at_shares(self, shares: FloatArray) -> FloatArray:
        """(c, 3, j·n) values at these shares (n,) of every dead time."""
        cases, delays, rows, groups, terms = self.coefficients.shape
        powers = powers_of(shares, terms).T
        flat = self.coefficients.reshape(-1, terms)
        growth = np.exp(self.rates[:, :, None] * self.dead_time_s[:, None, None] * shares)[:, None, None]
        real = (flat.real @ powers).reshape(cases, delays, rows, groups, -1) * growth.real
        real -= (flat.imag @ powers).reshape(cases, delays, rows, groups, -1) * growth.imag
        values: FloatArray = real.sum(axis=3).transpose(0, 2, 1, 3).reshape(cases, rows, -1)
        return values

    def segment(self, case: int, step: int, since_s: FloatArray) -> FloatArray:
        """(3, n) values in one dead time of one case, `since_s` (n,) after its beginning."""
        powers = powers_of(since_s / self.dead_time_s[case], self.coefficients.shape[-1]).T
        growth = np.exp(self.rates[case][:, None] * since_s)
        parts = (self.coefficients[case, step] @ powers) * growth
        total: FloatArray = parts.real.sum(axis=1)
        return total


def powers_of(share: FloatArray, terms: int) -> FloatArray:
    """(n, q) share^0 … share^(q−1), by multiplying on: a call of pow for each would cost ten times that."""
    powers: FloatArray = np.vander(share, terms, increasing=True)
    return powers


def delayed_steps(
    loops: LoopSet,
    transfers: Transfers,
    amplitudes: FloatArray,
    integrations: NDArray[np.int64],
    delays: int,
) -> DelayedSteps:
    """The first `delays` dead times of loops all of which have dead time."""
    best: DelayedSteps | None = None
    least = np.full(loops.count, np.inf)
    for link in LINKS:
        rings = [_rings(loops, case, link) for case in range(loops.count)]
        steps, rounding = _steps(transfers, rings, amplitudes, integrations, delays)
        best = steps if best is None else _better(best, steps, rounding < least)
        least = np.minimum(least, rounding)
        if np.all(least <= ROUNDING):
            break
    if best is None:
        raise ValueError("no ring distances to try")
    return best


def _rings(loops: LoopSet, case: int, link: float) -> Rings:
    loop = loops.loops[case]
    return rings_round(loop.poles.tobytes(), loop.dead_time_s, link)


def _better(old: DelayedSteps, new: DelayedSteps, take: NDArray[np.bool_]) -> DelayedSteps:
    """Case by case the one or the other."""
    width = max(old.rates.shape[1], new.rates.shape[1])
    (old_rates, old_c), (new_rates, new_c) = (_widened(each, width) for each in (old, new))
    return DelayedSteps(
        old.dead_time_s,
        old.edges_s,
        np.where(take[:, None], new_rates, old_rates),
        np.where(take[:, None, None, None, None], new_c, old_c),
    )


def _widened(steps: DelayedSteps, width: int) -> tuple[ComplexArray, ComplexArray]:
    more = width - steps.rates.shape[1]
    terms = DEGREES[-1] - steps.coefficients.shape[-1]
    return (
        np.pad(steps.rates, ((0, 0), (0, more))),
        np.pad(steps.coefficients, ((0, 0), (0, 0), (0, 0), (0, more), (0, terms))),
    )


def _steps(
    transfers: Transfers,
    rings: list[Rings],
    amplitudes: FloatArray,
    integrations: NDArray[np.int64],
    delays: int,
) -> tuple[DelayedSteps, FloatArray]:
    """The steps from given circles, and (c,) the share of the response that rounding takes at worst."""
    theta = np.ones(len(rings)) if transfers.dead_time_s is None else transfers.dead_time_s
    count, width = len(rings), max(len(each.centres) for each in rings)
    centres = np.zeros((count, width), dtype=np.complex128)
    # Where padded, a circle far from everything, whose weight is set to 0.
    radii = np.zeros((count, width))
    for case, each in enumerate(rings):
        centres[case, : len(each.centres)] = each.centres
        radii[case, : len(each.radii)] = each.radii
    arms = radii[:, :, None] * np.exp(2j * np.pi * (np.arange(NODES) + 0.5) / NODES)
    weight = np.where(radii > 0.0, np.where(centres.imag > 0.0, 2.0, 1.0), 0.0) / NODES
    scaled_theta = theta * transfers.scale
    turns = np.where(radii[:, :, None] > 0.0, centres[:, :, None] + arms, 1.0 + 0.0j)
    s = np.asarray((turns / scaled_theta[:, None, None]).reshape(count, width * NODES), dtype=np.complex128)
    around = (arms * weight[:, :, None]).reshape(count, width * NODES) / scaled_theta[:, None]
    edges = theta[:, None] * np.arange(delays + 1)
    # An unstable pole many time constants per dead time overflows; what it drives has left every range by then.
    with np.errstate(all="ignore"):
        trips = _round_trips(transfers, s, scaled_theta, amplitudes, integrations, delays)
        values = np.where(around[:, None, None, :] == 0.0, 0.0, trips * around[:, None, None, :])
        growth = np.exp(np.maximum(s.real * scaled_theta[:, None], 0.0))
        spread = (np.abs(values) * growth[:, None, None, :]).max(axis=(1, 3))
        series = _expanded(values.reshape(count, delays, 3, width, NODES), radii)
        steps = DelayedSteps(theta, edges, centres / theta[:, None], series)
        peak = np.abs(steps.at_shares(np.linspace(0.0, 1.0, 5))).max(axis=2)
        share = np.where(peak > 0.0, spread * 1e-15 / peak, 0.0)
    share = np.nan_to_num(share, nan=np.inf).max(axis=1)
    # Circles that reach far to the right drown the response, and with it the peak just taken.
    reach = np.where(radii > 0.0, centres.real + radii, 0.0).max(axis=1) * (delays - 1)
    far = np.exp(np.minimum(reach, 300.0)) * np.minimum(share, 1e150)
    return steps, np.where(reach > MOST_GROWTH, far, share)


def _round_trips(
    transfers: Transfers,
    s: ComplexArray,
    theta: FloatArray,
    amplitudes: FloatArray,
    integrations: NDArray[np.int64],
    delays: int,
) -> ComplexArray:
    """(c, j, 3, k) the transform of each response in the j-th dead time, moved to its beginning."""
    zc, pc, zp, pp = (np.multiply.reduce(part.factors(s), axis=0) for part in transfers.parts)
    gain_l, gain_p, gain_c = (transfers.gain[:, row, None] for row in range(3))
    with np.errstate(all="ignore"):
        plant, controller = gain_p * zp / pp, gain_c * zc / pc
        loop = gain_l * (zc / pc) * (zp / pp)
    ahead = np.exp(s * theta[:, None])
    sums = [np.ones_like(s)]
    power = np.ones_like(s)
    for _ in range(1, delays):
        power = -power * loop
        sums.append(ahead * sums[-1] + power)
    nothing = np.zeros_like(s)
    stacked = np.stack(
        [
            np.stack([loop * before, plant * before, controller * now], axis=1)
            for before, now in zip([nothing, *sums], sums, strict=False)
        ],
        axis=1,
    )
    unscaled = s * transfers.scale[:, None]
    once = amplitudes[:, None] / s[:, None, :]
    driven: ComplexArray = stacked * np.where(integrations[:, None] == 2, once / unscaled[:, None, :], once)[:, None]
    return driven


def _expanded(values: ComplexArray, radii: FloatArray) -> ComplexArray:
    """(c, j, 3, g, q) coefficients of (τ/θ)^q from the values on circles (c, j, 3, g, NODES)."""
    # Σ_k value_k·e^{iqφ_k} for all q at once: a discrete Fourier transform, turned by the half step of the nodes.
    widest = float(radii.max())
    degree = next((q for q in DEGREES if q * np.log(widest) - lgamma(q + 1.0) < np.log(LEFT_OUT)), DEGREES[-1])
    moments = np.fft.ifft(values, axis=-1)[..., :degree] * NODES
    order = np.arange(degree)
    turned = moments * np.exp(1j * np.pi * order / NODES)
    factorial = np.cumprod(np.concatenate([[1.0], order[1:].astype(np.float64)]))
    scale = radii[:, :, None] ** order / factorial
    expanded: ComplexArray = turned * scale[:, None, None]
    return expanded
