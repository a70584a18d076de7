"""Closed-loop responses over time and what is read from them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Literal

import numpy as np
from numpy.typing import NDArray

from engine.loop.loop_set import LoopSet
from engine.loop.modal import ModalSums, Transfers, modal_sums, transfers_of
from engine.loop.modal_responses import ModalResponses, modal_net
from engine.loop.mode_groups import with_rings
from engine.loop.reading import Reading, without_value
from engine.loop.response_search import Net
from engine.loop.step_measures import MEASURES, step_readings
from engine.loop.time_grid import round_horizon, time_grid
from engine.model.factored import FloatArray

if TYPE_CHECKING:
    from engine.loop.frequency import FrequencyView

# Σ|weight| over the size of the response beyond which the residues are taken to cancel.
CANCELLING = 1e5
# An unstable response is shown up to this many times the size it has within reason.
SENSIBLE = 20.0
STEP = np.array([1, 1, 1])
RAMP = np.array([2, 1, 2])


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
    transfers = transfers_of(loops, view.roots)
    stable = np.array([case.stable for case in view.cases]) & ~np.any(view.roots.roots.real >= 0.0, axis=1)
    shown, steps = _sums(transfers, scenario)
    rows = np.flatnonzero(stable)
    net = None
    if len(rows):
        steps, net = _well_conditioned(steps, transfers, rows, scenario)
        if scenario.command_shape == "step":
            shown = steps
    readings = _readings(transfers, steps, rows, net, view)
    horizon = scenario.horizon_s or _horizon(readings, transfers, stable)
    curves, time_s = _curves(shown, transfers, scenario, horizon, stable, net)
    cases = tuple(CaseTime(each, _notices(transfers, case)) for case, each in enumerate(readings))
    return TimeView(time_s, curves[:, 0], curves[:, 1], curves[:, 2], cases)


def _sums(transfers: Transfers, scenario: Scenario) -> tuple[ModalSums, ModalSums]:
    """The responses shown, and those to the step that readings come from."""
    steps = modal_sums(transfers, scenario.amplitudes, STEP)
    if scenario.command_shape == "step":
        return steps, steps
    return modal_sums(transfers, scenario.amplitudes, RAMP), steps


def _well_conditioned(
    steps: ModalSums, transfers: Transfers, rows: NDArray[np.int64], scenario: Scenario
) -> tuple[ModalSums, Net]:
    """Step responses of all cases, residues of the stable ones not cancelling, and the net over the stable cases."""
    own = steps.of(rows)
    if np.isfinite(own.weights).all():
        net = modal_net(own)
        if not np.any(own.size() > CANCELLING * net.scale):
            return steps, net
        crowded = rows[np.any(own.size() > CANCELLING * net.scale, axis=1)]
    else:
        crowded = rows
    steps = with_rings(steps, transfers, crowded, scenario.amplitudes, STEP)
    return steps, modal_net(steps.of(rows))


def _readings(
    transfers: Transfers, steps: ModalSums, rows: NDArray[np.int64], net: Net | None, view: FrequencyView
) -> list[dict[str, Reading]]:
    """Readings per case."""
    readings = [
        dict.fromkeys(MEASURES, without_value("unstable", case.stability or "the closed loop is not stable"))
        for case in view.cases
    ]
    if net is not None:
        own = steps.of(rows)
        found = step_readings(net, own.offset, ModalResponses(own, net.scale), transfers.excess[rows] > 0)
        for case, each in zip(rows.tolist(), found, strict=True):
            readings[case] = each
    return readings


def _horizon(readings: Sequence[dict[str, Reading]], transfers: Transfers, stable: NDArray[np.bool_]) -> float:
    """Long enough for the stable cases to settle, or for an instability to show."""
    spans = []
    for case, each in enumerate(readings):
        settled = [each[name].value or 0.0 for name in ("settling_time_s", "load_settling_time_s")]
        if stable[case] and max(settled) > 0.0:
            spans.append(max(settled))
    if not spans:
        spans = [_own_span(transfers, case) for case in range(len(stable))]
    # One case that hardly settles must not squeeze the others into a corner.
    return round_horizon(1.25 * min(max(spans), 5.0 * float(np.median(spans))))


def _own_span(transfers: Transfers, case: int) -> float:
    """A few time constants of the root that moves slowest, or of the growth."""
    roots = transfers.roots[case, transfers.live[case]] * transfers.scale[case]
    moving = roots[np.abs(roots) > 0.0]
    if not len(moving):
        return 1.0
    growing = moving[moving.real > 1e-3 * np.abs(moving)]
    if len(growing):
        return float(4.0 / growing.real.max())
    return float(40.0 / np.abs(moving).min())


def _curves(
    shown: ModalSums,
    transfers: Transfers,
    scenario: Scenario,
    horizon: float,
    stable: NDArray[np.bool_],
    net: Net | None,
) -> tuple[FloatArray, FloatArray]:
    """(c, 3, n) responses and (n,) instants [s]."""
    grid = time_grid(horizon, 0.05 * shown.quickest_s())
    with np.errstate(all="ignore"):
        curves = shown.sample(grid.basis(shown.exponents), grid.time_s)
        reach = np.nanmax(np.abs(curves), axis=2, initial=0.0)
        crowded = np.flatnonzero(~np.all(shown.size() <= CANCELLING * reach, axis=1))
        if len(crowded):
            integrations = STEP if scenario.command_shape == "step" else RAMP
            shown = with_rings(shown, transfers, crowded, scenario.amplitudes, integrations, horizon)
            curves = shown.sample(grid.basis(shown.exponents), grid.time_s)
    if not stable.all():
        _cut_off(curves, grid.time_s, transfers, scenario, stable, net)
    return curves, grid.time_s


def _cut_off(
    curves: FloatArray,
    time_s: FloatArray,
    transfers: Transfers,
    scenario: Scenario,
    stable: NDArray[np.bool_],
    net: Net | None,
) -> None:
    """nan once an unstable response has grown to SENSIBLE times what it was before the growth took over."""
    floor = np.array([abs(scenario.command_amplitude), 0.0, 0.0])
    if net is not None:
        floor = np.maximum(floor, net.scale.max(axis=0))
    for case in np.flatnonzero(~stable).tolist():
        roots = transfers.roots[case, transfers.live[case]] * transfers.scale[case]
        growth = float(roots.real.max(initial=0.0))
        early = time_s * growth <= 1.0
        size = np.nanmax(np.abs(curves[case][:, early]), axis=1)
        outside = ~(np.abs(curves[case]) <= SENSIBLE * np.maximum(floor, size)[:, None])
        curves[case][np.logical_or.accumulate(outside, axis=1)] = np.nan


def _notices(transfers: Transfers, case: int) -> tuple[str, ...]:
    names = ("output's answer to a command step", "output's answer to a load step", "effort")
    return tuple(
        f"The {name} begins with an impulse, which is not drawn: its transfer function has more zeros than poles."
        for name, excess in zip(names, transfers.excess[case].tolist(), strict=True)
        if excess > 0
    )
