"""Loops for the frequency tests, and how to read one case."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from engine.loop.frequency import CaseFrequency, read_frequency
from engine.loop.loop_set import LoopSet
from engine.model.factored import Factored


def factored(
    gain: float, zeros: Sequence[complex] = (), poles: Sequence[complex] = (), dead_time_s: float = 0.0
) -> Factored:
    """gain·Π(s − zero)/Π(s − pole)·exp(−s·dead_time_s)."""
    return Factored(float(gain), np.array(zeros, np.complex128), np.array(poles, np.complex128), dead_time_s)


UNITY = factored(1.0)


def pair(natural_rad_s: float, damping: float) -> list[complex]:
    """The roots of s² + 2·damping·natural·s + natural²."""
    real, imaginary = -damping * natural_rad_s, natural_rad_s * np.sqrt(1.0 - damping * damping)
    return [complex(real, imaginary), complex(real, -imaginary)]


def read(plant: Factored, compensator: Factored = UNITY) -> CaseFrequency:
    """The readings of one plant."""
    return read_frequency(LoopSet((plant,), compensator)).cases[0]


def number(case: CaseFrequency, name: str) -> float:
    """The value of a reading that has one."""
    reading = case.readings[name]
    assert reading.state == "value", (name, reading)
    assert reading.value is not None
    return reading.value


def states(case: CaseFrequency, *names: str) -> list[str]:
    """The states of several readings."""
    return [case.readings[name].state for name in names]
