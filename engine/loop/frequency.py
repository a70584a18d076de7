"""Everything that is read from the loop in the frequency domain, for all plant cases at once."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

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
from engine.loop.peaks import Peaks
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
    samples = analysis.samples
    verdicts = decide_stability(samples, analysis.found, analysis.roots)
    cases = tuple(_case(analysis, verdict, case) for case, verdict in enumerate(verdicts))
    return FrequencyView(
        samples.nodes.omega_rad_s,
        samples.nodes.gain * DB,
        samples.nodes.phase * (180.0 / math.pi),
        cases,
        analysis.roots,
    )


def _case(analysis: Analysis, verdict: Stability, case: int) -> CaseFrequency:
    samples, roots = analysis.samples, analysis.roots
    gain_crossovers = _gain_crossovers(analysis.found.gain.of(case))
    phase_crossovers = _phase_crossovers(samples, analysis.found.phase.of(case), case)
    integrators = int(samples.loop.integrators[case])
    low_gain = float(samples.loop.low_gain[case])
    readings = error_constants(integrators, low_gain)
    own_roots = roots.roots[case, : roots.count[case]]
    complete = bool(roots.complete[case])
    readings["crossover_rad_s"] = crossover(gain_crossovers)
    readings["last_crossover_rad_s"] = last_crossover(gain_crossovers)
    if verdict.stable:
        up, down = gain_margins(phase_crossovers, _limit_db(samples, case))
        readings["phase_margin_deg"] = phase_margin(gain_crossovers)
        readings["gain_margin_db"], readings["gain_reduction_margin_db"] = up, down
        readings["delay_margin_s"] = delay_margin(gain_crossovers, _high_gain(samples, case))
        readings |= _peak_readings(analysis.peaks, case)
        readings |= final_errors(integrators, low_gain)
        readings |= pole_measures(own_roots, complete)
    else:
        readings |= dict.fromkeys(_NEED_STABILITY, without_value("unstable", verdict.sentence))
    return CaseFrequency(
        verdict.stable,
        verdict.sentence,
        verdict.unstable_poles,
        readings,
        gain_crossovers,
        phase_crossovers,
        own_roots if complete else None,
        _notices(analysis.brackets, verdict, case),
    )


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


def _gain_crossovers(points: Crossings) -> tuple[GainCrossover, ...]:
    return tuple(
        GainCrossover(omega, signed_distance_deg(phase), direction)
        for omega, phase, direction in zip(
            points.omega_rad_s.tolist(), points.phase.tolist(), points.direction.tolist(), strict=True
        )
    )


def _phase_crossovers(samples: Sampled, points: Crossings, case: int) -> tuple[PhaseCrossover, ...]:
    """The crossings at finite frequencies, and L(0) and L(∞) where they are real and negative."""
    loop, reach = samples.loop, samples.reach
    listed = [
        PhaseCrossover(omega, gain * DB)
        for omega, gain in zip(points.omega_rad_s.tolist(), points.gain.tolist(), strict=True)
    ]
    if loop.integrators[case] == 0 and loop.turn[case] != 0:
        listed.insert(0, PhaseCrossover(0.0, float(loop.log_gain[case]) * DB))
    still = reach.relative_degree[case] == 0 and loop.dead_time_s[case] == 0
    if still and math.cos(reach.phase_infinite[case]) < -0.5:
        listed.append(PhaseCrossover(math.inf, float(reach.log_high_gain[case]) * DB))
    return tuple(listed)


def _limit_db(samples: Sampled, case: int) -> float | None:
    if samples.loop.dead_time_s[case] > 0 and samples.reach.relative_degree[case] == 0:
        return float(samples.reach.log_high_gain[case]) * DB
    return None


def _high_gain(samples: Sampled, case: int) -> float:
    degree = float(samples.reach.relative_degree[case])
    if degree > 0:
        return 0.0
    return math.inf if degree < 0 else _exp(float(samples.reach.log_high_gain[case]))


def _peak_readings(peaks: Peaks, case: int) -> dict[str, Reading]:
    logs, places = peaks.log_value[:, case].tolist(), peaks.at_rad_s[:, case].tolist()

    def reading(row: int, spelled: Callable[[float], float]) -> Reading:
        level, at = logs[row], places[row]
        if math.isinf(level) and level > 0:
            return without_value("unbounded", f"grows without bound for ω → {'∞' if at > 0 else '0'}")
        if math.isinf(at):
            return value(spelled(level), why="approached for ω → ∞")
        return value(spelled(level), at_rad_s=at)

    band = float(peaks.bandwidth_rad_s[case])
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
