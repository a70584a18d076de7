"""Error constants and final errors, from the number of integrators in the loop and its gain at s → 0."""

from __future__ import annotations

import math

from engine.loop.reading import Reading, value, without_value

CONSTANTS = ("position_error_constant", "velocity_error_constant", "acceleration_error_constant")
ERRORS = ("step_error", "ramp_error", "parabola_error")
_INPUTS = ("a step", "a ramp", "a parabola")


def error_constants(integrators: int, low_gain: float) -> dict[str, Reading]:
    """lim s^k·L(s) for s → 0, k = 0, 1, 2, from L → low_gain·s^−integrators (signed).

    Infinite is `unlimited`: nothing limits the accuracy. Source: practice (the definition of the loop's type).
    """
    readings = {}
    for power, name in enumerate(CONSTANTS):
        if integrators > power:
            why = f"infinite: the loop has {integrators} integrator{'s' if integrators > 1 else ''}"
            readings[name] = without_value("unlimited", why)
        elif integrators == power:
            readings[name] = _finite(low_gain)
        else:
            readings[name] = value(0.0)
    return readings


def final_errors(integrators: int, low_gain: float) -> dict[str, Reading]:
    """|Final error| of the stable loop to the unit step, t and t²/2; command filter and feedforward left out."""
    readings = {}
    for power, name in enumerate(ERRORS):
        if integrators > power:
            readings[name] = value(0.0)
        elif integrators < power:
            why = f"the error to {_INPUTS[power]} grows without end: the loop has too few integrators"
            readings[name] = without_value("unbounded", why)
        elif power == 0:
            readings[name] = value(1.0 / abs(1.0 + low_gain))
        else:
            readings[name] = value(1.0 / abs(low_gain))
    if integrators < 0:
        # A zero of L at s = 0 leaves the whole step as error.
        readings["step_error"] = value(1.0)
    return readings


def _finite(number: float) -> Reading:
    if math.isfinite(number):
        return value(number)
    return without_value("unlimited", "too large for a number")
