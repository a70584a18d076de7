"""Everything that is read from the loop in the frequency domain, for all plant cases at once."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import NamedTuple, TypeAlias

import numpy as np

from engine.loop.analysis import Analysis, analysis_of
from engine.loop.closed_loop_roots import ClosedLoopRoots
from engine.loop.crossing_polish import Crossings
from engine.loop.crossings import LISTED_AT_MOST, Isolated
from engine.loop.grid import Sampled
from engine.loop.loop_set import LoopSet
from engine.loop.margins import (
    DB,
    GainCrossover,
    PhaseCrossover,
    crossover,
    delay_margin,
    gain_margins,
    last_crossover,
    phase_margin,
    signed_distance_deg,
)
from engine.loop.pole_measures import pole_measures
from engine.loop.reading import Reading, value, without_value
from engine.loop.stability import Stability, decide_stability
from engine.loop.steady_state import error_constants, final_errors
from engine.model.factored import ComplexArray, FloatArray

__all__ = ["CaseFrequency", "FrequencyView", "GainCrossover", "PhaseCrossover", "read_frequency"]


@dataclass(frozen=True, slots=True)
class CaseFrequency:
    """One plant case."""

    stable: bool
    stability: str
    """"stable", or the plain sentence why not."""
    unstable_poles: int
    """Closed-loop poles in the right half plane; −1 for endlessly many."""
    readings: dict[str, Reading]
    """Every frequency, steady-state and pole measure of the contract."""
    gain_crossovers: tuple[GainCrossover, ...]
    """By frequency."""
    phase_crossovers: tuple[PhaseCrossover, ...]
    """By frequency, 0.0 and inf included."""
    closed_loop_poles: ComplexArray | None
    """All of them; None with dead time."""
    notices: tuple[str, ...]


@dataclass(frozen=True, eq=False)
class FrequencyView:
    """All plant cases on one grid of frequencies."""

    omega_rad_s: FloatArray
    """(n,) increasing [rad/s]."""
    magnitude_db: FloatArray
    """(c, n) of L; ±inf at an undamped root."""
    phase_deg: FloatArray
    """(c, n) of L, factors summed."""
    cases: tuple[CaseFrequency, ...]
    roots: ClosedLoopRoots


def read_frequency(loops: LoopSet) -> FrequencyView:
    """Curves, crossings, margins, peaks, stability and steady state of every plant case.

    Decisions where the contract is silent: margins, peaks, bandwidth, final errors and pole measures of a loop that
    is unstable or on the stability boundary have state "unstable"; the error constants and the crossovers, which are
    properties of L alone, and the raw crossings stay. A crossover that only touches 0 dB counts for the margins but
    is no downward crossing.
    """
    analysis = analysis_of(loops)
    samples, found, peaks = analysis.samples, analysis.found, analysis.peaks
    verdicts = decide_stability(samples, found, analysis.roots)
    gains, phases = _by_case(found.gain, loops.count), _by_case(found.phase, loops.count)
    last = [a[-1][0] if a else b[0][0] if b else math.inf for a, b in zip(gains, phases, strict=True)]
    suprema = zip(peaks.log_value.T.tolist(), peaks.at_rad_s.T.tolist(), peaks.bandwidth_rad_s.tolist(), strict=True)
    parts = zip(verdicts, _facts(samples), gains, phases, suprema, pole_measures(analysis.roots, last), strict=True)
    cases = tuple(_case(analysis, case, *part) for case, part in enumerate(parts))
    nodes = samples.nodes
    return FrequencyView(nodes.omega_rad_s, nodes.gain * DB, nodes.phase * (180.0 / math.pi), cases, analysis.roots)


_Point: TypeAlias = tuple[float, float, float, int]
"""rad/s, ln|L|, phase [rad], direction."""


def _case(
    analysis: Analysis,
    case: int,
    verdict: Stability,
    fact: _Facts,
    gains: list[_Point],
    phases: list[_Point],
    suprema: tuple[list[float], list[float], float],
    poles: dict[str, Reading],
) -> CaseFrequency:
    gain_crossovers = tuple(
        GainCrossover(omega, signed_distance_deg(phase), direction) for omega, _, phase, direction in gains
    )
    phase_crossovers = _phase_crossovers(fact, phases)
    readings = error_constants(fact.integrators, fact.low_gain)
    readings["crossover_rad_s"] = crossover(gain_crossovers)
    readings["last_crossover_rad_s"] = last_crossover(gain_crossovers)
    if verdict.stable:
        up, down = gain_margins(phase_crossovers, _limit_db(fact))
        readings["phase_margin_deg"] = phase_margin(gain_crossovers)
        readings["gain_margin_db"], readings["gain_reduction_margin_db"] = up, down
        readings["delay_margin_s"] = delay_margin(gain_crossovers, _high_gain(fact))
        readings |= _peak_readings(*suprema)
        readings |= final_errors(fact.integrators, fact.low_gain)
        readings |= poles
    else:
        readings |= dict.fromkeys(_NEED_STABILITY, without_value("unstable", verdict.sentence))
    roots = analysis.roots
    return CaseFrequency(
        verdict.stable,
        verdict.sentence,
        verdict.unstable_poles,
        readings,
        gain_crossovers,
        phase_crossovers,
        roots.roots[case, : roots.count[case]] if fact.dead_time_s == 0 else None,
        _notices(analysis.isolated, verdict, case),
    )


class _Facts(NamedTuple):
    """The ends of one case's loop as plain numbers."""

    integrators: int
    low_gain: float
    log_gain: float
    turn: float
    dead_time_s: float
    relative_degree: float
    log_high_gain: float
    phase_infinite: float


