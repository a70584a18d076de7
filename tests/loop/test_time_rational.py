"""Responses and their readings without dead time, against partial fractions at 60 digits and closed forms."""

from __future__ import annotations

import mpmath as mp
import numpy as np
import pytest
import scipy.signal

from engine.design.parse import parse_design
from engine.design.resolve import loops_of
from engine.loop.time_response import Scenario, TimeView
from engine.model.factored import Factored
from tests.loop.time_views import factored, pair, readings_of, time_view
from tests.outside.loop import Loop, loop_of_design
from tests.outside.make_reference import stored
from tests.outside.responses import SIGNALS, Modal, response
from tests.outside.step_measures import Features, features, greatest_magnitude, last_exit, step_measures

# The issue asks for 1e-6 of the peak everywhere; the modal sums do better, so a slip of three digits fails here.
OF_PEAK = 1e-9
READING = 1e-8
# A few of the stored random loops at a tighter tolerance; tests/outside goes through all of them.
DESIGNS = [entry["design"] for entry in stored() if "closed_loop_poles" in entry and not entry["unstable_poles"]]


def worst_of_peak(got: np.ndarray, modal: Modal, time_s: np.ndarray) -> float:
    """Largest error relative to the reference's largest value."""
    want, _ = modal.sampled(time_s)
    return float(np.max(np.abs(got - want)) / np.max(np.abs(want)))


def drawn(index: int, shape: str = "step") -> tuple[Loop, TimeView]:
    """Reference and responses of a stored random design."""
    loops = loops_of(parse_design(DESIGNS[index]))
    scenario = Scenario(command_shape="ramp" if shape == "ramp" else "step")
    return loop_of_design(DESIGNS[index]), time_view(list(loops.plants), loops.compensator, scenario)


@pytest.mark.parametrize("index", range(0, 60, 5))
def test_responses_match_partial_fractions_at_60_digits(index: int) -> None:
    with mp.workdps(60):
        loop, view = drawn(index)
        for signal in SIGNALS:
            modal = response(loop, signal)
            assert worst_of_peak(getattr(view, signal)[0], modal, view.time_s) < OF_PEAK, signal


@pytest.mark.parametrize("index", range(1, 60, 12))
def test_ramp_responses_match_partial_fractions_at_60_digits(index: int) -> None:
    with mp.workdps(60):
        loop, view = drawn(index, "ramp")
        for signal in SIGNALS:
            modal = response(loop, signal, "ramp")
            assert worst_of_peak(getattr(view, signal)[0], modal, view.time_s) < OF_PEAK, signal


@pytest.mark.parametrize("index", [0, 11, 23])
def test_readings_match_polished_features_at_60_digits(index: int) -> None:
    with mp.workdps(60):
        loop, view = drawn(index)
        readings = view.cases[0].readings
        for name, want in _reference_readings(loop, view).items():
            got = readings[name].value
            assert got is not None, name
            np.testing.assert_allclose(
                got, float(want), rtol=READING, atol=1e-8 if "pct" in name else 0.0, err_msg=name
            )


def _reference_readings(loop: Loop, view: TimeView) -> dict[str, mp.mpf]:
    command, load, effort = (features(response(loop, signal)) for signal in SIGNALS)
    wanted: dict[str, mp.mpf] = {}
    if command.modal.constant != 0:
        wanted |= step_measures(command)
    if view.cases[0].readings["peak_effort"].state == "value":
        wanted["peak_effort"] = greatest_magnitude(effort)
    wanted |= _load_readings(load)
    return wanted


def _load_readings(load: Features) -> dict[str, mp.mpf]:
    peak = greatest_magnitude(load)
    return {"load_peak": peak, "load_settling_time_s": last_exit(load, peak * mp.mpf("0.02"))}


