"""Published and hand-made examples; the source of each stands in worked_examples.json."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest

from tests.loop.loops import factored, number, read, states

EXAMPLES = json.loads((Path(__file__).parent / "worked_examples.json").read_text(encoding="utf-8"))


@pytest.mark.parametrize("example", EXAMPLES, ids=[entry["source"][:60] for entry in EXAMPLES])
def test_example(example):
    case = read(factored(example["gain"], example["zeros"], example["poles"], example.get("dead_time_s", 0.0)))
    assert case.stability == "stable"
    for name, want in example["readings"].items():
        np.testing.assert_allclose(number(case, name), want, rtol=example["digits"], err_msg=name)
    for name, want in example.get("at", {}).items():
        at = case.readings[name].at_rad_s
        if want is None:
            assert at is None
            assert "∞" in case.readings[name].why
        else:
            # A place where a value is extreme is known half as well as the value; crossings are exact.
            np.testing.assert_allclose(at, want, rtol=max(example["digits"], 1e-9) * 10, err_msg=name)
    expected = example.get("states", {})
    assert states(case, *expected) == list(expected.values())


# Lundberg's and every servo text's second-order loop w²/(s(s+2ζw)): PM = atan(2ζ/√(√(1+4ζ⁴)−2ζ²)) (exact).
@pytest.mark.parametrize("damping", [0.05, 0.2, 0.5, 0.7071067811865476, 1.0, 3.0])
def test_standard_second_order_margin(damping):
    case = read(factored(49.0, [], [0, -14.0 * damping]))
    want = np.degrees(np.arctan(2 * damping / np.sqrt(np.sqrt(1 + 4 * damping**4) - 2 * damping**2)))
    np.testing.assert_allclose(number(case, "phase_margin_deg"), want, rtol=1e-12)
    # |T| = 1/|1 − u² + 2jζu|, peak 1/(2ζ√(1−ζ²)) below ζ = 1/√2, else 1 at ω = 0 (exact).
    peak = 1 / (2 * damping * np.sqrt(1 - damping**2)) if damping < 0.7 else 1.0
    np.testing.assert_allclose(number(case, "peak_complementary_sensitivity"), peak, rtol=1e-12)
    # Bandwidth w·√(1−2ζ²+√(4ζ⁴−4ζ²+2)) (exact).
    band = 7.0 * np.sqrt(1 - 2 * damping**2 + np.sqrt(4 * damping**4 - 4 * damping**2 + 2))
    np.testing.assert_allclose(number(case, "bandwidth_rad_s"), band, rtol=1e-12)
    np.testing.assert_allclose(number(case, "least_damping"), min(damping, 1.0), rtol=1e-9)


# Lead of ratio a: greatest phase asin((a−1)/(a+1)) at √(z·p), gain there √a (exact). On a double integrator
# scaled to cross there, that is the phase margin.
@pytest.mark.parametrize("ratio", [3.0, 10.0, 20.0])
def test_lead_on_a_double_integrator(ratio):
    zero, pole = 4.0, 4.0 * ratio
    middle = np.sqrt(zero * pole)
    lead = factored(ratio, [-zero], [-pole])
    case = read(factored(middle**2 / np.sqrt(ratio), [], [0, 0]), lead)
    np.testing.assert_allclose(number(case, "crossover_rad_s"), middle, rtol=1e-13)
    np.testing.assert_allclose(
        number(case, "phase_margin_deg"), np.degrees(np.arcsin((ratio - 1) / (ratio + 1))), rtol=1e-12
    )
