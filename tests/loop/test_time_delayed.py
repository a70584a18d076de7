"""Responses with dead time against the finite series of delayed terms, which is exact on every interval."""

from __future__ import annotations

from math import factorial

import mpmath as mp
import numpy as np
import pytest

from engine.design.parse import parse_design
from engine.design.resolve import loops_of
from engine.loop.frequency import read_frequency
from engine.loop.loop_set import LoopSet
from engine.loop.time_response import Scenario, read_time
from engine.model.factored import Factored
from tests.loop.time_views import factored, pair, readings_of, time_view
from tests.outside.delayed_responses import DelayedSeries
from tests.outside.loop import Loop, Part, loop_of_design
from tests.outside.make_reference import stored
from tests.outside.responses import SIGNALS

# The issue asks for 1e-6 of the peak everywhere; steps and roots do better, so a slip of two digits fails here.
OF_PEAK = 1e-8
DESIGNS = [e["design"] for e in stored() if "closed_loop_poles" not in e and e["unstable_poles"] == 0]


def worst_of_peak(got: np.ndarray, loop: Loop, signal: str, time_s: np.ndarray, until_s: float) -> float:
    """Largest error up to `until_s`, at a dozen of the instants shown and all kinks, relative to the whole peak."""
    series = DelayedSeries(loop, signal)
    early = np.flatnonzero(time_s <= until_s)
    chosen = np.unique(np.concatenate([early[:: max(len(early) // 10, 1)], early[-1:]]))
    want = np.array([float(series.value(mp.mpf(float(t)))) for t in time_s[chosen]])
    return float(np.abs(got[chosen] - want).max() / np.nanmax(np.abs(got)))


@pytest.mark.parametrize("index", range(0, len(DESIGNS), 4))
def test_random_loops_match_the_series_of_delayed_terms(index: int) -> None:
    # Across the change from the method of steps to the sum over the roots at five dead times.
    design = DESIGNS[index]
    loops = loops_of(parse_design(design))
    theta = loops.loops[0].dead_time_s
    view = time_view(list(loops.plants), loops.compensator, Scenario(horizon_s=8.0 * theta), stable=True)
    with mp.workdps(60):
        loop = loop_of_design(design)
        for row, signal in enumerate(SIGNALS):
            got = (view.command, view.load, view.effort)[row][0]
            assert worst_of_peak(got, loop, signal, view.time_s, 7.0 * theta) < OF_PEAK, signal


@pytest.mark.parametrize("gain", [0.2, np.exp(-1.0), 0.5, 1.2])
def test_integrator_with_dead_time(gain: float) -> None:
    # By hand, the method of steps: y(t) = Σ_{j≥1, j≤t} (−1)^{j+1} k^j (t−j)^j/j!, the load the same over k.
    view = time_view([factored(1.0, [], [0], 1.0)], factored(gain, [], []), Scenario(horizon_s=14.0))
    want = np.zeros(len(view.time_s))
    with mp.workdps(40):
        for k, t in enumerate(view.time_s):
            terms = [
                (-1) ** (j + 1) * mp.mpf(gain) ** j * (mp.mpf(t) - j) ** j / factorial(j) for j in range(1, int(t) + 1)
            ]
            want[k] = float(mp.fsum(terms))
    np.testing.assert_allclose(view.command[0], want, atol=1e-10)
    np.testing.assert_allclose(view.load[0], want / gain, atol=1e-9)
    np.testing.assert_allclose(view.effort[0][1:], gain * (1 - want[1:]), atol=1e-10)


def test_readings_of_the_integrator_with_dead_time() -> None:
    # By hand for k = 0.5: y reaches 10 % at 1.2 and, past its first parabola, the peak where y′ = 0.
    readings = readings_of(factored(1.0, [], [0], 1.0), factored(0.5, [], []))
    # y′ = k(1 − y(t − 1)): the first maximum lies one dead time after y first reaches 1. On 3 ≤ t < 4
    # y = k(t−1) − k²(t−2)²/2 + k³(t−3)³/6.
    with mp.workdps(30):
        k = mp.mpf("0.5")
        y = lambda t: k * (t - 1) - k**2 * (t - 2) ** 2 / 2 + k**3 * (t - 3) ** 3 / 6  # noqa: E731
        reached = mp.findroot(lambda t: y(t) - 1, 3.5)
        t = reached + 1
        peak = y(t) - k**4 * (t - 4) ** 4 / 24
    np.testing.assert_allclose(readings["overshoot_pct"].value, float(100 * (peak - 1)), rtol=1e-9)
    np.testing.assert_allclose(readings["overshoot_pct"].at_s, float(t), rtol=1e-9)
    np.testing.assert_allclose(readings["peak_effort"].value, 0.5, rtol=1e-14)
    assert readings["peak_effort"].at_s == 0.0


# Loops that never fall off, 0 < |L(∞)| < 1: static plants under proportional-integral control, an ideal
# proportional-integral-derivative controller on a lag, both signs. Their responses jump at every dead time for ever.
NEUTRAL = [
    (factored(1.0, [], [], 1.0), factored(0.4, [-1.0], [0])),
    (factored(-1.0, [], [], 1.0), factored(-0.2, [-2.0], [0])),
    (factored(1.0, [-0.5], [-1.0], 1.0), factored(-0.3, [2.0], [0])),
    (factored(1.0, [], [-1.0], 0.5), factored(0.6, [-1.2, -2.0], [0])),
    (factored(0.3, [-4], [-2], 1.0), factored(2.0, [-1.3], [-0.4])),
]


@pytest.mark.parametrize("index", range(len(NEUTRAL)))
def test_loops_that_never_fall_off(index: int) -> None:
    plant, compensator = NEUTRAL[index]
    theta = plant.dead_time_s
    view = time_view([plant], compensator, Scenario(horizon_s=16.0 * theta), stable=True)
    with mp.workdps(60):
        loop = Loop(_part(compensator), _part(plant), mp.mpf(theta))
        for row, signal in enumerate(SIGNALS):
            got = (view.command, view.load, view.effort)[row][0]
            assert worst_of_peak(got, loop, signal, view.time_s, 15.9 * theta) < 1e-10, signal
    assert view.cases[0].notices == () or "impulse" in view.cases[0].notices[0]


def _part(model: Factored) -> Part:
    return Part(mp.mpf(model.gain), tuple(map(mp.mpc, model.zeros)), tuple(map(mp.mpc, model.poles)))


def test_readings_across_jumps() -> None:
    # By hand: the static plant k·e^(−sθ) under k·0.5: y jumps to 0.5, 0.25, 0.375, … → 1/3: partial sums of −(−1/2)^j.
    readings = readings_of(factored(1.0, [], [], 0.4), factored(0.5, [], []))
    np.testing.assert_allclose(readings["overshoot_pct"].value, 50.0, rtol=1e-9)
    np.testing.assert_allclose(readings["rise_time_s"].value, 0.0, atol=1e-12)
    np.testing.assert_allclose(readings["peak_effort"].value, 0.5, rtol=1e-12)
    # |y − 1/3| = 1/3·2^(−j) after j dead times: inside 2 % from j = 6 on.
    np.testing.assert_allclose(readings["settling_time_s"].value, 6 * 0.4, rtol=1e-12)


def test_a_fast_filter_that_only_just_falls_off() -> None:
    # Flat at |L| = 0.45 up to 400 rad per dead time, then falling: hundreds of roots in the chain count.
    plant, compensator = factored(1.0, [], [], 1.0), factored(0.45 * 400.0, [-0.8], [0, -400.0])
    view = time_view([plant], compensator, Scenario(horizon_s=8.0), stable=True)
    with mp.workdps(60):
        loop = Loop(_part(compensator), _part(plant), mp.mpf(1))
        for row, signal in enumerate(SIGNALS):
            got = (view.command, view.load, view.effort)[row][0]
            assert worst_of_peak(got, loop, signal, view.time_s, 7.5) < 1e-7, signal


def test_nothing_happens_before_the_dead_time_has_passed() -> None:
    view = time_view([factored(1.0, [], [0, -1], 0.7)], factored(0.4, [], []))
    before = view.time_s < 0.7
    assert before.any()
    np.testing.assert_array_equal(view.command[0, before], 0.0)
    np.testing.assert_array_equal(view.load[0, before], 0.0)
    np.testing.assert_allclose(view.effort[0, before], 0.4, rtol=1e-14)


def test_ramp_with_dead_time() -> None:
    # By hand: the ramp's answer is the integral of the step's, Σ (−1)^{j+1} k^j (t−j)^{j+1}/(j+1)!.
    view = time_view([factored(0.4, [], [0], 1.0)], scenario=Scenario("ramp", horizon_s=12.0))
    want = [
        sum((-1) ** (j + 1) * 0.4**j * (t - j) ** (j + 1) / factorial(j + 1) for j in range(1, int(t) + 1))
        for t in view.time_s
    ]
    np.testing.assert_allclose(view.command[0], want, atol=1e-9)


def test_a_light_mode_many_cycles_per_dead_time() -> None:
    # A mode of 150 rad per dead time beside a slow loop.
    mode = pair(150.0, 0.0008)
    plant = {"kind": "factored", "gain": 150.0**2 * 0.4, "poles": [[r.real, r.imag] for r in [0j, -4 + 0j, *mode]]}
    design = {
        "format": "loopwright-design/1",
        "plant_cases": [{"name": "x", "model": {**plant, "zeros": [], "dead_time_s": 1.0}}],
        "compensator": {"gain": 1.2, "stages": []},
        "requirements": [],
    }
    plants = loops_of(parse_design(design)).plants
    view = time_view(list(plants), factored(1.2, [], []), Scenario(horizon_s=7.0), stable=True)
    with mp.workdps(60):
        loop = loop_of_design(design)
        for row, signal in enumerate(SIGNALS):
            got = (view.command, view.load, view.effort)[row][0]
            assert worst_of_peak(got, loop, signal, view.time_s, 6.5) < OF_PEAK, signal


def test_a_delayed_case_reads_the_same_alone_and_in_company() -> None:
    plants = [
        factored(0.5, [], [0], 1.0),
        factored(4.0, [], [0, -2]),
        factored(0.4 * 900, [], [0, -2, *pair(30.0, 0.005)], 0.01),
        factored(9.0, [], [0], 1.0),
    ]
    together = time_view(plants)
    assert together.cases[3].readings["load_peak"].state == "unstable"
    for case, plant in enumerate(plants[:3]):
        alone = readings_of(plant)
        for name, reading in together.cases[case].readings.items():
            assert reading.value is not None
            np.testing.assert_allclose(reading.value, alone[name].value, rtol=1e-9, atol=1e-12, err_msg=name)


def test_endlessly_many_unstable_roots_are_shown_for_the_first_dead_times() -> None:
    # |L(∞)| = 1.5: by hand y = 1.5 on [θ, 2θ) while the static loop's terms alternate: 0, 1.5, −0.75, 2.625, …
    view = time_view([factored(1.5, [], [], 0.2)], stable=False)
    assert view.cases[0].readings["overshoot_pct"].state == "unstable"
    for start, want in ((0.0, 0.0), (0.2, 1.5), (0.4, -0.75), (0.6, 2.625)):
        inside = (view.time_s >= start + 1e-9) & (view.time_s < start + 0.2 - 1e-9)
        np.testing.assert_allclose(view.command[0, inside], want, atol=1e-12)


def test_what_hardly_falls_off_is_not_measured() -> None:
    # By hand: |L| is 0.5 from 400 rad/s on, so after each dead time of 10 s the output jumps by half the last jump;
    # the chain of roots that makes those jumps is longer than is summed, and a settling time could come out short.
    loops = LoopSet((factored(0.5, [-1.0], [-400.0], 10.0),), factored(1.0, [], []))
    (case,) = read_time(loops, read_frequency(loops), Scenario()).cases
    assert {reading.state for reading in case.readings.values()} == {"not determinable"}
    assert any("hardly falls off" in notice for notice in case.notices)
