"""A sensible stage at a sensible place, chosen by what it is for."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

import numpy as np

from engine.design.assess import assess
from engine.design.document import Design
from engine.design.resolve import plants_of
from engine.design.wording import number
from engine.errors import DesignError
from engine.model.factored import Factored

PURPOSES = ("add phase", "hold against load", "quiet a resonance", "roll off noise", "bare corner")

_LIGHT_DAMPING = 0.3
_LEAST_LEAD_DEG, _MOST_LEAD_DEG, _PLAIN_LEAD_DEG = 20.0, 60.0, 35.0
_LEAD_MARGIN_DEG = 8.0
"""Added to what is missing, since the lead itself raises the crossover. Common practice, no source: 5 to 12°."""
_DECADE = 10.0
_NOTCH_POLE_DAMPING = 0.5


@dataclass(frozen=True, slots=True)
class Suggestion:
    """A stage of the document and the sentence that says why it stands where it does."""

    stage: dict[str, Any]
    why: str


def stage_for(design: Design, purpose: str) -> Suggestion:
    """The stage that serves a purpose on the design as it stands.

    Parameters
    ----------
    design : a parsed design; its nominal case decides the place
    purpose : one of `PURPOSES`

    Raises
    ------
    DesignError : the purpose is unknown
    """
    if purpose not in PURPOSES:
        raise DesignError("purpose", f"must be one of {', '.join(PURPOSES)}, is {purpose[:60]!r}")
    assessment = assess(design)
    plant = plants_of(design.plant_cases)[0]
    crossover, where = _crossover(assessment, plant)
    if purpose == "add phase":
        return _lead(design, assessment, crossover, where)
    if purpose == "hold against load":
        corner = _rounded(crossover / _DECADE)
        stage = {"kind": "proportional_integral", "corner_rad_s": corner}
        return Suggestion(stage, f"An integral action a decade below {where}, where it costs about 6° of phase.")
    if purpose == "quiet a resonance":
        return _notch(plant, crossover, where)
    if purpose == "roll off noise":
        stage = {"kind": "real_pole", "corner_rad_s": _rounded(crossover * _DECADE)}
        return Suggestion(stage, f"A pole a decade above {where}, where it costs about 6° of phase.")
    return Suggestion({"kind": "real_zero", "corner_rad_s": _rounded(crossover)}, f"A zero at {where}; drag it.")


def _crossover(assessment: dict[str, Any], plant: Factored) -> tuple[float, str]:
    """The nominal crossover, or the middle of the plant's corners where the loop has none."""
    crossings = [at["rad_s"] for at in assessment["cases"][0]["gain_crossovers"] if at["rad_s"]]
    reading = assessment["cases"][0]["readings"]["crossover_rad_s"]["value"]
    found = reading or (crossings[0] if crossings else None)
    if found:
        return float(found), f"the crossover, {number(found)} rad/s"
    corners = np.abs(np.concatenate([plant.zeros, plant.poles]))
    corners = corners[corners > 0]
    middle = float(np.exp(np.mean(np.log(corners)))) if corners.size else 1.0
    return middle, f"{number(middle)} rad/s, the middle of the plant's corners (the loop has no crossover)"


def _lead(design: Design, assessment: dict[str, Any], crossover: float, where: str) -> Suggestion:
    missing = _missing_phase_deg(design, assessment)
    wanted = _PLAIN_LEAD_DEG if missing is None else missing + _LEAD_MARGIN_DEG
    phase_deg = min(max(wanted, _LEAST_LEAD_DEG), _MOST_LEAD_DEG)
    sine = math.sin(math.radians(phase_deg))
    ratio = (1 + sine) / (1 - sine)
    # The lead lifts the loop by sqrt(ratio) at its centre; on a slope of −20 to −40 dB a decade that moves the
    # crossover up by ratio^(1/4) to ratio^(1/2): the lower end is where the phase is wanted.
    centre = crossover * ratio**0.25
    stage = {
        "kind": "lead_lag",
        "zero_rad_s": _rounded(centre / math.sqrt(ratio)),
        "pole_rad_s": _rounded(centre * math.sqrt(ratio)),
    }
    return Suggestion(stage, f"A lead of about {number(phase_deg, 2)}° just above {where}, which it raises.")


def _missing_phase_deg(design: Design, assessment: dict[str, Any]) -> float | None:
    rows = [
        row["at_least"] - row["reading"]["value"]
        for row in assessment["requirements"]
        if row["measure"] == "phase_margin_deg" and row.get("at_least") and row["reading"]["value"] is not None
    ]
    return max(rows) if rows else None


def _notch(plant: Factored, crossover: float, where: str) -> Suggestion:
    modes = [pole for pole in plant.poles.tolist() if pole.imag > 0 and abs(pole.real) < _LIGHT_DAMPING * abs(pole)]
    if not modes:
        stage = _notch_at(3.0 * crossover, 0.1)
        why = f"No lightly damped mode in the nominal plant: a notch above {where}; drag it to the resonance."
        return Suggestion(stage, why)
    mode = min(modes, key=lambda pole: abs(pole.real) / abs(pole))
    damping = abs(mode.real) / abs(mode)
    stage = _notch_at(abs(mode), max(damping, 0.01))
    why = f"A notch on the plant's least damped mode, {number(abs(mode))} rad/s with damping {number(damping, 2)}."
    return Suggestion(stage, why)


def _notch_at(centre_rad_s: float, zero_damping: float) -> dict[str, Any]:
    return {
        "kind": "notch",
        "centre_rad_s": _rounded(centre_rad_s, 5),
        "zero_damping": _rounded(zero_damping, 2),
        "pole_damping": max(_NOTCH_POLE_DAMPING, _rounded(3 * zero_damping, 2)),
    }


def _rounded(value: float, digits: int = 3) -> float:
    """A number as a person would write it."""
    return float(f"{value:.{digits - 1}e}")
