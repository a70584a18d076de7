"""`assess`: a design goes in, every reading and verdict comes out. The single source of every figure.

Pure and deterministic: the same design gives the same numbers from the command line, HTTP, the live socket and the
tests, because all of them call these two functions and nothing else.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any, Literal, TypeAlias

import numpy as np
from numpy.typing import NDArray

from engine.design.document import Actuator, Design, Requirement
from engine.design.headline import headline
from engine.design.measures import MEASURES
from engine.design.requirements import Judged, judge
from engine.design.resolve import loops_of
from engine.design.stage_facts import stage_facts
from engine.loop.frequency import CaseFrequency, FrequencyView, read_frequency
from engine.loop.loop_set import LoopSet
from engine.loop.reading import Reading, without_value
from engine.loop.time_response import Scenario, TimeView, read_time

FORMAT = "loopwright-assessment/1"
Verdict: TypeAlias = Literal["met", "not met", "not assessable"]

CURVES = ("omega_rad_s", "magnitude_db", "phase_deg", "time_s", "command", "load", "effort")
"""Names of the curve arrays; all but the two axes have one row a plant case."""


def assess(design: Design, curves: bool = False) -> dict[str, Any]:
    """Everything that can be said about a design, ready for JSON.

    Parameters
    ----------
    design : a parsed design
    curves : add `curves`: the sampled loop and responses, null where a curve is not shown

    Returns
    -------
    dict : `loopwright-assessment/1`; frequencies in rad/s, times in s
    """
    assessment, arrays = assess_with_arrays(design)
    if curves:
        assessment["curves"] = {name: _listed(array) for name, array in arrays.items()}
    return assessment


def assess_with_arrays(design: Design) -> tuple[dict[str, Any], dict[str, NDArray[np.float64]]]:
    """The assessment without curves, and the curves as arrays (NaN where a curve is not shown)."""
    loops = loops_of(design)
    frequency = read_frequency(loops)
    time = read_time(loops, frequency, scenario_of(design))
    readings = [
        {**in_frequency.readings, **in_time.readings}
        for in_frequency, in_time in zip(frequency.cases, time.cases, strict=True)
    ]
    judged = _judge_all(design, readings, frequency, loops)
    assessment = {
        "format": FORMAT,
        "verdict": verdict_of(judged, frequency),
        "headline": headline(design, judged, frequency),
        "requirements": [_row(design, *pair) for pair in zip(design.requirements, judged, strict=True)],
        "cases": [
            _case(
                design.plant_cases[index].name,
                frequency.cases[index],
                readings[index],
                time.cases[index].notices,
            )
            for index in range(loops.count)
        ],
        "stages": stage_facts(design.compensator, readings[0]),
        "notices": _notices(design, frequency, readings),
    }
    arrays = {
        "omega_rad_s": frequency.omega_rad_s,
        "magnitude_db": frequency.magnitude_db,
        "phase_deg": frequency.phase_deg,
        "time_s": time.time_s,
        "command": time.command,
        "load": time.load,
        "effort": time.effort,
    }
    return assessment, arrays


def scenario_of(design: Design) -> Scenario:
    """The scenario of the document as the responses take it."""
    part = design.scenario
    return Scenario(part.command.shape, part.command.amplitude, part.load.amplitude, part.horizon_s)


def responses_of(design: Design) -> TimeView:
    """The time responses alone."""
    loops = loops_of(design)
    return read_time(loops, read_frequency(loops), scenario_of(design))


def verdict_of(judged: list[Judged], frequency: FrequencyView) -> Verdict:
    """Any row not met: "not met"; else any not assessable: "not assessable"; else "met".

    A sheet without rows cannot vouch for an unstable loop: then the verdict is "not met".
    """
    if any(row.met is False for row in judged):
        return "not met"
    if any(row.met is None for row in judged):
        return "not assessable"
    if not judged and not all(case.stable for case in frequency.cases):
        return "not met"
    return "met"


def _judge_all(design: Design, readings: list[dict[str, Reading]], frequency: FrequencyView,
               loops: LoopSet) -> list[Judged]:  # fmt: skip
    if design.implementation.kind != "continuous":
        why = f"the {design.implementation.kind} implementation cannot be judged as built in this version"
        unjudged = Judged(without_value("not determinable", why), None, None, why)
        return [unjudged] * len(design.requirements)
    stable = [case.stable for case in frequency.cases]
    names = [case.name for case in design.plant_cases]
    everywhere = list(range(len(names)))
    return [
        judge(
            row,
            readings,
            stable,
            loops,
            [names.index(name) for name in row.cases] if row.cases else everywhere,
            unit_of(row.measure, design),
        )
        for row in design.requirements
    ]


def _row(design: Design, row: Requirement, judged: Judged) -> dict[str, Any]:
    measure = MEASURES[row.measure]
    return {
        **row.model_dump(mode="json", exclude_none=True),
        "label": measure.label,
        "unit": unit_of(row.measure, design),
        "reading": reading_json(judged.reading),
        "case": None if judged.case is None else design.plant_cases[judged.case].name,
        "slack": judged.slack,
        "shortfall": judged.shortfall,
        "met": judged.met,
        **({"limit": judged.limit} if row.mask is not None and judged.limit is not None else {}),
    }


def unit_of(measure: str, design: Design) -> str:
    """The unit of a measure; effort and load peaks carry the units of the design's signals."""
    if measure == "peak_effort":
        return design.signals.effort.unit
    if measure == "load_peak":
        return design.signals.output.unit
    return MEASURES[measure].unit


