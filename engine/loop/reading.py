"""A reading: a number, or the plain statement why there is none."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal, TypeAlias

State: TypeAlias = Literal["value", "unlimited", "unbounded", "absent", "not determinable", "unstable"]


@dataclass(frozen=True, slots=True)
class Reading:
    """What was read from the loop. `value` is a finite number if and only if `state` is "value"."""

    value: float | None
    state: State
    why: str = ""
    """A plain sentence: why there is no number, or what qualifies it. "" where nothing needs saying."""
    at_rad_s: float | None = None
    """Frequency at which the value is read; 0.0 for ω → 0, None where it is read at ω → ∞ (then `why` says so)."""
    at_s: float | None = None
    """Time at which the value is read."""


def value(number: float, *, at_rad_s: float | None = None, at_s: float | None = None, why: str = "") -> Reading:
    """A reading that is a number."""
    return Reading(float(number), "value", why, at_rad_s, at_s)


def without_value(state: State, why: str) -> Reading:
    """A reading that is not a number, with the reason."""
    return Reading(None, state, why)