@pytest.mark.parametrize("damping", [0.0005, 0.005, 0.1, 0.4, 0.7, 0.9])
def test_second_order_closed_forms(damping: float) -> None:
    # Any textbook: ω²/(s(s+2ζω)) has overshoot e^(−πζ/√(1−ζ²)) at π/(ω√(1−ζ²)).
    natural = 7.0
    readings = readings_of(factored(natural**2, [], [0, -2 * damping * natural]))
    root = np.sqrt(1 - damping**2)
    want = 100 * np.exp(-np.pi * damping / root)
    np.testing.assert_allclose(readings["overshoot_pct"].value, want, rtol=1e-10)
    np.testing.assert_allclose(readings["overshoot_pct"].at_s, np.pi / (natural * root), rtol=1e-7)
    # The last exit lies within half a period before the envelope e^(−ζωt)/√(1−ζ²) enters the band.
    envelope = -np.log(0.02 * root) / (damping * natural)
    settled = readings["settling_time_s"].value
    assert envelope - np.pi / (natural * root) <= settled <= envelope


def test_first_order_closed_form() -> None:
    # By hand: C = 4 round 1/(s+1) gives y = 0.8·(1 − e^(−5t)) and u = 0.8·(1 + 4e^(−5t)); the load, 0.2·(1 − e^(−5t)).
    readings = readings_of(factored(1.0, [], [-1]), factored(4.0, [], []))
    np.testing.assert_allclose(readings["rise_time_s"].value, np.log(9) / 5, rtol=1e-12)
    np.testing.assert_allclose(readings["settling_time_s"].value, np.log(50) / 5, rtol=1e-12)
    np.testing.assert_allclose(readings["peak_effort"].value, 4.0, rtol=1e-14)
    np.testing.assert_allclose(readings["load_peak"].value, 0.2, rtol=1e-12)
    assert readings["peak_effort"].at_s == 0.0
    assert readings["overshoot_pct"].value == 0.0


# Field notes, worked examples (recomputed): Ogata's lead and lag designs.
@pytest.mark.parametrize(
    ("loop", "measure", "want", "digits"),
    [
        (factored(4 * 41.7, [-4.41], [0, -2, -18.4]), "overshoot_pct", 21.69, 0.01),
        (factored(5 * 10 / (100 * 0.5), [-0.1], [-0.01, 0, -1, -2]), "settling_time_s", 22.0, 0.05),
    ],
)
def test_worked_examples(loop: Factored, measure: str, want: float, digits: float) -> None:
    assert abs(readings_of(loop)[measure].value - want) <= digits


@pytest.mark.parametrize("spread", [1e3, 1e6])
def test_stiff_loops_come_out_right(spread: float) -> None:
    # A fast filter pole and a slow pole and zero close together in one loop.
    loop = factored(10.0 * spread, [-0.01], [0, -0.02, -10.0, -spread])
    view = time_view([loop], scenario=Scenario(horizon_s=5.0))
    with mp.workdps(60):
        modal = response(loop_of_factored(loop), "command")
        assert worst_of_peak(view.command[0], modal, view.time_s) < OF_PEAK


def loop_of_factored(loop: Factored) -> Loop:
    entry = {"kind": "factored", "gain": loop.gain, "zeros": _pairs(loop.zeros), "poles": _pairs(loop.poles)}
    return loop_of_design({"plant_cases": [{"model": entry}], "compensator": {"gain": 1.0, "stages": []}})


def _pairs(roots: np.ndarray) -> list[list[float]]:
    return [[float(root.real), float(root.imag)] for root in roots]


def test_against_scipy_on_its_own_ground() -> None:
    # scipy.signal.lsim: matrix exponentials, exact for a step on a uniform grid; well-scaled loop of order 3.
    view = time_view([factored(6.0, [-2], [0, -1, -5])], scenario=Scenario(horizon_s=6.0))
    closed = scipy.signal.StateSpace(*scipy.signal.tf2ss([6, 12], np.polyadd(np.poly([0, -1, -5]), [0, 0, 6, 12])))
    uniform = np.linspace(0, 6, 2001)
    _, want, _ = scipy.signal.lsim(closed, np.ones(2001), uniform)
    shared = np.isin(np.round(view.time_s, 12), np.round(uniform, 12))
    at = np.searchsorted(uniform, view.time_s[shared] - 1e-9)
    assert np.count_nonzero(shared) >= 2
    np.testing.assert_allclose(view.command[0, shared], want[at], atol=1e-11)


