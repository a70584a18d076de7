"""Margins and error constants from the crossings and the structure of the loop, by the contract's definitions."""

from __future__ import annotations

from mpmath import mp, mpc, mpf

from tests.outside.crossings import GainCrossing, PhaseCrossing
from tests.outside.loop import Loop

UNLIMITED = "unlimited"
UNBOUNDED = "unbounded"
Value = mpf | str


def gain_at_zero(loop: Loop) -> mpf | None:
    """L(0); None where it is infinite. A zero at the origin gives 0."""
    part = loop.rational
    order = sum(1 for p in part.poles if p == 0) - sum(1 for z in part.zeros if z == 0)
    if order > 0:
        return None
    return mpf(0) if order < 0 else _low_frequency_gain(loop)


def gain_at_infinity(loop: Loop) -> mpf:
    """lim L(jω)·exp(+jωθ)."""
    return loop.rational.gain if loop.relative_degree == 0 else mpf(0)


def phase_margin_deg(crossings: list[GainCrossing]) -> Value:
    """Least |signed margin|."""
    return min((abs(c.signed_phase_margin_deg) for c in crossings), default=UNLIMITED)


def delay_margin_s(loop: Loop, crossings: list[GainCrossing]) -> Value:
    """Least (signed margin mod 360°)/ω; 0 when |L(∞)| ≥ 1."""
    if abs(gain_at_infinity(loop)) >= 1:
        return mpf(0)
    turns = ((c.signed_phase_margin_deg % 360) * mp.pi / 180 / c.rad_s for c in crossings)
    return min(turns, default=UNLIMITED)


def gain_margins_db(loop: Loop, crossings: list[PhaseCrossing]) -> tuple[Value, Value]:
    """(increase, reduction): to the nearest phase crossover below and above 0 dB, ω = 0 and ω = ∞ included."""
    levels = [c.gain_db for c in crossings]
    at_zero, at_infinity = gain_at_zero(loop), gain_at_infinity(loop)
    if at_zero is not None and at_zero < 0:
        levels.append(20 * mp.log10(-at_zero))
    if at_infinity < 0 or (at_infinity and loop.dead_time_s):
        levels.append(20 * mp.log10(abs(at_infinity)))
    increase = min((-x for x in levels if x < 0), default=UNLIMITED)
    reduction = min((x for x in levels if x > 0), default=UNLIMITED)
    return increase, reduction


def error_constants(loop: Loop) -> dict[str, Value]:
    """lim s^k·L(s) for k = 0, 1, 2 from the count of integrators."""
    part = loop.rational
    order = sum(1 for p in part.poles if p == 0) - sum(1 for z in part.zeros if z == 0)
    gain = _low_frequency_gain(loop)
    names = ("position_error_constant", "velocity_error_constant", "acceleration_error_constant")
    return {name: UNLIMITED if order > k else gain if order == k else mpf(0) for k, name in enumerate(names)}


def final_errors(loop: Loop) -> dict[str, Value]:
    """|final error| of a stable loop to a unit step, t and t²/2."""
    constants = list(error_constants(loop).values())
    step = _inverse(constants[0] if isinstance(constants[0], str) else 1 + constants[0])
    return {
        "step_error": step,
        "ramp_error": _inverse(constants[1]),
        "parabola_error": _inverse(constants[2]),
    }


def _inverse(constant: Value) -> Value:
    if isinstance(constant, str):
        return mpf(0)
    return UNBOUNDED if constant == 0 else abs(1 / constant)


def _low_frequency_gain(loop: Loop) -> mpf:
    """lim s^order·L(s) with the roots at the origin left out."""
    part = loop.rational
    value = mpc(part.gain) * mp.fprod(-z for z in part.zeros if z != 0) / mp.fprod(-p for p in part.poles if p != 0)
    return mp.re(value)
