"""The references against closed forms and against each other, so that a wrong reference fails here."""

from __future__ import annotations

import numpy as np
import pytest
from mpmath import mp, mpc, mpf

from tests.outside import exact_polynomial as polynomial
from tests.outside import margins, peaks
from tests.outside.closed_loop import closed_loop_poles, unstable_poles_by_encirclement, unstable_poles_by_roots
from tests.outside.crossings import gain_crossings, phase_crossings
from tests.outside.delayed_responses import DelayedSeries
from tests.outside.loop import UNITY, Loop, Part
from tests.outside.responses import response
from tests.outside.sector import Axis
from tests.outside.step_measures import features, step_measures

TIGHT = mpf(10) ** -40


@pytest.fixture(autouse=True)
def _eighty_digits():
    with mp.workdps(80):
        yield


def loop_of(gain, zeros=(), poles=(), dead_time_s=0) -> Loop:
    roots = [tuple(mpc(x) for x in group) for group in (zeros, poles)]
    return Loop(UNITY, Part(mpf(gain), *roots), mpf(dead_time_s))


def near(got, want, tolerance=TIGHT):
    assert abs(got - want) <= tolerance * max(1, abs(want)), (mp.nstr(got, 30), mp.nstr(want, 30))


def test_roots_survive_a_spread_of_twelve_decades_and_a_triple_root():
    wide = [mpf(10) ** k * (-1) ** k for k in range(-6, 7)]
    found = sorted(polynomial.roots(polynomial.from_roots(wide)), key=abs)
    for got, want in zip(found, wide, strict=True):
        near(got / want, 1)
    triple = polynomial.roots(polynomial.from_roots([mpf(-1)] * 3 + [mpf(-2)]))
    assert max(min(abs(z + 1), abs(z + 2)) for z in triple) < TIGHT


def test_third_order_lag_has_its_closed_forms():
    # By hand: 3/(s+1)³ reaches −180° at √3 with gain 3/8, crosses 1 where 1 + ω² = 3^(2/3); top of |S| 11/5 at √7/2.
    loop = loop_of(3, poles=[-1, -1, -1])
    (gain,), (phase,) = gain_crossings(loop), phase_crossings(loop)
    near(gain.rad_s, mp.sqrt(mp.cbrt(9) - 1))
    near(gain.signed_phase_margin_deg, 180 - 3 * mp.degrees(mp.atan(gain.rad_s)))
    near(phase.rad_s, mp.sqrt(3))
    near(mpf(10) ** (phase.gain_db / 20), mpf(3) / 8)
    top, where = peaks.supremum(loop, "sensitivity")
    near(top, mpf(11) / 5)
    near(where, mp.sqrt(7) / 2)
    assert unstable_poles_by_roots(loop) == unstable_poles_by_encirclement(loop) == 0
    for pole in closed_loop_poles(loop):
        near((pole + 1) ** 3, -3)


def test_delayed_integrator_has_its_closed_forms():
    # By hand: e^{−s}/(2s) crosses 0 dB at 1/2 with 90° − (1/2) rad, and −180° at (2k+1/2)π with gain 1/((4k+1)π).
    loop = loop_of(0.5, poles=[0], dead_time_s=1)
    (gain,) = gain_crossings(loop)
    near(gain.signed_phase_margin_deg, 90 - mp.degrees(mpf(1) / 2))
    near(margins.delay_margin_s(loop, [gain]), mp.pi - 1)
    listed = phase_crossings(loop, mpf(100))
    assert len(listed) == 16
    for k, crossing in enumerate(listed):
        near(crossing.rad_s, (2 * k + mpf(1) / 2) * mp.pi)
        near(mpf(10) ** (-crossing.gain_db / 20), (4 * k + 1) * mp.pi)
    # Skogestad, J. Process Control 13 (2003), section 4: Ms = 1.59
    near(peaks.supremum(loop, "sensitivity")[0], mpf("1.59049"), mpf("5e-6"))


@pytest.mark.parametrize("gain", [0.2, 1.0, 1.5, 1.6, 5.0, 9.0])
def test_encirclements_count_the_unstable_poles_of_a_delayed_integrator(gain):
    # By hand: k·e^{−s}/s gains a pair of unstable poles each time k passes (2m + 1/2)π.
    loop = loop_of(gain, poles=[0], dead_time_s=1)
    want = 2 * sum(1 for m in range(5) if gain > (2 * m + 0.5) * np.pi)
    assert unstable_poles_by_encirclement(loop) == want


def test_delayed_peaks_and_bandwidth_join_the_rational_ones_as_the_delay_vanishes():
    plain, delayed = (loop_of(7, [-10, -10], [0, 0, 0], theta) for theta in (0, 1e-14))
    for kind in peaks.KINDS:
        near(peaks.supremum(delayed, kind)[0], peaks.supremum(plain, kind)[0], mpf("1e-11"))
    near(peaks.bandwidth_rad_s(delayed), peaks.bandwidth_rad_s(plain), mpf("1e-11"))
    assert unstable_poles_by_encirclement(delayed) == unstable_poles_by_roots(plain) == 0