def _facts(samples: Sampled) -> list[_Facts]:
    loop, reach = samples.loop, samples.reach
    columns = (
        loop.integrators.astype(np.int64),
        loop.low_gain,
        loop.log_gain,
        loop.turn,
        loop.dead_time_s,
        reach.relative_degree,
        reach.log_high_gain,
        reach.phase_infinite,
    )
    return [_Facts(*row) for row in zip(*(column.tolist() for column in columns), strict=True)]


def _by_case(points: Crossings, count: int) -> list[list[_Point]]:
    """The points of each case, by frequency."""
    lists: list[list[_Point]] = [[] for _ in range(count)]
    for case, *point in zip(
        points.case.tolist(),
        points.omega_rad_s.tolist(),
        points.gain.tolist(),
        points.phase.tolist(),
        points.direction.tolist(),
        strict=True,
    ):
        lists[case].append((point[0], point[1], point[2], point[3]))
    return lists


_NEED_STABILITY = (
    "phase_margin_deg",
    "gain_margin_db",
    "gain_reduction_margin_db",
    "delay_margin_s",
    "peak_sensitivity",
    "peak_complementary_sensitivity",
    "effort_gain_db",
    "disk_margin",
    "bandwidth_rad_s",
    "step_error",
    "ramp_error",
    "parabola_error",
    "least_damping",
    "slowest_pole_rad_s",
)


def _phase_crossovers(fact: _Facts, points: list[_Point]) -> tuple[PhaseCrossover, ...]:
    """The crossings at finite frequencies, and L(0) and L(∞) where they are real and negative."""
    listed = [PhaseCrossover(omega, gain * DB) for omega, gain, _, _ in points]
    if fact.integrators == 0 and fact.turn != 0:
        listed.insert(0, PhaseCrossover(0.0, fact.log_gain * DB))
    if fact.relative_degree == 0 and fact.dead_time_s == 0 and math.cos(fact.phase_infinite) < -0.5:
        listed.append(PhaseCrossover(math.inf, fact.log_high_gain * DB))
    return tuple(listed)


def _limit_db(fact: _Facts) -> float | None:
    return fact.log_high_gain * DB if fact.dead_time_s > 0 and fact.relative_degree == 0 else None


def _high_gain(fact: _Facts) -> float:
    if fact.relative_degree > 0:
        return 0.0
    return math.inf if fact.relative_degree < 0 else _exp(fact.log_high_gain)


def _peak_readings(logs: list[float], places: list[float], band: float) -> dict[str, Reading]:
    def reading(row: int, spelled: Callable[[float], float]) -> Reading:
        level, at = logs[row], places[row]
        if math.isinf(level) and level > 0:
            return without_value("unbounded", f"grows without bound for ω → {'∞' if at > 0 else '0'}")
        if math.isinf(at):
            return value(spelled(level), why="approached for ω → ∞")
        return value(spelled(level), at_rad_s=at)

    return {
        "peak_sensitivity": reading(0, _exp),
        "peak_complementary_sensitivity": reading(1, _exp),
        "effort_gain_db": reading(2, lambda level: level * DB),
        "disk_margin": reading(3, lambda level: 2.0 * _exp(-level)),
        "bandwidth_rad_s": value(band, at_rad_s=band)
        if math.isfinite(band)
        else without_value("absent", "|T| never falls to |T(0)|/√2"),
    }


def _notices(found: Isolated, verdict: Stability, case: int) -> tuple[str, ...]:
    notices = [verdict.notice] if verdict.notice else []
    end = float(found.listed_up_to[case])
    if math.isfinite(end):
        what = (
            f"With dead time the phase crosses −180° endlessly often; phase crossovers are listed up to {end:.4g} rad/s"
        )
        if found.shortened[case]:
            notices.append(
                f"{what}, the first {LISTED_AT_MOST}: the gain margins are read from these and may be smaller beyond."
            )
        else:
            notices.append(f"{what}, beyond which |L| stays too small to change a margin.")
    if found.flat_phase[case]:
        notices.append("The phase rests on −180° over a range of frequencies; no phase crossover is listed there.")
    if found.flat_gain[case]:
        notices.append("|L| rests at 1 over a range of frequencies; no gain crossover is listed there.")
    return tuple(notices)


def _exp(level: float) -> float:
    return math.exp(min(level, 700.0))
