"""The shapes of what is handed out, for their JSON Schemas: an assessment and a transfer function.

Fields may be added within format 1, so further ones are allowed; those named here keep their place and meaning.
"""

from __future__ import annotations

from typing import Annotated, Literal

from pydantic import BaseModel, ConfigDict, Field

from engine.loop.reading import State

Pair = Annotated[list[float], Field(min_length=2, max_length=2, description="A complex number, [re, im]; rad/s.")]
Row = list[float | None]


class Published(BaseModel):
    """Part of a document that is handed out."""

    model_config = ConfigDict(extra="allow")


class ReadingOut(Published):
    """A number, or the statement why there is none."""

    value: float | None = Field(description="null unless `state` is `value`.")
    state: State
    why: str
    at_rad_s: float | None = Field(default=None, description="Frequency at which it is read [rad/s].")
    at_s: float | None = Field(default=None, description="Instant at which it is read [s].")


class RequirementOut(Published):
    """A row of the sheet with its judgement."""

    measure: str
    label: str
    unit: str
    rank: Literal["must", "should"]
    reading: ReadingOut = Field(description="The worst over the row's plant cases.")
    case: str | None = Field(description="The plant case the worst reading comes from.")
    slack: float | None = Field(description="Room left, in the measure's own scale; negative is short.")
    shortfall: str
    met: bool | None = Field(description="null where it cannot be assessed.")


class GainCrossoverOut(Published):
    """|L| = 1."""

    rad_s: float | None
    signed_phase_margin_deg: float


class PhaseCrossoverOut(Published):
    """L real and negative; null stands for infinite."""

    rad_s: float | None
    gain_db: float | None


class CaseOut(Published):
    """Everything read from one plant case."""

    name: str
    stable: bool
    stability: str
    readings: dict[str, ReadingOut]
    gain_crossovers: list[GainCrossoverOut]
    phase_crossovers: list[PhaseCrossoverOut]
    closed_loop_poles: list[Pair] | None = Field(description="null with dead time: there are endlessly many.")
    notices: list[str]


class CurvesOut(Published):
    """Sampled curves, one row a plant case; null where a curve is not shown."""

    omega_rad_s: list[float]
    magnitude_db: list[Row]
    phase_deg: list[Row]
    time_s: list[float]
    command: list[Row]
    load: list[Row]
    effort: list[Row]


class AssessmentOut(Published):
    """What `check --json` and `POST /api/assessment` give."""

    format: Literal["loopwright-assessment/1"]
    verdict: Literal["met", "not met", "not assessable"]
    headline: str
    requirements: list[RequirementOut]
    cases: Annotated[list[CaseOut], Field(min_length=1)]
    notices: list[str]
    curves: CurvesOut | None = None


class CompensatorOut(Published):
    """C(s) = gain·Π(s−z)/Π(s−p), and the same as coefficients, highest power first."""

    gain: float
    zeros: list[Pair]
    poles: list[Pair]
    numerator: list[float]
    denominator: list[float]
    largest_relative_response_error: float = Field(description="What writing it as coefficients costs.")
    realisable: bool


class TransferFunctionOut(Published):
    """What `export --as transfer-function` gives."""

    format: Literal["loopwright-transfer-function/1"]
    title: str
    verdict: Literal["met", "not met", "not assessable"]
    warnings: list[str]
    compensator: CompensatorOut
    pid: dict[str, dict[str, float | None] | None] | None = Field(description="null where C is no PID.")
    stages: list[dict[str, object]]
    units: dict[str, str]
    requirements: list[RequirementOut]
    cautions: list[str]
    design_sha256: Annotated[str, Field(pattern="^[0-9a-f]{64}$")]
    link: str | None