@pytest.mark.parametrize("shift", [0.0, 1e-14, 1e-9, 1e-5])
def test_coinciding_closed_loop_poles(shift: float) -> None:
    # By hand: 1/(s(s+2)) closes to 1/(s+1)², y = 1 − (1+t)e^(−t); a shift of the gain moves y by less than itself.
    view = time_view([factored(1.0 + shift, [], [0, -2])])
    t = view.time_s
    np.testing.assert_allclose(view.command[0], 1 - (1 + t) * np.exp(-t), atol=1e-13 + 0.7 * shift)
    ramp = time_view([factored(1.0 + shift, [], [0, -2])], scenario=Scenario(command_shape="ramp"))
    t = ramp.time_s
    np.testing.assert_allclose(ramp.command[0], t - 2 + (2 + t) * np.exp(-t), atol=1e-11 + 2 * shift)


@pytest.mark.parametrize("order", [3, 6, 12])
def test_many_coinciding_closed_loop_poles(order: int) -> None:
    # By hand: L = 1/((s+1)^n − 1) closes to 1/(s+1)^n, whose step response is the regularised gamma function P(n, t).
    turn = np.exp(2j * np.pi * np.arange(order) / order)
    upper = (-1 + turn)[turn.imag > 1e-9]
    poles = [0j, *([-2 + 0j] if order % 2 == 0 else []), *(z for root in upper for z in (root, root.conjugate()))]
    view = time_view([factored(1.0, [], poles)])
    with mp.workdps(30):
        want = [float(mp.gammainc(order, 0, mp.mpf(t), regularized=True)) for t in view.time_s]
    # Rounding of the open-loop poles moves roots that close by far more than itself, and the response a little.
    np.testing.assert_allclose(view.command[0], want, atol=2e-10)


def test_identical_light_modes_in_one_loop() -> None:
    # Two modes of the same frequency, one of them nearly hidden by a zero pair: roots crowd beside the axis.
    loop = factored(2.0, [*pair(30.0, 0.0051)], [0, -20, *pair(30.0, 0.005), *pair(30.0, 0.005 + 1e-9)])
    loop = Factored(loop.gain * 30.0**2 * 10, loop.zeros, loop.poles)
    with mp.workdps(60):
        modal = response(loop_of_factored(loop), "command")
        view = time_view([loop], scenario=Scenario(horizon_s=20.0), stable=True)
        assert worst_of_peak(view.command[0], modal, view.time_s) < OF_PEAK


def test_hidden_modes_do_not_show_where_they_do_not_act() -> None:
    # By hand: the plant's pole −3 is hidden from the command by a zero of C, but the load excites it:
    # P·S/s = 1/((s+3)(s+1)), so y = (e^(−t) − e^(−3t))/2.
    view = time_view([factored(1.0, [], [-3])], factored(1.0, [-3], [0]))
    t = view.time_s
    np.testing.assert_allclose(view.command[0], 1 - np.exp(-t), atol=1e-14)
    np.testing.assert_allclose(view.load[0], (np.exp(-t) - np.exp(-3 * t)) / 2, atol=1e-14)


def test_a_hidden_integrator_lets_the_load_drift() -> None:
    # By hand: P = 1/(s(s+2)), C = s/(s+5): P·S = (s+5)/(s((s+2)(s+5)+1)) has a pole at 0, so y grows like 5t/11.
    view = time_view([factored(1.0, [], [0, -2])], factored(1.0, [0], [-5]))
    assert view.cases[0].readings["load_peak"].state == "unstable"
    roots = np.array([(-7 + np.sqrt(5)) / 2, (-7 - np.sqrt(5)) / 2])
    t = view.time_s
    residue = (roots + 5) / (roots**2 * (roots - roots[::-1]))
    want = 5 * t / 11 + (11 - 35) / 121 + (residue[:, None] * np.exp(roots[:, None] * t)).sum(axis=0)
    np.testing.assert_allclose(view.load[0], want, rtol=1e-9, atol=1e-12)


