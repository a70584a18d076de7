"""Laws that hold for every loop (hypothesis)."""

from __future__ import annotations

import math

import numpy as np
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from engine.loop.frequency import CaseFrequency, read_frequency
from engine.loop.gain_phase import slope
from engine.loop.loop_set import LoopSet
from engine.loop.sections import sections_of
from engine.model.factored import Factored
from tests.loop.loops import UNITY, factored, pair, read

CORNERS = st.floats(-2.0, 3.0).map(lambda x: 10.0**x)
FREQUENCIES = {"crossover_rad_s", "last_crossover_rad_s", "bandwidth_rad_s", "slowest_pole_rad_s"}
POLE_MEASURES = {"least_damping", "slowest_pole_rad_s"}


@st.composite
def models(draw, longest: int = 4, dead_time: bool = False) -> Factored:
    """Proper models of either sign with light modes, integrators and roots on the right."""
    side = st.sampled_from([-1.0, -1.0, -1.0, -1.0, 1.0])
    poles: list[complex] = []
    for _ in range(draw(st.integers(1, longest))):
        if draw(st.booleans()):
            poles.append(draw(side) * draw(CORNERS))
        elif draw(st.booleans()):
            poles += pair(draw(CORNERS), -draw(side) * draw(st.floats(1e-3, 0.9)))
        else:
            poles.append(0.0)
    zeros = [draw(side) * draw(CORNERS) for _ in range(draw(st.integers(0, len(poles) - 1)))]
    crossing = draw(CORNERS)
    s = 1j * crossing
    # |L| = 1 somewhere among the corners.
    gain = abs(np.prod([s - p for p in poles]) / np.prod([s - z for z in zeros])) * draw(st.sampled_from([1.0, -1.0]))
    return factored(gain, zeros, poles, draw(CORNERS) / 1e4 if dead_time else 0.0)


def well_conditioned(case: CaseFrequency, *parts: Factored) -> bool:
    """No gain crossover at which |L| hardly moves: there the last digit of a gain moves the crossover far."""
    sections = sections_of([math.prod(parts[1:], start=parts[0])]).spread()
    crossings = np.array([[point.rad_s for point in case.gain_crossovers]])
    return bool(np.all(np.abs(slope(sections, crossings).real) > 1e-2))


def assert_same(a: CaseFrequency, b: CaseFrequency, time_scale: float = 1.0, tolerance: float = 1e-9) -> None:
    """All readings alike, with frequencies multiplied by time_scale."""
    assert a.stable == b.stable
    for name, first in a.readings.items():
        second = b.readings[name]
        if name in POLE_MEASURES and "not determinable" in (first.state, second.state):
            # With dead time the list of poles is confirmed or not, depending on where its search began.
            continue
        assert first.state == second.state, (name, first, second)
        if first.value is None or second.value is None:
            continue
        factor = {"delay_margin_s": 1 / time_scale, "velocity_error_constant": time_scale}.get(name, 1.0)
        factor = {"ramp_error": 1 / time_scale, "parabola_error": time_scale**-2}.get(name, factor)
        factor = time_scale**2 if name == "acceleration_error_constant" else factor
        factor = time_scale if name in FREQUENCIES else factor
        np.testing.assert_allclose(second.value, first.value * factor, rtol=tolerance, atol=tolerance, err_msg=name)
    np.testing.assert_allclose(
        [point.rad_s for point in b.gain_crossovers],
        [point.rad_s * time_scale for point in a.gain_crossovers],
        rtol=tolerance,
    )


@settings(deadline=None, max_examples=60)
@given(models(dead_time=True))
def test_an_all_one_stage_changes_nothing(model):
    hidden = factored(1.0, [-7.0], [-7.0])
    plain, staged = read(model), read(model, hidden)
    assume(well_conditioned(plain, model))
    assert plain.stable == staged.stable
    for name in ("phase_margin_deg", "gain_margin_db", "delay_margin_s", "peak_sensitivity", "crossover_rad_s"):
        first, second = plain.readings[name], staged.readings[name]
        assert first.state == second.state
        if first.value is not None and second.value is not None:
            np.testing.assert_allclose(second.value, first.value, rtol=1e-9, atol=1e-9, err_msg=name)


@settings(deadline=None, max_examples=60)
@given(models(2), models(3, dead_time=True))
def test_plant_and_compensator_may_change_places(a, b):
    one, other = read(a, b), read(b, a)
    assume(well_conditioned(one, a, b))
    # The effort C·S is the one reading that tells them apart.
    del one.readings["effort_gain_db"], other.readings["effort_gain_db"]
    assert_same(one, other)


@settings(deadline=None, max_examples=60)
@given(models(dead_time=True), st.integers(-12, 12))
def test_scaling_time_scales_every_frequency(model, power):
    # A power of two scales without rounding.
    k = 2.0**power
    scaled = Factored(model.gain * k**model.relative_degree, model.zeros * k, model.poles * k, model.dead_time_s / k)
    case = read(model)
    assume(well_conditioned(case, model))
    # The lattice of the grid does not scale along: extremes differ by their own rounding only.
    assert_same(case, read(scaled), k)


@settings(deadline=None, max_examples=40)
@given(st.lists(models(dead_time=True), min_size=2, max_size=4), models(2))
def test_a_case_reads_alike_alone_and_in_company(plants, compensator):
    together = read_frequency(LoopSet(tuple(plants), compensator)).cases
    for plant, found in zip(plants, together, strict=True):
        assume(well_conditioned(found, plant, compensator))
        assert_same(read(plant, compensator), found)


@settings(deadline=None, max_examples=40)
@given(models(dead_time=True), models(2))
def test_the_cache_changes_no_bit(plant, compensator):
    loops = LoopSet((plant,), compensator)
    first = read_frequency(loops)
    # Fresh objects with the same numbers miss every cache.
    copy = Factored(plant.gain, plant.zeros.copy(), plant.poles.copy(), plant.dead_time_s)
    again = read_frequency(LoopSet((copy,), compensator))
    np.testing.assert_array_equal(first.magnitude_db, again.magnitude_db)
    np.testing.assert_array_equal(first.phase_deg, again.phase_deg)
    assert first.cases[0].readings == again.cases[0].readings


@settings(deadline=None, max_examples=150)
@given(models(), st.floats(0.05, 0.95))
def test_margins_are_where_the_loop_loses_its_stability(model, share):
    """Less than each margin keeps the loop stable, the margin itself and a little more does not."""
    case = read(model)
    # Not assume(): an unstable loop is no reason to draw another, there are enough stable ones.
    if not (case.stable and well_conditioned(case, model)):
        return
    for name, sign in (("gain_margin_db", 1.0), ("gain_reduction_margin_db", -1.0)):
        reading = case.readings[name]
        if reading.value is None or reading.value < 1e-3:
            continue
        kept = factored(10 ** (sign * reading.value * share / 20))
        assert read(model, kept).stable, name
    delay = case.readings["delay_margin_s"]
    if delay.value is not None and delay.value > 1e-9:
        kept = Factored(model.gain, model.zeros, model.poles, delay.value * share)
        lost = Factored(model.gain, model.zeros, model.poles, delay.value * (1 + 1e-7))
        assert read(kept).stable
        assert not read(lost).stable


def test_the_unity_compensator_is_one():
    assert UNITY.gain == 1.0
    assert len(UNITY.zeros) == len(UNITY.poles) == 0
