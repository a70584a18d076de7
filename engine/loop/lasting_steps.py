"""Dead times beyond the first few, for loops that do not fall off: their responses keep jumping.

In each of them the response is the sum over the listed roots and the closed form of the rest of the chain, written in
the same form as the first dead times.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from engine.loop.chain_tail import MOST_STEPS, ChainPlan, chain_plan, chain_segments, chain_series, lasting_steps
from engine.loop.delayed_steps import DelayedSteps
from engine.loop.loop_set import LoopSet
from engine.loop.modal import ModalSums
from engine.model.factored import ComplexArray, FloatArray

# An unstable response leaves the sensible range long before its jumps have died out.
MOST_OF_UNSTABLE = 24


def with_lasting_steps(
    early: DelayedSteps,
    sums: ModalSums,
    loops: LoopSet,
    amplitudes: FloatArray,
    integrations: NDArray[np.int64],
) -> DelayedSteps:
    """The first dead times, followed by as many as the chains of these loops last; `early` where all fall off."""
    plans = [chain_plan(loop) for loop in loops.loops]
    growing: list[bool] = np.any(sums.exponents.real >= 0.0, axis=1).tolist()
    lasting = [
        min(lasting_steps(loop.gain), MOST_OF_UNSTABLE if grows else MOST_STEPS)
        for loop, plan, grows in zip(loops.loops, plans, growing, strict=True)
        if plan is not None
    ]
    first = early.coefficients.shape[1]
    if not lasting or max(lasting) <= first:
        return early
    steps = list(range(first, max(lasting)))
    parts = [_later(early, sums, loops, case, plan, amplitudes, integrations, steps) for case, plan in enumerate(plans)]
    cases, _, _, groups, terms = early.coefficients.shape
    more = max(len(rates) for rates, _ in parts)
    rates = np.zeros((cases, groups + more), dtype=np.complex128)
    coefficients = np.zeros((cases, first + len(steps), 3, groups + more, terms), dtype=np.complex128)
    rates[:, :groups] = early.rates
    coefficients[:, :first, :, :groups] = early.coefficients
    for case, (own_rates, own_coefficients) in enumerate(parts):
        rates[case, groups : groups + len(own_rates)] = own_rates
        coefficients[case, first:, :, groups : groups + len(own_rates)] = own_coefficients
    edges = early.dead_time_s[:, None] * np.arange(first + len(steps) + 1)
    return DelayedSteps(early.dead_time_s, edges, rates, coefficients)


def _later(
    early: DelayedSteps,
    sums: ModalSums,
    loops: LoopSet,
    case: int,
    plan: ChainPlan | None,
    amplitudes: FloatArray,
    integrations: NDArray[np.int64],
    steps: list[int],
) -> tuple[ComplexArray, ComplexArray]:
    """Rates and coefficients (j, 3, g, q) of one case in the dead times numbered `steps`."""
    theta, terms = float(early.dead_time_s[case]), early.coefficients.shape[-1]
    begin = theta * np.array(steps)
    exponents = sums.exponents[case]
    listed = np.zeros((len(steps), 3, len(exponents) + 1, terms), dtype=np.complex128)
    grown = np.exp(np.minimum(exponents.real * begin[:, None], 600.0) + 1j * exponents.imag * begin[:, None])
    listed[:, :, :-1, 0] = sums.weights[case] * grown[:, None, :]
    listed[:, :, -1, 0] = sums.offset[case] + sums.slope[case] * begin[:, None]
    listed[:, :, -1, 1] = sums.slope[case] * theta
    rates = np.append(exponents, 0.0)
    if plan is None:
        return rates, listed
    series = chain_series(loops.plants[case], loops.compensator, plan, amplitudes, integrations)
    chain_rates, chain = chain_segments(loops.loops[case], plan, series, steps, terms)
    return np.concatenate([rates, chain_rates]), np.concatenate([listed, chain], axis=2)