def test_undershoot_and_negative_plants() -> None:
    # (3−s)/(s(s+2.5)): starts the wrong way; a negative amplitude turns all curves and no reading.
    up = time_view([factored(-1.0, [3], [0, -2.5])])
    down = time_view([factored(-1.0, [3], [0, -2.5])], scenario=Scenario(command_amplitude=-2.0, load_amplitude=-1.0))
    np.testing.assert_allclose(down.command, -2.0 * up.command, rtol=1e-12, atol=1e-15)
    before, after = up.cases[0].readings, down.cases[0].readings
    assert before["undershoot_pct"].value > 1.0
    for name in ("undershoot_pct", "overshoot_pct", "rise_time_s", "settling_time_s", "load_peak"):
        np.testing.assert_allclose(after[name].value, before[name].value, rtol=1e-10)
    np.testing.assert_allclose(after["peak_effort"].value, 2.0 * before["peak_effort"].value, rtol=1e-10)


def test_states_where_nothing_can_be_measured() -> None:
    # A zero at the origin: the final value is 0.
    readings = readings_of(factored(1.0, [], [-2]), factored(1.0, [0], [-1]))
    for name in ("overshoot_pct", "undershoot_pct", "rise_time_s", "settling_time_s"):
        assert readings[name].state == "absent"
    assert readings["load_peak"].state == "value"
    # An improper compensator: the effort begins with an impulse, the output does not.
    readings = readings_of(factored(1.0, [], [0, -2]), factored(1.0, [-3], []))
    assert readings["peak_effort"].state == "unbounded"
    assert readings["overshoot_pct"].state == "value"
    # L(∞) = −1: the answer to a step is an impulse.
    readings = readings_of(factored(-1.0, [-2], [-1]))
    assert readings["overshoot_pct"].state == "unbounded"
    readings = readings_of(factored(1.0, [-3], [0, 2]))
    assert {reading.state for reading in readings.values()} == {"unstable"}


def test_an_unstable_response_is_shown_until_it_leaves_the_sensible_range() -> None:
    view = time_view([factored(4.0, [], [0, -2]), factored(40.0, [], [0, -1, -2])])
    assert np.isfinite(view.command[0]).all()
    shown = np.isfinite(view.command[1])
    assert shown[:50].all()
    assert not np.any(np.diff(shown.astype(int)) > 0)
    assert np.nanmax(np.abs(view.command[1])) < 100.0


def test_direct_feedthrough_settles_at_once() -> None:
    readings = readings_of(factored(2.0, [], []))
    assert readings["settling_time_s"].value == 0.0
    assert readings["rise_time_s"].value == 0.0
    np.testing.assert_allclose(readings["peak_effort"].value, 1 / 3, rtol=1e-15)


def test_a_case_reads_the_same_alone_and_in_company() -> None:
    plants = [
        factored(4.0, [], [0, -2]),
        factored(10.0 * 900, [], [0, -2, *pair(30.0, 0.005)]),
        factored(1.0, [], [0, -2]),
        factored(3e6, [], [0, -3, -1e6]),
        factored(40.0, [], [0, -1, -2]),
    ]
    compensator = factored(0.3, [-1], [-9])
    together = time_view(plants, compensator)
    for case, plant in enumerate(plants):
        alone = readings_of(plant, compensator)
        for name, reading in together.cases[case].readings.items():
            assert reading.state == alone[name].state
            if reading.value is not None:
                np.testing.assert_allclose(reading.value, alone[name].value, rtol=1e-9, atol=1e-12, err_msg=name)


def test_readings_do_not_depend_on_what_is_shown() -> None:
    shown = time_view([factored(4.0, [], [0, -2])], scenario=Scenario("ramp", horizon_s=0.1)).cases[0].readings
    plain = time_view([factored(4.0, [], [0, -2])]).cases[0].readings
    assert shown == plain


def test_the_horizon_is_the_scenarios_where_it_names_one() -> None:
    view = time_view([factored(4.0, [], [0, -2])], scenario=Scenario(horizon_s=3.25))
    np.testing.assert_allclose(view.time_s[[0, -1]], [0.0, 3.25], rtol=1e-14)
    assert np.all(np.diff(view.time_s) > 0.0)
    assert view.command.shape == view.load.shape == view.effort.shape == (1, len(view.time_s))
