"""What the checks of time responses share: loops from roots, and responses of a loop without the frequency side."""

from __future__ import annotations

from types import SimpleNamespace
from typing import Any

import numpy as np

from engine.loop.closed_loop_roots import closed_loop_roots
from engine.loop.loop_set import LoopSet
from engine.loop.time_response import Scenario, TimeView, read_time
from engine.model.factored import Factored

UNITY = Factored(1.0, np.empty(0, dtype=np.complex128), np.empty(0, dtype=np.complex128))


def factored(gain: float, zeros: list[complex], poles: list[complex], dead_time_s: float = 0.0) -> Factored:
    return Factored(gain, np.array(zeros, dtype=np.complex128), np.array(poles, dtype=np.complex128), dead_time_s)


def pair(natural_rad_s: float, damping: float) -> list[complex]:
    """A complex pair."""
    root = natural_rad_s * complex(-damping, np.sqrt(1.0 - damping * damping))
    return [root, root.conjugate()]


def time_view(
    plants: list[Factored], compensator: Factored = UNITY, scenario: Scenario | None = None, stable: bool | None = None
) -> TimeView:
    """`read_time`, the loop's stability taken from the closed-loop roots unless it is given."""
    loops = LoopSet(tuple(plants), compensator)
    roots = closed_loop_roots(loops)
    verdicts = [bool(np.all(~(row.real >= 0.0))) if stable is None else stable for row in roots.roots]
    cases = [SimpleNamespace(stable=verdict, stability="as the roots say") for verdict in verdicts]
    view: Any = SimpleNamespace(roots=roots, cases=cases)
    return read_time(loops, view, scenario or Scenario())


def readings_of(plant: Factored, compensator: Factored = UNITY, scenario: Scenario | None = None) -> dict[str, Any]:
    """The readings of one loop."""
    return dict(time_view([plant], compensator, scenario).cases[0].readings)
