"""The design document, `loopwright-design/1`: its fields, their meaning and their bounds.

Frequencies are rad/s, times seconds; a complex root is `[re, im]`, a real one may be a plain number. The classes
hold what was written and nothing computed. `engine.design.parse` turns JSON into them.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Annotated, Any, Literal, TypeAlias

from pydantic import BaseModel, BeforeValidator, ConfigDict, Field, WithJsonSchema

FORMAT = "loopwright-design/1"

Number: TypeAlias = Annotated[float, Field(strict=True, allow_inf_nan=False)]
Positive: TypeAlias = Annotated[float, Field(strict=True, allow_inf_nan=False, gt=0)]
NotNegative: TypeAlias = Annotated[float, Field(strict=True, allow_inf_nan=False, ge=0)]
Text: TypeAlias = Annotated[str, Field(strict=True)]
Name: TypeAlias = Annotated[str, Field(strict=True, min_length=1, max_length=120)]


def _root_as_written(value: Any) -> Any:
    """A root stays as it was written, so that a document survives the round trip unchanged."""
    if isinstance(value, Sequence) and not isinstance(value, (str, bytes)):
        if len(value) != 2:
            raise ValueError(f"a complex number is [re, im], has {len(value)} entries")
        return tuple(value)
    return value


Root: TypeAlias = Annotated[
    Number | tuple[Number, Number],
    BeforeValidator(_root_as_written),
    WithJsonSchema(
        {
            "anyOf": [
                {"type": "number"},
                {"type": "array", "prefixItems": [{"type": "number"}] * 2, "minItems": 2, "maxItems": 2},
            ]
        }
    ),
]


class Part(BaseModel):
    """Base of all parts: unknown fields are errors, values cannot be changed after reading."""

    model_config = ConfigDict(extra="forbid", frozen=True)


# --- models -----------------------------------------------------------------------------------------------------


class FactoredModel(Part):
    """gain · Π(s − zero) / Π(s − pole) · exp(−s · dead_time_s)."""

    kind: Literal["factored"]
    gain: Number
    zeros: tuple[Root, ...] = ()
    poles: tuple[Root, ...] = ()
    dead_time_s: NotNegative = 0.0


class PolynomialModel(Part):
    """numerator(s) / denominator(s), highest power first."""

    kind: Literal["polynomial"]
    numerator: Annotated[tuple[Number, ...], Field(min_length=1)]
    denominator: Annotated[tuple[Number, ...], Field(min_length=1)]
    dead_time_s: NotNegative = 0.0


Vector: TypeAlias = tuple[Number, ...] | tuple[tuple[Number, ...], ...]
"""A row or a column: a plain list, or a list of lists as matrices are usually written."""


class StateSpaceModel(Part):
    """c·(s·1 − a)⁻¹·b + d with one input and one output."""

    kind: Literal["state_space"]
    a: tuple[tuple[Number, ...], ...]
    b: Vector
    c: Vector
    d: Number | Vector
    dead_time_s: NotNegative = 0.0


class ExpressionModel(Part):
    """A formula in s, such as `3.2*(s+40)/(s*(s^2+2*s+900)) * exp(-0.002*s)`."""

    kind: Literal["expression"]
    text: Annotated[str, Field(strict=True, min_length=1)]
    dead_time_s: NotNegative = 0.0


Model: TypeAlias = Annotated[
    FactoredModel | PolynomialModel | StateSpaceModel | ExpressionModel, Field(discriminator="kind")
]

LATER_MODELS = ("measured", "chain", "inner_loop")
"""Kinds of the contract that this version refuses by name."""


class PlantCase(Part):
    """One plant the compensator must serve."""

    name: Name
    model: Model


# --- compensator ------------------------------------------------------------------------------------------------


class _Stage(Part):
    name: Annotated[str, Field(strict=True, max_length=120)] | None = None
    enabled: Annotated[bool, Field(strict=True)] = True


class LeadLag(_Stage):
    """(1 + s/zero) / (1 + s/pole): lead when zero < pole, lag when zero > pole."""

    kind: Literal["lead_lag"]
    zero_rad_s: Positive
    pole_rad_s: Positive


class ProportionalIntegral(_Stage):
    """(s + corner) / s."""

    kind: Literal["proportional_integral"]
    corner_rad_s: Positive


class Integrator(_Stage):
    """1 / s."""

    kind: Literal["integrator"]


class RealZero(_Stage):
    """1 + s/corner."""

    kind: Literal["real_zero"]
    corner_rad_s: Positive


class RealPole(_Stage):
    """1 / (1 + s/corner)."""

    kind: Literal["real_pole"]
    corner_rad_s: Positive


class ComplexZeros(_Stage):
    """1 + 2·damping·s/natural + (s/natural)²."""

    kind: Literal["complex_zeros"]
    natural_rad_s: Positive
    damping: NotNegative


class ComplexPoles(_Stage):
    """1 / (1 + 2·damping·s/natural + (s/natural)²)."""

    kind: Literal["complex_poles"]
    natural_rad_s: Positive
    damping: Positive


class Notch(_Stage):
    """(s² + 2·zero_damping·w·s + w²) / (s² + 2·pole_damping·w·s + w²) with w = centre."""

    kind: Literal["notch"]
    centre_rad_s: Positive
    zero_damping: NotNegative
    pole_damping: Positive


class RationalStage(_Stage):
    """gain · Π(s − zero) / Π(s − pole), as given."""

    kind: Literal["rational"]
    zeros: tuple[Root, ...] = ()
    poles: tuple[Root, ...] = ()
    gain: Number = 1.0


Stage: TypeAlias = Annotated[
    LeadLag
    | ProportionalIntegral
    | Integrator
    | RealZero
    | RealPole
    | ComplexZeros
    | ComplexPoles
    | Notch
    | RationalStage,
    Field(discriminator="kind"),
]


class Compensator(Part):
    """C(s) = gain · product of the enabled stages."""

    gain: Number
    stages: tuple[Stage, ...] = ()


# --- requirements, scenario, surroundings -----------------------------------------------------------------------


class Requirement(Part):
    """One row of the requirement sheet."""

    measure: Text
    at_least: Number | None = None
    at_most: Number | None = None
    at_rad_s: Positive | None = None
    over_rad_s: tuple[Positive, Positive] | None = None
    mask: Annotated[tuple[tuple[Positive, Number], ...], Field(min_length=2)] | None = None
    """Corner points [ω, limit], joined by straight lines over log ω."""
    mask_side: Literal["at_most", "at_least"] | None = None
    """Which side of the mask is allowed; left out: the measure's usual side."""
    cases: Annotated[tuple[Name, ...], Field(min_length=1)] | None = None
    rank: Literal["must", "should"] = "must"
    reason: Text = ""


