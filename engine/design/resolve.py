"""From what was written to what is computed with: models and stages become gain, zeros, poles and dead time."""

from __future__ import annotations

import math
from collections.abc import Iterable
from functools import lru_cache
from typing import Any

import numpy as np

from engine.design import document as doc
from engine.errors import DesignError, Fault
from engine.loop.loop_set import LoopSet
from engine.model import stages
from engine.model.expression import from_expression
from engine.model.factored import ComplexArray, Factored
from engine.model.factored_entry import factored_model
from engine.model.polynomial import from_coefficients
from engine.model.state_space import from_state_space

MOST_DECADES = 60
"""Low-frequency gains of plant and compensator stay within 1e±60, so that no product of theirs can overflow."""
_NO_ROOTS: ComplexArray = np.empty(0, dtype=np.complex128)


@lru_cache(maxsize=512)
def factored_of(model: Any) -> Factored:
    """The factored form of a model of the document; faults are relative to the model."""
    match model:
        case doc.FactoredModel():
            return factored_model(model.gain, model.zeros, model.poles, model.dead_time_s)
        case doc.PolynomialModel():
            return from_coefficients(model.numerator, model.denominator, model.dead_time_s)
        case doc.StateSpaceModel():
            return from_state_space(model.a, model.b, model.c, model.d, model.dead_time_s)
        case doc.ExpressionModel():
            written = from_expression(model.text)
            return Factored(written.gain, written.zeros, written.poles, written.dead_time_s + model.dead_time_s)
    raise DesignError("kind", f"{type(model).__name__} has no factored form")


@lru_cache(maxsize=64)
def plants_of(plant_cases: tuple[doc.PlantCase, ...]) -> tuple[Factored, ...]:
    """The plants in order. The same cases give the same objects, so that what depends on them alone is kept."""
    return tuple(factored_of(case.model) for case in plant_cases)


def stage_of(stage: Any) -> Factored:
    """The factored form of one stage; faults are relative to the stage."""
    match stage:
        case doc.LeadLag():
            return stages.lead_lag(stage.zero_rad_s, stage.pole_rad_s)
        case doc.ProportionalIntegral():
            return stages.proportional_integral(stage.corner_rad_s)
        case doc.Integrator():
            return stages.integrator()
        case doc.RealZero():
            return stages.real_zero(stage.corner_rad_s)
        case doc.RealPole():
            return stages.real_pole(stage.corner_rad_s)
        case doc.ComplexZeros():
            return stages.complex_zeros(stage.natural_rad_s, stage.damping)
        case doc.ComplexPoles():
            return stages.complex_poles(stage.natural_rad_s, stage.damping)
        case doc.Notch():
            return stages.notch(stage.centre_rad_s, stage.zero_damping, stage.pole_damping)
        case doc.RationalStage():
            return stages.rational(stage.zeros, stage.poles, stage.gain)
    raise DesignError("kind", f"{type(stage).__name__} is not a stage")


def compensator_of(compensator: doc.Compensator) -> Factored:
    """C(s): the gain times the enabled stages, nothing cancelled."""
    parts = [stage_of(stage) for stage in compensator.stages if stage.enabled]
    gain = compensator.gain
    for part in parts:
        gain *= part.gain
    return Factored(
        gain,
        np.concatenate([_NO_ROOTS, *(part.zeros for part in parts)]),
        np.concatenate([_NO_ROOTS, *(part.poles for part in parts)]),
    )


def loops_of(design: doc.Design) -> LoopSet:
    """Every plant case with the design's compensator."""
    return LoopSet(plants_of(design.plant_cases), compensator_of(design.compensator))


def _in_range(model: Factored, where: str) -> Factored:
    """The model, if its gain at low frequencies is one that products of two can be computed with."""
    sizes = np.abs(np.concatenate([model.zeros, model.poles]))
    signs = np.concatenate([np.ones(len(model.zeros)), -np.ones(len(model.poles))])
    moving = sizes > 0
    decades = math.log10(abs(model.gain)) + float(np.sum(signs[moving] * np.log10(sizes[moving])))
    if abs(decades) > MOST_DECADES:
        what = (
            f"makes a low-frequency gain of 1e{decades:.0f}; it must lie between 1e-{MOST_DECADES} and 1e{MOST_DECADES}"
        )
        raise DesignError(where, what)
    return model


def check_models(plant_cases: Iterable[doc.PlantCase]) -> list[Fault]:
    """The faults that only show when the plants are factored."""
    return [
        fault
        for index, case in enumerate(plant_cases)
        for fault in _faults(_plant_in_range, case.model, f"plant_cases[{index}].model")
    ]


def check_stages(compensator: doc.Compensator) -> list[Fault]:
    """The faults that only show when the stages are factored; resting stages are held to the same."""
    faults = [
        fault
        for index, stage in enumerate(compensator.stages)
        for fault in _faults(stage_of, stage, f"compensator.stages[{index}]")
    ]
    return faults or list(_faults(_compensator_in_range, compensator, "compensator"))


@lru_cache(maxsize=512)
def _plant_in_range(model: Any) -> Factored:
    return _in_range(factored_of(model), "gain" if isinstance(model, doc.FactoredModel) else "")


def _compensator_in_range(compensator: doc.Compensator) -> Factored:
    if compensator.gain == 0:
        raise DesignError("gain", "must not be 0")
    return _in_range(compensator_of(compensator), "gain")


def _faults(build: Any, part: Any, where: str) -> tuple[Fault, ...]:
    try:
        build(part)
    except DesignError as error:
        return error.within(where).faults
    return ()
