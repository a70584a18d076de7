"""Coefficients and PID numbers in the hand-over, against direct evaluation."""

from __future__ import annotations

import numpy as np
import pytest

from engine.design.coefficients import expanded
from engine.design.pid_form import pid_forms
from engine.model.factored import Factored

S = 1j * np.logspace(-3, 4, 200)


def _c(values: list[complex]) -> np.ndarray:
    return np.array(values, dtype=np.complex128)


def _at(model: Factored) -> np.ndarray:
    top = np.prod(S[:, None] - model.zeros[None, :], axis=1)
    return model.gain * top / np.prod(S[:, None] - model.poles[None, :], axis=1)


PID_SHAPES = [
    ("proportional", Factored(3.5, _c([]), _c([]))),
    ("PI", Factored(2.0, _c([-4.0]), _c([0]))),
    ("PID with filter", Factored(120.0, _c([-1.0, -6.0]), _c([0, -90.0]))),
    ("PID with complex zeros", Factored(30.0, _c([-2 + 3j, -2 - 3j]), _c([0, -70.0]))),
    ("PD with filter", Factored(50.0, _c([-5.0]), _c([-80.0]))),
    ("ideal PID", Factored(0.4, _c([-2.0, -9.0]), _c([0]))),
    ("negative gain", Factored(-7.0, _c([-0.3]), _c([0]))),
]


@pytest.mark.parametrize(("name", "model"), PID_SHAPES, ids=[name for name, _ in PID_SHAPES])
def test_the_parallel_form_is_the_same_transfer_function(name: str, model: Factored) -> None:
    forms = pid_forms(model)
    assert forms is not None
    p = forms["parallel"]
    found = p["proportional"] + p["integral"] / S + p["derivative"] * S / (p["filter_s"] * S + 1)
    np.testing.assert_allclose(found, _at(model), rtol=1e-11)


@pytest.mark.parametrize(("name", "model"), PID_SHAPES, ids=[name for name, _ in PID_SHAPES])
def test_the_series_form_is_the_same_or_said_to_be_impossible(name: str, model: Factored) -> None:
    forms = pid_forms(model)
    assert forms is not None
    q = forms["series"]
    assert (q is None) == ("complex" in name)
    if q is not None:
        integral = 1.0 if q["integral_time_s"] is None else 1 + 1 / (q["integral_time_s"] * S)
        found = q["gain"] * integral * (1 + q["derivative_time_s"] * S) / (1 + q["filter_s"] * S)
        np.testing.assert_allclose(found, _at(model), rtol=1e-11)


@pytest.mark.parametrize(
    "model",
    [
        Factored(1.0, _c([]), _c([0, 0])),
        Factored(1.0, _c([]), _c([-1, -2])),
        Factored(1.0, _c([-1, -2, -3]), _c([0])),
        Factored(1.0, _c([-1]), _c([0, 5.0])),
        Factored(1.0, _c([-1]), _c([0]), 0.1),
    ],
)
def test_what_is_no_pid_is_not_called_one(model: Factored) -> None:
    assert pid_forms(model) is None


def test_coefficients_are_rounded_once_and_their_error_is_told() -> None:
    # By hand: 2(s+1)(s²+4s+13) = 2s³ + 10s² + 34s + 26.
    model = Factored(2.0, _c([-1, -2 + 3j, -2 - 3j]), _c([0, -1e-3, -1e3]))
    found = expanded(model)
    assert found.numerator == [2.0, 10.0, 34.0, 26.0]
    np.testing.assert_allclose(found.denominator, [1.0, 1000.001, 1.0, 0.0], rtol=1e-15)
    assert 0 <= found.largest_relative_response_error < 1e-12


def test_clustered_corners_over_six_decades_show_their_error() -> None:
    spread = Factored(1.0, _c([]), _c([-(10.0**power) for power in range(-3, 4)] * 2))
    assert 1e-16 < expanded(spread).largest_relative_response_error < 1e-6
