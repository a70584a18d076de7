"""Each stage against the formula that defines it, and its refusals."""

from __future__ import annotations

from collections.abc import Callable

import mpmath
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from engine.model import stages
from engine.model.evaluate import response
from engine.model.factored import ComplexArray, Factored
from tests.model.refusal import refused

S: ComplexArray = np.concatenate([1j * np.logspace(-4, 5, 19), [0.3 + 2j, -0.2 + 0.01j]])
corners = st.floats(1e-6, 1e6)
dampings = st.floats(1e-6, 20)


def second_order(w: float, zeta: float) -> ComplexArray:
    return (S / w) ** 2 + 2 * zeta * S / w + 1


def assert_formula(stage: Factored, want: ComplexArray, error: float = 1e-12) -> None:
    np.testing.assert_allclose(response(stage, S), want, rtol=error)


@given(corners, corners)
def test_first_order_formulas(z: float, p: float) -> None:
    # The formulas are the definitions in the file format; the points keep clear of the left half plane's axis.
    assert_formula(stages.lead_lag(z, p), (1 + S / z) / (1 + S / p))
    assert_formula(stages.real_zero(z), 1 + S / z)
    assert_formula(stages.real_pole(p), 1 / (1 + S / p))
    assert_formula(stages.proportional_integral(z), (S + z) / S)
    assert_formula(stages.integrator(), 1 / S)


@given(st.floats(1e-3, 1e3), st.floats(0.05, 20), st.floats(0.05, 20))
def test_second_order_formulas(w: float, zz: float, zp: float) -> None:
    # Within 0.05 of the axis s itself may stand near a root, where both sides lose digits.
    right = S.real >= 0
    for stage, want in (
        (stages.complex_zeros(w, zz), second_order(w, zz)),
        (stages.complex_poles(w, zp), 1 / second_order(w, zp)),
        (stages.notch(w, zz, zp), second_order(w, zz) / second_order(w, zp)),
    ):
        np.testing.assert_allclose(response(stage, S[right]), want[right], rtol=1e-10)


@given(corners, dampings, dampings)
def test_direct_gain_and_high_frequency_gain(w: float, zz: float, zp: float) -> None:
    for stage in (
        stages.lead_lag(w, 3 * w),
        stages.complex_zeros(w, zz),
        stages.complex_poles(w, zp),
        stages.notch(w, zz, zp),
        stages.real_zero(w),
        stages.real_pole(w),
    ):
        np.testing.assert_allclose(response(stage, 0), 1, rtol=1e-13)
    np.testing.assert_allclose(response(stages.notch(w, zz, zp), 1e15j * w), 1, rtol=1e-12)
    np.testing.assert_allclose(response(stages.proportional_integral(w), 1e15j * w), 1, rtol=1e-12)
    np.testing.assert_allclose(response(stages.lead_lag(w, 3 * w), 1e18j * w), 3, rtol=1e-12)


@pytest.mark.parametrize("ratio", [1.5, 3.0, 10.0, 20.0])
def test_greatest_lead(ratio: float) -> None:
    # Exact: asin((a − 1)/(a + 1)) at √(z·p), gain there √a. Source: any text on lead networks; closed form.
    at = response(stages.lead_lag(2.0, 2.0 * ratio), 2j * np.sqrt(ratio))
    np.testing.assert_allclose(np.angle(at), np.arcsin((ratio - 1) / (ratio + 1)), rtol=1e-13)
    np.testing.assert_allclose(np.abs(at), np.sqrt(ratio), rtol=1e-13)


def test_notch_depth() -> None:
    # Exact: at its centre a notch has the gain ζz/ζp, here −20 dB; with ζz = 0 it is 0.
    np.testing.assert_allclose(response(stages.notch(70, 0.05, 0.5), 70j), 0.1, rtol=1e-13)
    assert response(stages.notch(64, 0, 0.5), 64j) == 0


