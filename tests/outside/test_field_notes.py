"""Identities and traps that the trade knows, each by its closed form.

The worked examples that go with them are in test_worked_examples.py.
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from mpmath import mp, mpf

from tests.outside.agreement import disagreements, time_disagreements
from tests.outside.designs import assessed, case_of, design_of, factored, value
from tests.outside.record import record


def close(got: float, want: float, rtol: float = 1e-10) -> None:
    np.testing.assert_allclose(got, float(want), rtol=rtol)


# --- identities -------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(("ratio", "degrees"), [(3.0, 30.0), (10.0, 54.9), (20.0, 64.8)])
def test_a_lead_of_ratio_a_peaks_at_its_geometric_middle(ratio, degrees):
    # Exact: φmax = asin((a−1)/(a+1)) at √(z·p), 20·log10 a at high frequency. a = 3: 30°, 9.54 dB; 20: 65°, 26 dB.
    lead = {"kind": "lead_lag", "zero_rad_s": 2.0, "pole_rad_s": 2.0 * ratio}
    (facts,) = assessed(design_of(factored(1, poles=[-1]), stages=[lead]))["stages"]
    close(facts["peak_phase_deg"], math.degrees(math.asin((ratio - 1) / (ratio + 1))))
    close(facts["at_rad_s"], 2 * math.sqrt(ratio))
    close(facts["high_frequency_gain_db"], 20 * math.log10(ratio))
    assert abs(facts["peak_phase_deg"] - degrees) < 0.05


@pytest.mark.parametrize("zeta", [0.05, 0.2, 0.5, 0.7, 0.95])
def test_standard_second_order(zeta):
    # Exact, ω²/(s(s+2ζω)): PM = atan(2ζ/√(√(1+4ζ⁴)−2ζ²)), overshoot exp(−πζ/√(1−ζ²)).
    omega = 3.0
    case = case_of(design_of(factored(omega**2, poles=[0, -2 * zeta * omega])))
    close(
        value(case, "phase_margin_deg"),
        math.degrees(math.atan(2 * zeta / math.sqrt(math.sqrt(1 + 4 * zeta**4) - 2 * zeta**2))),
    )
    close(value(case, "overshoot_pct"), 100 * math.exp(-math.pi * zeta / math.sqrt(1 - zeta**2)), 1e-9)
    close(value(case, "least_damping"), zeta)


def test_damping_is_about_a_hundredth_of_the_phase_margin():
    # Common practice, no source: good to 0.07 below 60 degrees.
    for zeta in (0.1, 0.3, 0.5):
        case = case_of(design_of(factored(1, poles=[0, -2 * zeta])))
        assert abs(value(case, "phase_margin_deg") / 100 - zeta) < 0.07


def test_integrator_with_two_equal_lags():
    # Exact: 1/(s(s+1)²) has gain margin 2 at 1 and phase margin 21.3864° where x³ + x = 1. Also a trap: the phase
    # crossover falls exactly on a point of any decade grid.
    case = case_of(design_of(factored(1, poles=[0, -1, -1])))
    close(value(case, "gain_margin_db"), 20 * math.log10(2))
    close(case["phase_crossovers"][0]["rad_s"], 1.0)
    with mp.workdps(40):
        omega = mp.findroot(lambda x: x**3 + x - 1, mpf("0.68"))
        margin = 90 - 2 * mp.degrees(mp.atan(omega))
    close(value(case, "crossover_rad_s"), omega)
    close(value(case, "phase_margin_deg"), margin)
    assert abs(value(case, "phase_margin_deg") - 21.3864) < 5e-5


def test_ultimate_gain_of_a_delayed_lag():
    # Exact: e^{−s}/(s+1) reaches −180° where ω + atan ω = π, with gain 1/√(1+ω²): 2.261826 at 2.028758.
    case = case_of(design_of(factored(1, poles=[-1], dead_time_s=1.0)))
    with mp.workdps(40):
        omega = mp.findroot(lambda w: w + mp.atan(w) - mp.pi, mpf(2))
        gain = mp.sqrt(1 + omega**2)
    close(case["phase_crossovers"][0]["rad_s"], omega)
    close(value(case, "gain_margin_db"), 20 * mp.log10(gain))
    assert abs(gain - mpf("2.261826")) < 5e-7
    assert abs(omega - mpf("2.028758")) < 5e-7


def test_three_equal_lags():
    # Exact: 3/(s+1)³ has gain margin 8/3 at √3, |L| = 1 at √(9^{1/3} − 1), peak sensitivity 11/5 at √7/2.
    case = case_of(design_of(factored(3, poles=[-1, -1, -1])))
    close(value(case, "gain_margin_db"), 20 * math.log10(8 / 3))
    close(case["phase_crossovers"][0]["rad_s"], math.sqrt(3))
    crossover = math.sqrt(9 ** (1 / 3) - 1)
    close(value(case, "crossover_rad_s"), crossover)
    close(value(case, "phase_margin_deg"), 180 - 3 * math.degrees(math.atan(crossover)))
    close(value(case, "peak_sensitivity"), 11 / 5)
    close(case["readings"]["peak_sensitivity"]["at_rad_s"], math.sqrt(7) / 2, 1e-6)


def test_dead_time_costs_its_angle_at_every_crossover():
    # Exact: 57.3·ω·τ degrees.
    without = _stepped_over_mode()
    with_it = _stepped_over_mode()
    tau = 0.002
    with_it["plant_cases"][0]["model"]["dead_time_s"] = tau
    pairs = zip(case_of(without)["gain_crossovers"], case_of(with_it)["gain_crossovers"], strict=True)
    for a, b in pairs:
        close(b["rad_s"], a["rad_s"])
        lost = (a["signed_phase_margin_deg"] - b["signed_phase_margin_deg"]) % 360
        close(lost, math.degrees(a["rad_s"] * tau), 1e-9)


# --- traps ------------------------------------------------------------------------------------------------------


def _stepped_over_mode() -> dict:
    # 400/(s(s/5+1)(s²/10⁶ + 2·0.0005·s/1000 + 1)), the mode as a stage
    mode = {"kind": "complex_poles", "natural_rad_s": 1000.0, "damping": 0.0005}
    return design_of(factored(2000, poles=[0, -5]), stages=[mode])


def test_trap_1_a_grid_steps_over_a_mode():
    design = _stepped_over_mode()
    case = case_of(design)
    assert case["stable"]
    assert len(case["gain_crossovers"]) == 3
    margins = [c["signed_phase_margin_deg"] for c in case["gain_crossovers"]]
    assert abs(margins[1] + 29.6) < 0.05
    assert abs(margins[2] + 149.6) < 0.05
    # Its peak: +6.02 dB
    at_mode = {"measure": "loop_gain_db", "over_rad_s": [900, 1100], "at_most": 0}
    row = assessed(design | {"requirements": [at_mode]})["requirements"][0]
    assert abs(row["reading"]["value"] - 6.02) < 0.005
    assert disagreements(record(design), case) == []


@pytest.mark.parametrize(("factor", "crossings"), [(1 + 1e-9, 2), (1 - 1e-9, 0)])
def test_trap_2_nearly_tangent_crossings(factor, crossings):
    # Exact: ω0²/(s²+2ζω0s+ω0²) has its greatest gain 1/(2ζ√(1−ζ²)); a billionth more is crossed twice, less never.
    zeta, omega = 0.05, 40.0
    gain = factor * 2 * zeta * math.sqrt(1 - zeta**2)
    mode = {"kind": "complex_poles", "natural_rad_s": omega, "damping": zeta}
    design = design_of(factored(gain), stages=[mode])
    case = case_of(design)
    assert len(case["gain_crossovers"]) == crossings
    assert disagreements(record(design), case) == []


def test_trap_3_delay_margin_is_not_at_the_smallest_phase_margin():
    # By the definition: least (margin mod 360°)/ω. Here 17° at 1 rad/s allow 0.3 s of delay, but −150° (210° to go
    # round) at the mode's 30 rad/s only 0.12 s.
    mode = {"kind": "complex_poles", "natural_rad_s": 30.0, "damping": 2.8e-4}
    design = design_of(factored(1.0, poles=[0, -0.3]), stages=[mode])
    case = case_of(design)
    crossovers = case["gain_crossovers"]
    assert len(crossovers) == 3
    times = [math.radians(c["signed_phase_margin_deg"] % 360) / c["rad_s"] for c in crossovers]
    close(value(case, "delay_margin_s"), min(times))
    smallest = min(crossovers, key=lambda c: abs(c["signed_phase_margin_deg"]))
    assert smallest is crossovers[0]
    assert times[0] > 2 * min(times)
    assert disagreements(record(design), case) == []


def test_trap_4_a_pade_approximation_is_no_margin_method():
    # Exact: e^{−s}/(2s) has gain margin π; with (1−s/2)/(1+s/2) in place of the delay it would be 4.
    true = case_of(design_of(factored(0.5, poles=[0], dead_time_s=1.0)))
    close(10 ** (value(true, "gain_margin_db") / 20), math.pi)
    approximated = case_of(design_of(factored(-0.5, zeros=[2], poles=[0, -2])))
    close(10 ** (value(approximated, "gain_margin_db") / 20), 4)


def test_trap_5_dead_time_crosses_endlessly_often_and_says_so():
    case = case_of(design_of(factored(0.5, poles=[0], dead_time_s=1.0)))
    listed = [c["rad_s"] for c in case["phase_crossovers"]]
    np.testing.assert_allclose(listed, (2 * np.arange(len(listed)) + 0.5) * math.pi, rtol=1e-10)
    assert any("endless" in notice for notice in case["notices"])


def test_trap_6_twelve_equal_lags_keep_their_digits():
    # Exact: (s+1)¹² + k closes at −1 + k^{1/12}·e^{jπ(2m+1)/12}. Expanding scatters the open poles by 0.09.
    k = 1e-3
    case = case_of(design_of(factored(k, poles=[-1] * 12)))
    radius = k ** (1 / 12)
    want = [-1 + radius * np.exp(1j * math.pi * (2 * m + 1) / 12) for m in range(12)]
    got = [complex(*p) for p in case["closed_loop_poles"]]
    for pole in want:
        assert min(abs(pole - p) for p in got) < 1e-9
    expanded = {"kind": "polynomial", "numerator": [k], "denominator": [math.comb(12, i) for i in range(13)]}
    same = case_of(design_of(expanded))
    assert same["stable"]
    assert same["readings"]["gain_margin_db"]["value"] == pytest.approx(value(case, "gain_margin_db"), rel=1e-9)


def test_trap_6_poles_over_six_decades_answer_right():
    lead = {"kind": "lead_lag", "zero_rad_s": 30.0, "pole_rad_s": 3e4}
    design = design_of(factored(1e5, poles=[-1e-3, -1.0, -1e3]), gain=3.0, stages=[lead])
    reference, case = record(design, with_time=True), case_of(design)
    assert disagreements(reference, case) == []
    assert reference["time"]
    assert time_disagreements(reference, case) == []


def test_trap_7_margins_at_zero_and_at_infinity():
    # Exact: 2/(s−1) has L(0) = −2; 0.5(1−s)/(1+s) has L(∞) = −1/2. No finite grid finds either.
    at_zero = case_of(design_of(factored(2, poles=[1])))
    close(value(at_zero, "gain_reduction_margin_db"), 20 * math.log10(2))
    assert at_zero["readings"]["gain_reduction_margin_db"]["at_rad_s"] == 0
    assert at_zero["phase_crossovers"][0]["rad_s"] == 0
    at_infinity = case_of(design_of(factored(-0.5, zeros=[1], poles=[-1])))
    close(value(at_infinity, "gain_margin_db"), 20 * math.log10(2))
    assert at_infinity["phase_crossovers"][-1]["rad_s"] is None


def test_trap_7_a_delayed_biproper_loop_is_limited_at_infinity():
    # By the definition: with dead time and a biproper loop 1/|L(∞)| limits the gain.
    case = case_of(design_of(factored(0.25, zeros=[-40], poles=[-1], dead_time_s=1e-4)))
    close(value(case, "gain_margin_db"), 20 * math.log10(4), 1e-6)


@pytest.mark.parametrize("root", [2.0, 0.0])
def test_trap_8_a_cancelled_unstable_mode_stays_visible(root):
    # Exact: (s−a)/(s+3)·1/((s−a)(s+1)) hides a mode at a ≥ 0 that L does not show.
    hidden = {"kind": "rational", "zeros": [[root, 0.0]], "poles": [[-3.0, 0.0]], "gain": 1.0}
    case = case_of(design_of(factored(2, poles=[root, -1]), stages=[hidden]))
    assert not case["stable"]
    assert any(abs(complex(*p) - root) < 1e-12 for p in case["closed_loop_poles"])
    assert case["readings"]["phase_margin_deg"]["state"] == "unstable"


def test_trap_8_a_cancelled_feeble_mode_is_felt_by_the_load():
    # A notch right on the plant's mode: T does not show it, P·S rings with it for as long as it would alone.
    mode = [-0.05 + 50j, -0.05 - 50j]
    notch = {"kind": "rational", "zeros": [[m.real, m.imag] for m in mode], "poles": [[-50, 0], [-50, 0]], "gain": 1.0}
    design = design_of(factored(2500 * 4, poles=[0, *mode]), stages=[notch])
    reference, case = record(design, with_time=True), case_of(design)
    assert disagreements(reference, case) == []
    assert time_disagreements(reference, case) == []
    assert value(case, "load_settling_time_s") > 10 * value(case, "settling_time_s")
    assert value(case, "least_damping") == pytest.approx(0.001, rel=1e-3)
