"""scipy.signal where it is itself exact: frequency responses of factored models, steps by matrix exponentials."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import signal

from tests.outside.designs import assessed, design_of, factored

# Low orders and well-spread roots, where scipy's expanded polynomials lose nothing.
LOOPS = {
    "lag and integrator": (4.0, [], [0, -3.0]),
    "two lags and a zero": (30.0, [-4.0], [-1.0, -6.0]),
    "resonance": (20.0, [-2.0], [-1.0, -0.6 + 3j, -0.6 - 3j]),
    "zero in the right half plane": (-1.5, [4.0], [-1.0, -2.0]),
    "unstable plant": (6.0, [-1.0], [1.0, -3.0]),
    "negative gain, positive feedback sign": (-0.4, [], [-1.0]),
    "three lags": (3.0, [], [-1.0, -1.5, -2.0]),
}


def each() -> object:
    return pytest.mark.parametrize(("gain", "zeros", "poles"), LOOPS.values(), ids=LOOPS.keys())


@each()
def test_curves_are_the_frequency_response(gain, zeros, poles):
    curves = assessed(design_of(factored(gain, zeros, poles)), curves=True)["curves"]
    omega = np.array(curves["omega_rad_s"])
    _, want = signal.freqs_zpk(zeros, poles, gain, omega)
    magnitude, phase = np.array(curves["magnitude_db"][0]), np.array(curves["phase_deg"][0])
    np.testing.assert_allclose(magnitude, 20 * np.log10(np.abs(want)), atol=1e-10)
    apart = (phase - np.degrees(np.angle(want)) + 180) % 360 - 180
    np.testing.assert_allclose(apart, 0, atol=1e-10)
    assert np.max(np.abs(np.diff(phase))) < 90  # continuous, never wrapped


@each()
def test_responses_are_the_step_responses(gain, zeros, poles):
    curves = assessed(design_of(factored(gain, zeros, poles), gain=1.3), curves=True)["curves"]
    t = np.array(curves["time_s"])
    numerator, denominator = 1.3 * gain * np.poly(zeros), np.poly(poles)
    closed = np.polyadd(numerator, denominator)
    for name, above in {"command": numerator, "load": numerator / 1.3, "effort": 1.3 * denominator}.items():
        even = np.linspace(0, t[-1], 401)
        # scipy steps with a matrix exponential: exact on an even grid for a constant input.
        _, want = signal.step((above, closed), T=even)
        got = np.interp(even, t, np.array(curves[name][0]))
        at = np.isin(even, t)
        np.testing.assert_allclose(got[at], want[at], atol=1e-9 * np.max(np.abs(want)), err_msg=name)
        # Off the engine's own samples the polygon that is drawn stays on the curve to a hundredth of the peak.
        np.testing.assert_allclose(got, want, atol=1e-2 * np.max(np.abs(want)), err_msg=name)


@each()
def test_responses_at_the_engines_own_times(gain, zeros, poles):
    curves = assessed(design_of(factored(gain, zeros, poles), gain=1.3), curves=True)["curves"]
    numerator, denominator = 1.3 * gain * np.poly(zeros), np.poly(poles)
    closed = np.polyadd(numerator, denominator)
    for name, above in {"command": numerator, "load": numerator / 1.3, "effort": 1.3 * denominator}.items():
        for index in (7, 101, 250, 399):
            time, got = curves["time_s"][index], curves[name][0][index]
            if got is None:
                continue
            _, want = signal.step((above, closed), T=np.linspace(0, time, 17))
            scale = max(abs(y) for y in curves[name][0] if y is not None)
            np.testing.assert_allclose(got, want[-1], atol=1e-9 * scale, err_msg=name)
