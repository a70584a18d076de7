"""Error constants and final errors from the structure of the loop."""

from __future__ import annotations

import pytest

from engine.loop.steady_state import CONSTANTS, ERRORS
from tests.loop.loops import factored, number, read, states


# The table of the loop's type (every control text): value at its own order, infinite above, zero below.
@pytest.mark.parametrize(
    ("poles_at_zero", "constants", "errors"),
    [
        (0, [2.0, 0.0, 0.0], [1 / 3, "unbounded", "unbounded"]),
        (1, ["unlimited", 2.0, 0.0], [0.0, 1 / 2, "unbounded"]),
        (2, ["unlimited", "unlimited", 2.0], [0.0, 0.0, 1 / 2]),
    ],
)
def test_the_table_of_types(poles_at_zero, constants, errors):
    # (s+1)²/(s+2)² corners chosen so that K is 2 and the loop stable.
    case = read(factored(2.0, [-1.0, -1.0], [0.0] * poles_at_zero + [-1.0] * (2 - poles_at_zero)))
    for name, want in zip(CONSTANTS + ERRORS, constants + errors, strict=True):
        if isinstance(want, str):
            assert states(case, name) == [want]
        else:
            assert number(case, name) == pytest.approx(want, rel=1e-14)


def test_three_integrators():
    case = read(factored(7.0, [-10, -10], [0, 0, 0]))
    assert states(case, *CONSTANTS) == ["unlimited"] * 3
    assert [number(case, name) for name in ERRORS] == [0.0, 0.0, 0.0]


def test_a_zero_at_the_origin_leaves_the_whole_step():
    case = read(factored(3.0, [0], [-1, -2]))
    assert [number(case, name) for name in CONSTANTS] == [0.0, 0.0, 0.0]
    assert number(case, "step_error") == 1.0
    assert states(case, "ramp_error") == ["unbounded"]


def test_a_negative_loop_gain_is_told_with_its_sign():
    # By hand: 2/(s−1): L(0) = −2, final error 1/|1 − 2| = 1.
    case = read(factored(2.0, [], [1.0]))
    assert number(case, "position_error_constant") == -2.0
    assert number(case, "step_error") == 1.0


def test_the_count_decides_not_a_small_frequency():
    # A pole at 1e-9 rad/s looks like an integrator on every chart; it is none.
    case = read(factored(1.0, [], [-1e-9, -5.0]))
    assert number(case, "position_error_constant") == pytest.approx(2e8, rel=1e-14)
    assert states(case, "ramp_error") == ["unbounded"]
