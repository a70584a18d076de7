"""The endless chain of roots of a loop with dead time that does not fall off: 0 < |L(∞)| < 1.

Such a response jumps at every dead time for ever. Its roots follow λ = μ + iω_k + δ(1/iω_k), with μ = ln|L(∞)|/θ and
ω_k evenly spaced. The roots up to Ω are listed; what is above is summed in closed form: its terms are expanded in
powers of 1/(iω_k), and Σ_k e^{iω_k t}/(iω_k)^m over all k is, between two dead times, a Bernoulli polynomial of the
time since the last one where L(∞) < 0, and an Euler polynomial where L(∞) > 0 (DLMF 24.8.3 to 24.8.5).
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.model.factored import ComplexArray, Factored, FloatArray

MOST_TERMS = 8
FEWEST_TERMS = 3
# Share of the response at which the expansion may be cut off, and by which its low terms may exceed the sum.
CUT_OFF = 3e-10
LARGEST_EXCESS = 1e6
# |L(∞)| below which the chain has died out when the sum over roots begins.
SOON_FAINT = 0.01
MOST_STEPS = 150
MOST_LINKS = 240
LOWEST_ORDER = -2


@dataclass(frozen=True)
class ChainPlan:
    """How the chain of one loop is cut in two."""

    terms: int
    """Powers of 1/(iω) kept."""
    links: int
    """Roots of the chain in the upper half plane that are listed."""
    top_rad_s: float
    """Ω, midway between two links."""


def chain_plan(loop: Factored) -> ChainPlan | None:
    """The plan for a loop whose chain has to be summed; None for loops that fall off, or whose chain is too long."""
    if loop.relative_degree != 0 or not SOON_FAINT < abs(loop.gain) < 1.0 or loop.dead_time_s == 0.0:
        return None
    theta = loop.dead_time_s
    corner = max([float(np.abs(roots).max()) for roots in (loop.zeros, loop.poles) if len(roots)], default=0.0)
    # A slowly dying chain is shifted for longer by what its roots are off the even spacing.
    lasting = max(1.0, -1.0 / math.log(abs(loop.gain)))
    size = max(
        corner, -math.log(abs(loop.gain)) / theta, lasting * abs(float((loop.zeros.sum() - loop.poles.sum()).real))
    )
    turns = max(size * theta / math.pi, 2.0)
    terms = int(min(max(math.log(LARGEST_EXCESS) / math.log(turns), FEWEST_TERMS), MOST_TERMS))
    reach = size * (1.0 / CUT_OFF) ** (1.0 / terms)
    first = _first_link(loop.gain)
    links = max(math.ceil(reach * theta / (2.0 * math.pi)), 8)
    if links > MOST_LINKS:
        return None
    return ChainPlan(terms, links, 2.0 * math.pi * (links - 0.5 + first) / theta)


def _first_link(gain: float) -> float:
    """ω_k·θ/2π of the lowest positive link: of 1/2, 3/2, … for L(∞) > 0, else of 1, 2, …"""
    return 0.5 if gain > 0.0 else 1.0


def link_frequencies(loop: Factored, plan: ChainPlan) -> FloatArray:
    """(k,) ω_k > 0 below the cut [rad/s]."""
    numbers = np.arange(float(plan.links)) + _first_link(loop.gain)
    frequencies: FloatArray = 2.0 * math.pi * numbers / loop.dead_time_s
    return frequencies


@dataclass(frozen=True, eq=False)
class ChainSeries:
    """The terms above the cut: e^{μt}·Σ_m Σ_p C[row, m, p]·(Ωt)^p·(iω_k/Ω)^{−m}."""

    coefficients: FloatArray
    """(3, m, p), m from LOWEST_ORDER: below 1 for rows that answer a step with an impulse"""


def chain_series(
    plant: Factored, compensator: Factored, plan: ChainPlan, amplitudes: FloatArray, integrations: NDArray[np.int64]
) -> ChainSeries:
    """Expansion of the chain's contributions, from the loop's behaviour at high frequency."""
    length, unit = plan.terms + 4, plan.top_rad_s
    loop = compensator * plant
    theta, mu = loop.dead_time_s * unit, math.log(abs(loop.gain)) / (loop.dead_time_s * unit)
    sums = _power_sums(loop, unit, length)
    delta = np.zeros(length)
    inverse = np.zeros(length)
    for _ in range(length):
        inverse = _shifted(_reciprocal(np.eye(length)[0] + _shifted(delta + mu * np.eye(length)[0])))
        delta = -_log_series(sums, inverse) / theta
    # ℓ = −θ + Σ σ_n λ^{−n−1}
    rate = -theta * np.eye(length)[0] + _times(inverse, _sum_series(sums, inverse))
    whole = _times(inverse, _reciprocal(rate))
    own = _power_sums(compensator, unit, length)
    factor = _exponential(-_log_series(own, inverse))
    degree = -compensator.relative_degree
    gain = compensator.gain * unit**degree
    rows = [
        (whole, 0),
        (_times(whole, _reciprocal(gain * factor)), degree),
        (-_times(whole, gain * factor), -degree),
    ]
    ratio = _times(np.eye(length)[0] + _shifted(delta + mu * np.eye(length)[0]), np.eye(length)[0])
    orders = range(LOWEST_ORDER, plan.terms + 1)
    found = np.zeros((3, len(orders), plan.terms))
    powers = [np.eye(length)[0]]
    for p in range(1, plan.terms):
        powers.append(_times(powers[-1], delta) / p)
    for row, (series, shift) in enumerate(rows):
        series = amplitudes[row] * series
        # λ^{-degree}: (u/ratio)^degree.
        for _ in range(abs(shift)):
            series = _times(series, _reciprocal(ratio) if shift > 0 else ratio)
        order = shift
        if integrations[row] == 2:
            series, order = _times(series, _reciprocal(ratio)) / unit, order + 1
        for p in range(plan.terms):
            product = _times(series, powers[p])
            for place, m in enumerate(orders):
                if 0 <= m - order < length:
                    found[row, place, p] = product[m - order]
    return ChainSeries(found)


def _power_sums(model: Factored, unit: float, length: int) -> FloatArray:
    """σ_n = Σz^n − Σp^n for n = 0 … length−1, roots in units of `unit`."""
    n = np.arange(length)[:, None]
    zeros = ((model.zeros / unit) ** n).sum(axis=1) if len(model.zeros) else np.zeros(length)
    poles = ((model.poles / unit) ** n).sum(axis=1) if len(model.poles) else np.zeros(length)
    sums: FloatArray = np.real(zeros - poles)
    return sums


def _log_series(sums: FloatArray, inverse: FloatArray) -> FloatArray:
    """Σ_{n≥1} σ_n/n·λ^{−n}: minus the logarithm of Π(1 − z/λ)/Π(1 − p/λ)."""
    total, power = np.zeros_like(inverse), np.eye(len(inverse))[0]
    for n in range(1, len(inverse)):
        power = _times(power, inverse)
        total += sums[n] / n * power
    return total


def _sum_series(sums: FloatArray, inverse: FloatArray) -> FloatArray:
    """Σ_{n≥0} σ_n λ^{−n}."""
    power: FloatArray = np.eye(len(inverse))[0]
    total: FloatArray = sums[0] * power
    for n in range(1, len(inverse)):
        power = _times(power, inverse)
        total += sums[n] * power
    return total


def _times(a: FloatArray, b: FloatArray) -> FloatArray:
    product: FloatArray = np.convolve(a, b)[: len(a)]
    return product


def _shifted(a: FloatArray) -> FloatArray:
    moved: FloatArray = np.concatenate([[0.0], a[:-1]])
    return moved


def _reciprocal(a: FloatArray) -> FloatArray:
    found: FloatArray = np.zeros(len(a))
    found[0] = 1.0 / a[0]
    for n in range(1, len(a)):
        found[n] = -np.dot(a[1 : n + 1], found[n - 1 :: -1]) / a[0]
    return found


def _exponential(a: FloatArray) -> FloatArray:
    found: FloatArray = np.zeros(len(a))
    found[0] = math.exp(a[0])
    for n in range(1, len(a)):
        found[n] = sum(k * a[k] * found[n - k] for k in range(1, n + 1)) / n
    return found


def periodic_polynomials(gain: float, terms: int) -> list[FloatArray]:
    """Σ_k e^{2πi(k+β)x}/(2πi(k+β))^m on 0 < x < 1 for m = LOWEST_ORDER … terms, as coefficients of x, lowest first.

    β = 0 without the term k = 0 for a negative gain, β = 1/2 for a positive one. Each is the integral of the one
    before; its constant follows from the mean 0, and from the change of sign over one step.
    """
    found = [np.array([0.5, -1.0]) if gain < 0.0 else np.array([0.5])]
    while len(found) < terms:
        integral = np.concatenate([[0.0], found[-1] / np.arange(1, len(found[-1]) + 1)])
        if gain < 0.0:
            integral[0] = -float(np.sum(integral / np.arange(1, len(integral) + 1)))
        else:
            integral[0] = -0.5 * float(integral.sum())
        found.append(integral)
    # Impulses at the kinks and nothing between them, less the term k = 0 that is left out.
    impulses = [np.array([0.0])] * -LOWEST_ORDER + [np.array([-1.0 if gain < 0.0 else 0.0])]
    return impulses + found


def chain_segments(
    loop: Factored, plan: ChainPlan, series: ChainSeries, steps: Sequence[int], degree: int
) -> tuple[ComplexArray, ComplexArray]:
    """Rates (g,) [rad/s] and coefficients (j, 3, g, degree) of the chain above the cut in the dead times named.

    The form is that of `DelayedSteps`: Re Σ_g e^{rate·τ}·Σ_q coefficient·(τ/θ)^q.
    """
    theta, unit = loop.dead_time_s, plan.top_rad_s
    mu = math.log(abs(loop.gain)) / theta
    omega = link_frequencies(loop, plan)
    rates = np.concatenate([mu + 1j * omega, [mu]])
    found = np.zeros((len(steps), 3, len(rates), degree), dtype=np.complex128)
    orders = np.arange(LOWEST_ORDER, plan.terms + 1.0)
    low = -2.0 * (1j * omega[:, None] / unit) ** -orders
    whole = periodic_polynomials(loop.gain, plan.terms)
    for place, step in enumerate(steps):
        # (Ωt)^p = (Ωθ)^p·(step + x)^p as polynomials in x.
        moved = np.zeros((plan.terms, plan.terms))
        for p in range(plan.terms):
            for q in range(p + 1):
                moved[p, q] = (unit * theta) ** p * math.comb(p, q) * float(step) ** (p - q)
        inside = series.coefficients @ moved
        turn = (-1.0 if loop.gain > 0.0 else 1.0) ** step
        decay = abs(loop.gain) ** step
        found[place, :, :-1, : plan.terms] = decay * turn * np.einsum("km,rmq->rkq", low, inside)
        for m, (order, polynomial) in enumerate(zip(orders, whole, strict=True)):
            for row in range(3):
                product = np.convolve((unit * theta) ** order * polynomial, inside[row, m])
                found[place, row, -1, : len(product)] += decay * turn * product
    return rates, found


def lasting_steps(gain: float) -> int:
    """Dead times until the chain of a loop with L(∞) = `gain` has decayed to rounding."""
    return min(max(math.ceil(27.6 / -math.log(abs(gain))), 1), MOST_STEPS)