def test_enclosures_hold_what_they_enclose():
    loop = loop_of(-40, [2, mpc(-0.01, 5), mpc(-0.01, -5)], [0, -1, mpc(-0.001, 3), mpc(-0.001, -3), 0.5], 0.3)
    axis = Axis(loop)
    cuts = np.geomspace(1e-3, 1e3, 300)
    box = axis.enclose(cuts[:-1], cuts[1:])
    for part in np.linspace(0, 1, 23):
        inside = cuts[:-1] + part * (cuts[1:] - cuts[:-1])
        value, angle = axis.value(inside), axis.phase(inside)
        assert np.all((box.low <= np.abs(value)) & (np.abs(value) <= box.high))
        assert np.all((box.least_angle <= angle) & (angle <= box.greatest_angle))
        exact = np.array([complex(loop.at(mpc(0, w))) for w in inside])
        np.testing.assert_allclose(value, exact, rtol=1e-11)


def test_second_order_step_has_its_closed_forms():
    # By hand: overshoot exp(−πζ/√(1−ζ²)) and y = 1 − e^{−ζt}(cos ωd t + ζ/√(1−ζ²)·sin ωd t) for ωn = 1.
    zeta = mpf("0.3")
    loop = Loop(UNITY, Part(mpf(1), (), (mpc(0), mpc(-2 * zeta))), mpf(0))
    step = response(loop, "command")
    damped = mp.sqrt(1 - zeta**2)
    for t in (mpf("0.1"), mpf(3), mpf(20)):
        near(step.value(t), 1 - mp.exp(-zeta * t) * (mp.cos(damped * t) + zeta / damped * mp.sin(damped * t)))
    measures = step_measures(features(step))
    near(measures["overshoot_pct"], 100 * mp.exp(-mp.pi * zeta / damped), mpf(10) ** -30)
    edge = measures["settling_time_s"]
    near(abs(step.value(edge) - 1), mpf("0.02"), mpf(10) ** -30)
    assert all(abs(step.value(edge + mpf(k) / 50) - 1) < mpf("0.02") for k in range(1, 2000))


def test_triple_closed_loop_pole_has_its_closed_form():
    # By hand: 1/((s+1)³ − 1) closes to 1/(s+1)³, whose step is 1 − e^{−t}(1 + t + t²/2).
    half = mp.sqrt(3) / 2
    loop = Loop(UNITY, Part(mpf(1), (), (mpc(0), mpc(-1.5, half), mpc(-1.5, -half))), mpf(0))
    step = response(loop, "command")
    for t in (mpf("0.5"), mpf(2), mpf(9)):
        near(step.value(t), 1 - mp.exp(-t) * (1 + t + t * t / 2), mpf(10) ** -20)


def test_ramp_is_the_integral_of_the_step():
    loop = loop_of(6, [-2], [-1, mpc(-0.5, 3), mpc(-0.5, -3)])
    step, ramp = response(loop, "command"), response(loop, "command", shape="ramp")
    for t in (mpf("0.3"), mpf(4)):
        near(ramp.rate(t), step.value(t), mpf(10) ** -30)
    near(ramp.value(mpf(0)), 0, mpf(10) ** -30)


def test_delayed_integrator_step_is_piecewise_polynomial():
    # By hand, method of steps, θ = 1, k = 1/2: y = 0, then (t−1)/2, then (t−1)/2 − (t−2)²/8, …
    series = DelayedSeries(loop_of(0.5, poles=[0], dead_time_s=1), "command")
    near(series.value(mpf("0.5")), 0)
    near(series.value(mpf("1.5")), mpf("0.25"))
    near(series.value(mpf("2.5")), mpf("0.75") - mpf("0.25") / 8)
    near(series.value(mpf("3.5")), mpf("1.25") - mpf("2.25") / 8 + mpf("0.125") / 48)


def test_delayed_series_joins_the_rational_response_as_the_delay_vanishes():
    poles = [-1, 0, mpc(-0.25, 5), mpc(-0.25, -5)]
    plain, delayed = loop_of(1, [-3], poles), loop_of(1, [-3], poles, 2e-3)
    for signal in ("command", "load", "effort"):
        want = response(plain, signal).value(mpf("0.05"))
        got = DelayedSeries(delayed, signal).value(mpf("0.05"))
        near(got, want, mpf("4e-3"))


def test_series_and_modal_sum_of_a_delayed_loop_agree():
    # Two derivations of one response: finite series, and residues at closed-loop roots found by Newton from the
    # Lambert function (k·e^{−s}/s closes at s = W_m(−k), Corless et al. 1996).
    k = mpf("0.5")
    series = DelayedSeries(loop_of(0.5, poles=[0], dead_time_s=1), "command")
    roots = [mp.lambertw(-k, m) for m in range(-40, 41)]
    t = mpf(12)
    # 1 + L = 0 at λ; residue of T/s is −1/(λ·L'/L) = 1/(λ(1/λ + 1)) = 1/(1 + λ), with a minus sign from L = −1.
    modal = 1 - mp.re(mp.fsum(mp.exp(r * t) / (1 + r) for r in roots))
    near(series.value(t), modal, mpf(10) ** -15)