def _case(name: str, case: CaseFrequency, readings: Mapping[str, Reading],
          time_notices: tuple[str, ...]) -> dict[str, Any]:  # fmt: skip
    poles = case.closed_loop_poles
    return {
        "name": name,
        "stable": case.stable,
        "stability": case.stability,
        "unstable_poles": case.unstable_poles,
        "readings": {measure: reading_json(reading) for measure, reading in readings.items()},
        "gain_crossovers": [
            {"rad_s": _finite(at.rad_s), "signed_phase_margin_deg": at.signed_phase_margin_deg}
            for at in case.gain_crossovers
        ],
        "phase_crossovers": [
            {"rad_s": _finite(at.rad_s), "gain_db": _finite(at.gain_db)} for at in case.phase_crossovers
        ],
        "closed_loop_poles": None if poles is None else [[pole.real, pole.imag] for pole in poles.tolist()],
        "notices": [*case.notices, *time_notices],
    }


def reading_json(reading: Reading) -> dict[str, Any]:
    """A reading as the contract spells it."""
    spelled: dict[str, Any] = {"value": reading.value, "state": reading.state, "why": reading.why}
    if reading.at_rad_s is not None:
        spelled["at_rad_s"] = reading.at_rad_s
    if reading.at_s is not None:
        spelled["at_s"] = reading.at_s
    return spelled


def _notices(design: Design, frequency: FrequencyView, readings: list[dict[str, Reading]]) -> list[str]:
    notices = []
    if design.implementation.kind != "continuous":
        notices.append(
            f"The design is to be built {design.implementation.kind}; readings are those of the continuous "
            "compensator and no requirement is judged by them."
        )
    for index, case in enumerate(frequency.cases):
        if not case.stable:
            notices.append(f"{design.plant_cases[index].name}: {case.stability}.")
    notices += _limit_notices(design.actuator, design, readings)
    return notices


def _limit_notices(actuator: Actuator, design: Design, readings: list[dict[str, Reading]]) -> list[str]:
    """The effort peak against the actuator's limits; the linear response past them is not to be had."""
    allowed = [abs(limit) for limit in (actuator.low, actuator.high) if limit is not None]
    if not allowed:
        return []
    peaks = [(reading.value, index) for index, case in enumerate(readings)
             if (reading := case["peak_effort"]).value is not None]  # fmt: skip
    worst = max(peaks, default=None)
    if worst is None or worst[0] is None or worst[0] <= max(allowed):
        return []
    name = design.plant_cases[worst[1]].name
    return [f"The peak effort on {name} passes the actuator's limits: the linear response is not to be had."]


def _finite(number: float) -> float | None:
    return number if math.isfinite(number) else None


def _listed(array: NDArray[np.float64]) -> Any:
    if array.ndim == 1:
        return [float(item) if math.isfinite(item) else None for item in array.tolist()]
    return [_listed(row) for row in array]
