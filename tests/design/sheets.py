"""Small designs for the tests of the design floor."""

from __future__ import annotations

from typing import Any


def servo(**changes: Any) -> dict[str, Any]:
    """A positioning axis with two plant cases: stable, two rows, one of them missed."""
    design: dict[str, Any] = {
        "format": "loopwright-design/1",
        "title": "Turntable axis",
        "plant_cases": [
            {"name": "empty", "model": {"kind": "factored", "gain": 90.0, "poles": [0, -7, -60]}},
            {"name": "loaded", "model": {"kind": "expression", "text": "60/(s*(s+5)*(s+60))"}},
        ],
        "compensator": {
            "gain": 40.0,
            "stages": [{"kind": "lead_lag", "zero_rad_s": 6.0, "pole_rad_s": 50.0}],
        },
        "requirements": [
            {"measure": "phase_margin_deg", "at_least": 45.0, "reason": "wear of the gearbox"},
            {"measure": "crossover_rad_s", "at_least": 500.0, "reason": "never to be had"},
        ],
    }
    return {**design, **changes}
