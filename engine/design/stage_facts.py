"""What each stage does, as numbers for the sentences in the drawer and the hand-over."""

from __future__ import annotations

import cmath
import math
from collections.abc import Mapping
from typing import Any

from engine.design import document as doc
from engine.design.resolve import stage_of
from engine.loop.reading import Reading
from engine.model.factored import Factored

TRADE_NAMES = {
    "proportional_integral": "proportional-integral",
    "integrator": "integrator",
    "real_zero": "zero",
    "real_pole": "pole",
    "complex_zeros": "pair of zeros",
    "complex_poles": "pair of poles",
    "notch": "notch",
    "rational": "rational stage",
}


def trade_name(stage: Any) -> str:
    """What the trade calls a stage: its kind, except that lead and lag are told apart."""
    if isinstance(stage, doc.LeadLag):
        return "lead" if stage.zero_rad_s <= stage.pole_rad_s else "lag"
    return TRADE_NAMES[stage.kind]


def stage_facts(compensator: doc.Compensator, nominal: Mapping[str, Reading]) -> list[dict[str, Any]]:
    """Facts of every stage in order, resting ones included.

    Parameters
    ----------
    compensator : the compensator as written
    nominal : readings of the nominal case; its crossover is where gain and phase of each stage are told

    Returns
    -------
    list of dict : `kind`, `name`, `trade_name`, `enabled`, then what applies: `ratio`, `peak_phase_deg` at
        `at_rad_s`, `high_frequency_gain_db` (∞ against DC), `depth_db`, and `crossover_rad_s` with
        `phase_at_crossover_deg` and `gain_at_crossover_db`
    """
    crossover = nominal["crossover_rad_s"].value
    return [
        {
            "kind": stage.kind,
            "name": stage.name,
            "trade_name": trade_name(stage),
            "enabled": stage.enabled,
            **_own_facts(stage),
            **_at_crossover(stage_of(stage), crossover),
        }
        for stage in compensator.stages
    ]


def _own_facts(stage: Any) -> dict[str, float]:
    if isinstance(stage, doc.LeadLag):
        ratio = stage.pole_rad_s / stage.zero_rad_s
        return {
            "ratio": ratio,
            "peak_phase_deg": math.degrees(math.asin((ratio - 1) / (ratio + 1))),
            "at_rad_s": math.sqrt(stage.zero_rad_s) * math.sqrt(stage.pole_rad_s),
            "high_frequency_gain_db": 20 * math.log10(ratio),
        }
    if isinstance(stage, doc.Notch) and stage.zero_damping > 0:
        return {"depth_db": 20 * math.log10(stage.pole_damping / stage.zero_damping)}
    return {}


def _at_crossover(stage: Factored, crossover_rad_s: float | None) -> dict[str, float]:
    if crossover_rad_s is None or crossover_rad_s <= 0:
        return {}
    s = complex(0.0, crossover_rad_s)
    up = [s - root for root in stage.zeros.tolist()]
    down = [s - root for root in stage.poles.tolist()]
    if not (all(up) and all(down)):
        return {}
    phase_rad = sum(map(cmath.phase, up)) - sum(map(cmath.phase, down)) + (math.pi if stage.gain < 0 else 0.0)
    level = math.log10(abs(stage.gain)) + sum(math.log10(abs(a)) for a in up) - sum(math.log10(abs(a)) for a in down)
    return {
        "crossover_rad_s": crossover_rad_s,
        "phase_at_crossover_deg": math.degrees(phase_rad),
        "gain_at_crossover_db": 20 * level,
    }