class Signal(Part):
    """A name and a unit, shown on every axis."""

    name: Text = ""
    unit: Text = ""


class Signals(Part):
    """What command, output and effort are called."""

    command: Signal = Signal()
    output: Signal = Signal()
    effort: Signal = Signal()


class Actuator(Part):
    """Limits in effort units; a heater has low = 0."""

    low: Number | None = None
    high: Number | None = None
    rate: Positive | None = None


class CommandShape(Part):
    """The command of the response plots."""

    shape: Literal["step", "ramp"] = "step"
    amplitude: Number = 1.0
    """Height of the step, or slope of the ramp."""


class LoadShape(Part):
    """The load at the plant input."""

    shape: Literal["step"] = "step"
    amplitude: Number = 1.0


class ScenarioPart(Part):
    """What the time responses answer to."""

    command: CommandShape = CommandShape()
    load: LoadShape = LoadShape()
    horizon_s: Positive | None = None
    """Length of the response plots; left out: from the closed-loop modes."""


class ContinuousImplementation(Part):
    """Judged as the continuous compensator it is written as."""

    kind: Literal["continuous"]


class LaterImplementation(BaseModel):
    """A realisation that this version cannot judge yet; its verdict is "not assessable"."""

    model_config = ConfigDict(extra="allow", frozen=True)
    kind: Literal["digital", "analogue"]


Implementation: TypeAlias = Annotated[ContinuousImplementation | LaterImplementation, Field(discriminator="kind")]


class Design(Part):
    """Plants, compensator, requirements and how it will be built: everything `assess` needs."""

    format: Literal["loopwright-design/1"]
    title: Text = ""
    notes: Text = ""
    signals: Signals = Signals()
    plant_cases: Annotated[tuple[PlantCase, ...], Field(min_length=1)]
    """The first is the nominal one."""
    compensator: Compensator
    requirements: tuple[Requirement, ...] = ()
    implementation: Implementation = ContinuousImplementation(kind="continuous")
    actuator: Actuator = Actuator()
    scenario: ScenarioPart = ScenarioPart()

    def document(self) -> dict[str, Any]:
        """The document as it was written: nothing added, nothing reordered."""
        return self.model_dump(mode="json", exclude_unset=True)


LATER_FIELDS = {
    "sensor": "the sensor is taken as 1",
    "command_filter": "the command filter is taken as 1",
    "feedforward": "the feedforward is taken as 0",
}
"""Fields of the contract that this version refuses by name, with what holds instead."""