def test_where_pairs_become_real() -> None:
    # By hand: s² + 2ζs + 1 with ζ = 1.25 has −0.5 and −2; ζ = 1 has −1 twice; ζ = 1e6 keeps the small root.
    assert stages.complex_poles(1, 1.25).poles.tolist() == [-0.5, -2]
    assert stages.complex_poles(3, 1).poles.tolist() == [-3, -3]
    np.testing.assert_allclose(stages.complex_zeros(1, 1e6).zeros, [-5.00000000000125e-7, -1999999.9999995], rtol=1e-15)
    assert stages.complex_zeros(5, 0).zeros.tolist() == [5j, -5j]
    assert not np.signbit(stages.complex_zeros(5, 0).zeros.real).any()


@given(corners, st.floats(1e-9, 1 - 1e-9))
def test_pairs_are_exact_conjugates(w: float, zeta: float) -> None:
    first, second = stages.complex_poles(w, zeta).poles.tolist()
    assert first.imag > 0
    assert second == first.conjugate()
    np.testing.assert_allclose([abs(first), first.real], [w, -zeta * w], rtol=1e-15)


@pytest.mark.parametrize("short", [1e-3, 1e-9, 2.0**-50])
def test_nearly_critical_damping_keeps_its_digits(short: float) -> None:
    # Second method: √(1 − ζ²) at 40 digits; formed in doubles it loses half of them.
    zeta = 1 - short
    with mpmath.workdps(40):
        want = float(mpmath.sqrt(1 - mpmath.mpf(zeta) ** 2))
    np.testing.assert_allclose(stages.complex_poles(1, zeta).poles[0].imag, want, rtol=4e-16)


def test_rational() -> None:
    stage = stages.rational([-1, [-2, 3], [-2, -3]], [0, 4.5], -2)
    assert stage.zeros.tolist() == [-1, -2 + 3j, -2 - 3j]
    assert stage.poles.tolist() == [0, 4.5]
    assert (stage.gain, stage.dead_time_s) == (-2, 0)


@pytest.mark.parametrize(
    ("build", "where", "words"),
    [
        (lambda: stages.lead_lag(-3, 1), "zero_rad_s", ["must be greater than 0, is -3"]),
        (lambda: stages.lead_lag(3, 0), "pole_rad_s", ["must be greater than 0, is 0"]),
        (lambda: stages.lead_lag("3", 1), "zero_rad_s", ["must be a number"]),
        (lambda: stages.lead_lag(3, float("nan")), "pole_rad_s", ["finite", "nan"]),
        (lambda: stages.lead_lag(3, 10**400), "pole_rad_s", ["finite"]),
        (lambda: stages.proportional_integral(-1), "corner_rad_s", ["greater than 0"]),
        (lambda: stages.real_zero(0), "corner_rad_s", ["greater than 0"]),
        (lambda: stages.real_pole(float("inf")), "corner_rad_s", ["finite"]),
        (lambda: stages.real_pole(1e200), "corner_rad_s", ["1e+30"]),
        (lambda: stages.real_pole(True), "corner_rad_s", ["must be a number"]),
        (lambda: stages.complex_zeros(1, -0.1), "damping", ["must be 0 or greater, is -0.1"]),
        (lambda: stages.complex_zeros(-1, 0.1), "natural_rad_s", ["greater than 0"]),
        (lambda: stages.complex_poles(1, 0), "damping", ["must be greater than 0, is 0"]),
        (lambda: stages.complex_poles(1, 1e300), "damping", ["too large"]),
        (lambda: stages.notch(0, 0.1, 0.1), "centre_rad_s", ["greater than 0"]),
        (lambda: stages.notch(1, -0.1, 0.1), "zero_damping", ["0 or greater"]),
        (lambda: stages.notch(1, 0.1, 0), "pole_damping", ["greater than 0"]),
        (lambda: stages.rational([[1, 2]], [], 1), "zeros[0]", ["[1, 2] has no conjugate", "add [1, -2]"]),
        (lambda: stages.rational([], [], 0), "gain", ["must not be 0"]),
    ],
)
def test_refused(build: Callable[[], Factored], where: str, words: list[str]) -> None:
    refused(build, where, *words)
