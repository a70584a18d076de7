"""The designs the benchmarks move: five plant cases, loop order 12, two modes of damping 0.005."""

from __future__ import annotations

from typing import Any

CASES = (("light", 1.25, 1.06), ("nominal", 1.0, 1.0), ("warm", 0.93, 0.98), ("heavy", 0.72, 0.9), ("stiff", 1.1, 1.15))


def live_design(step: int, dead_time_s: float = 0.0) -> dict[str, Any]:
    """A motion loop of order 12 with its lead moved to position `step`, as a hand would move it."""
    return {
        "format": "loopwright-design/1",
        "title": "Benchmark axis",
        "plant_cases": [_case(*case, dead_time_s) for case in CASES],
        "compensator": {
            "gain": 0.9,
            "stages": [
                {"kind": "lead_lag", "zero_rad_s": 9.0 * 1.003 ** (step % 97), "pole_rad_s": 120.0},
                {"kind": "proportional_integral", "corner_rad_s": 0.8},
                {"kind": "notch", "centre_rad_s": 210.0, "zero_damping": 0.05, "pole_damping": 0.5},
            ],
        },
        "requirements": [
            {"measure": "phase_margin_deg", "at_least": 40.0},
            {"measure": "gain_margin_db", "at_least": 6.0},
            {"measure": "peak_sensitivity", "at_most": 1.8},
            {"measure": "crossover_rad_s", "at_least": 8.0},
            {"measure": "overshoot_pct", "at_most": 35.0},
            {"measure": "settling_time_s", "at_most": 3.0},
            {"measure": "load_peak", "at_most": 2.0},
        ],
    }


def _case(name: str, gain: float, stiffness: float, dead_time_s: float) -> dict[str, Any]:
    """An integrating axis with friction, two actuator lags and two lightly damped modes: order 8."""
    first, second = 210.0 * stiffness, 640.0 * stiffness
    modes = [[-0.005 * first, first], [-0.005 * first, -first], [-0.005 * second, second], [-0.005 * second, -second]]
    poles: list[Any] = [0.0, -2.5, -400.0, -900.0, *modes]
    unity = 2.5 * 400.0 * 900.0 * first**2 * second**2
    model = {"kind": "factored", "gain": 12.0 * gain * unity, "poles": poles, "dead_time_s": dead_time_s}
    return {"name": name, "model": model}
