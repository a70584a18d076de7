"""Closed-loop responses over time and what is read from them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from statistics import median
from typing import TYPE_CHECKING, Literal

import numpy as np
from numpy.typing import NDArray

from engine.loop.loop_set import LoopSet
from engine.loop.reading import Reading, without_value
from engine.loop.response_family import RAMP, STEP, Family, families_of
from engine.loop.step_measures import MEASURES
from engine.loop.time_grid import round_horizon, time_grid
from engine.model.factored import FloatArray

if TYPE_CHECKING:
    from engine.loop.frequency import FrequencyView

# An unstable response is shown up to this many times the size it has within reason.
SENSIBLE = 20.0


_CUT_SHORT = "the loop gain hardly falls off beside this dead time, so the response is known too loosely to be measured"


@dataclass(frozen=True)
class Scenario:
    """What the responses answer to."""

    command_shape: Literal["step", "ramp"] = "step"
    """Shape that is shown; readings are always those of the step."""
    command_amplitude: float = 1.0
    """Height of the step, or rate of the ramp per second."""
    load_amplitude: float = 1.0
    """Height of the step at the plant input."""
    horizon_s: float | None = None
    """Length of time shown; None: long enough for every stable case to settle."""

    @property
    def amplitudes(self) -> FloatArray:
        """(3,) amplitudes of the rows command, load, effort."""
        return np.array([self.command_amplitude, self.load_amplitude, self.command_amplitude])


@dataclass(frozen=True)
class CaseTime:
    """Readings of one case."""

    readings: dict[str, Reading]
    notices: tuple[str, ...]


@dataclass(frozen=True, eq=False)
class TimeView:
    """Responses of all cases on one time axis."""

    time_s: FloatArray
    """(n,) increasing; the first instant, 0, stands for the one just after the step."""
    command: FloatArray
    """(c, n) output to the command; nan where an unstable response has left the sensible range."""
    load: FloatArray
    """(c, n) output to the load at the plant input."""
    effort: FloatArray
    """(c, n) effort to the command."""
    cases: tuple[CaseTime, ...]


def read_time(loops: LoopSet, view: FrequencyView, scenario: Scenario) -> TimeView:
    """Responses to command and load, the effort, and the readings of the step response.

    Values are within 1e-6 of each response's peak everywhere, as are readings; a response that begins with an impulse
    (more zeros than poles) is shown without it.
    """
    integrations = RAMP if scenario.command_shape == "ramp" else STEP
    families = families_of(loops, view.roots, scenario.amplitudes, integrations)
    stable = np.array([case.stable for case in view.cases]) & ~np.any(view.roots.roots.real >= 0.0, axis=1)
    readings, sizes = _readings(families, stable, view)
    horizon = scenario.horizon_s or _horizon(readings, view, stable, loops)
    curves, time_s = _curves(families, horizon, loops.count, scenario.horizon_s is not None)
    if not stable.all():
        _cut_off(curves, time_s, view, scenario, stable, sizes)
    excess = np.empty((loops.count, 3), dtype=np.int64)
    for family in families:
        excess[family.cases] = family.transfers.excess
    for case in range(loops.count):
        if _cut_short(view, case):
            readings[case] = dict.fromkeys(MEASURES, without_value("not determinable", _CUT_SHORT))
    cases = tuple(
        CaseTime(each, _notices(excess[case].tolist(), _unsure(view, case))) for case, each in enumerate(readings)
    )
    return TimeView(time_s, curves[:, 0], curves[:, 1], curves[:, 2], cases)


def _readings(
    families: Sequence[Family], stable: NDArray[np.bool_], view: FrequencyView
) -> tuple[list[dict[str, Reading]], FloatArray]:
    """Readings per case, and (3,) the largest size of each response over the stable ones."""
    readings = [
        dict.fromkeys(MEASURES, without_value("unstable", case.stability or "the closed loop is not stable"))
        for case in view.cases
    ]
    sizes = np.zeros(3)
    for family in families:
        rows = np.flatnonzero(stable[family.cases])
        if not len(rows):
            continue
        found, scale = family.read(rows)
        sizes = np.maximum(sizes, scale.max(axis=0))
        for case, each in zip(family.cases[rows].tolist(), found, strict=True):
            readings[case] = each
    return readings, sizes


def _horizon(
    readings: Sequence[dict[str, Reading]], view: FrequencyView, stable: NDArray[np.bool_], loops: LoopSet
) -> float:
    """Long enough for the stable cases to settle, or for an instability to show."""
    spans = []
    for case, each in enumerate(readings):
        settled = [each[name].value or 0.0 for name in ("settling_time_s", "load_settling_time_s")]
        if stable[case] and max(settled) > 0.0:
            spans.append(max(settled))
    if not spans:
        spans = [_own_span(view, case, loops.loops[case].dead_time_s) for case in range(len(stable))]
    # One case that hardly settles must not squeeze the others into a corner.
    return round_horizon(1.25 * min(max(spans), 5.0 * median(spans)))


def _own_span(view: FrequencyView, case: int, dead_time_s: float) -> float:
    """A few time constants of the root that moves slowest, or of the growth."""
    roots = view.roots.roots[case, : view.roots.count[case]]
    moving = roots[np.abs(roots) > 0.0]
    if not len(moving):
        return 6.0 * dead_time_s or 1.0
    growing = moving[moving.real > 1e-3 * np.abs(moving)]
    if len(growing):
        return float(4.0 / growing.real.max()) + 3.0 * dead_time_s
    return float(40.0 / np.abs(moving).min())


def _curves(families: Sequence[Family], horizon: float, count: int, closely: bool) -> tuple[FloatArray, FloatArray]:
    """(c, 3, n) responses and (n,) instants [s]."""
    quickest = min(family.shown.quickest_s() for family in families)
    grid = time_grid(horizon, 0.05 * quickest, np.concatenate([family.kinks_s() for family in families]))
    curves = np.empty((count, 3, len(grid.time_s)))
    for family in families:
        curves[family.cases] = family.sample(grid, closely)
    return curves, grid.time_s


def _cut_off(
    curves: FloatArray,
    time_s: FloatArray,
    view: FrequencyView,
    scenario: Scenario,
    stable: NDArray[np.bool_],
    sizes: FloatArray,
) -> None:
    """nan once an unstable response has grown to SENSIBLE times what it was before the growth took over."""
    floor = np.maximum(np.array([abs(scenario.command_amplitude), 0.0, 0.0]), sizes)
    for case in np.flatnonzero(~stable).tolist():
        roots = view.roots.roots[case, : view.roots.count[case]]
        growth = float(roots.real.max(initial=0.0))
        early = np.abs(curves[case][:, time_s * growth <= 1.0])
        size = np.where(np.isfinite(early), early, 0.0).max(axis=1)
        outside = ~(np.abs(curves[case]) <= SENSIBLE * np.maximum(floor, size)[:, None])
        curves[case][np.logical_or.accumulate(outside, axis=1)] = np.nan


def _unsure(view: FrequencyView, case: int) -> bool:
    """Whether roots that matter to a stable response with dead time may be missing."""
    dominant = view.roots.dominant[case] if view.roots.dominant else None
    return view.cases[case].stable and dominant is not None and not (dominant.counted and dominant.faint)


def _cut_short(view: FrequencyView, case: int) -> bool:
    """Whether roots that still count are left out, so that a late crossing of a band could be missed."""
    dominant = view.roots.dominant[case] if view.roots.dominant else None
    return view.cases[case].stable and dominant is not None and not dominant.faint


def _notices(excess: Sequence[int], unsure: bool) -> tuple[str, ...]:
    names = ("output's answer to a command step", "output's answer to a load step", "effort")
    listed = [
        f"The {name} begins with an impulse, which is not drawn: its transfer function has more zeros than poles."
        for name, more in zip(names, excess, strict=True)
        if more > 0
    ]
    if unsure:
        listed.append(
            "The loop gain hardly falls off beside this dead time: the time responses may be off by more than a "
            "millionth of their peak near each kink."
        )
    return tuple(listed)
