"""Parallel and series PID numbers of a compensator, where it is one."""

from __future__ import annotations

from typing import Any

import numpy as np

from engine.model.factored import Factored


def pid_forms(model: Factored) -> dict[str, Any] | None:
    """The PID numbers of a compensator; None where it is not of PID form.

    PID form: at most two zeros; at most one pole at the origin; at most one further pole, real and in the left half
    plane (the derivative filter); not more zeros than poles plus the ideal derivative.

    Returns
    -------
    dict : `parallel` with proportional, integral, derivative, filter_s for
        C = P + I/s + D·s/(filter_s·s + 1), and `series` with gain, integral_time_s, derivative_time_s, filter_s for
        C = gain·(1 + 1/(integral_time_s·s))·(1 + derivative_time_s·s)/(1 + filter_s·s), or None where zeros are complex
    """
    poles = [pole for pole in model.poles if pole != 0]
    integrators = len(model.poles) - len(poles)
    if integrators > 1 or len(poles) > 1 or len(model.zeros) > 2 or model.dead_time_s:
        return None
    if any(pole.imag != 0 or pole.real >= 0 for pole in poles):
        return None
    if len(model.zeros) > integrators + 1:
        return None
    filter_s = -1.0 / poles[0].real if poles else 0.0
    return {
        "parallel": _parallel(model, integrators, filter_s),
        "series": _series(model, integrators, filter_s),
    }


def _parallel(model: Factored, integrators: int, filter_s: float) -> dict[str, float]:
    """P, I, D from matching n2·s² + n1·s + n0 = P·s·(Tf·s+1) + I·(Tf·s+1) + D·s²  (an integrator-free C likewise)."""
    # Written over a denominator of unity DC, s^integrators·(Tf·s + 1).
    scale = model.gain * (filter_s if filter_s else 1.0)
    rising = np.atleast_1d(np.real(np.poly(model.zeros)))[::-1] * scale
    n0, n1, n2 = (float(rising[power]) if power < len(rising) else 0.0 for power in range(3))
    if integrators == 0:
        n0, n1, n2 = 0.0, n0, n1
    proportional = n1 - n0 * filter_s
    return {
        "proportional": proportional,
        "integral": n0,
        "derivative": n2 - proportional * filter_s,
        "filter_s": filter_s,
    }


def _series(model: Factored, integrators: int, filter_s: float) -> dict[str, float | None] | None:
    zeros = sorted(model.zeros.tolist(), key=abs)
    if any(zero.imag != 0 or zero.real >= 0 for zero in zeros):
        return None
    if integrators and not zeros:
        return None
    corners = [-zero.real for zero in zeros]
    integral_time_s = 1.0 / corners.pop(0) if integrators else None
    derivative_time_s = 1.0 / corners.pop(0) if corners else 0.0
    gain = model.gain * (filter_s if filter_s else 1.0)
    for zero in zeros:
        gain *= -zero.real
    gain *= integral_time_s if integral_time_s is not None else 1.0
    return {
        "gain": gain,
        "integral_time_s": integral_time_s,
        "derivative_time_s": derivative_time_s,
        "filter_s": filter_s,
    }
