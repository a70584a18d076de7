"""What the references say about one design, as plain numbers that fit in a file."""

from __future__ import annotations

from typing import Any

from mpmath import mp, mpf

from tests.outside import margins, peaks
from tests.outside.closed_loop import (
    closed_loop_poles,
    pole_conditions,
    unstable_poles_by_encirclement,
    unstable_poles_by_roots,
)
from tests.outside.crossings import gain_crossings, phase_crossings
from tests.outside.loop import Loop, loop_of_design
from tests.outside.responses import response
from tests.outside.step_measures import Features, features, first_reach, greatest_magnitude, last_exit, step_measures

WORKING_DIGITS = 80
QUIET = mpf(10) ** -3
"""With dead time phase crossovers are listed until |L| stays below this, or FARTHEST_TURN of them are passed."""
FARTHEST_TURN = 150
TOO_LONG = 400_000
"""A response that needs more samples than this is left to the curves' check."""


def record(design: dict, with_time: bool = False) -> dict[str, Any]:
    """Every reference value of the first plant case; numbers as floats, states as words."""
    with mp.workdps(WORKING_DIGITS):
        loop = loop_of_design(design)
        ends = last_phase_rad_s(loop)
        gains, phases = gain_crossings(loop), phase_crossings(loop, ends)
        entry: dict[str, Any] = {
            "design": design,
            "gain_crossings": [
                _row(c.rad_s, c.signed_phase_margin_deg, c.direction, c.condition, c.phase_condition_deg) for c in gains
            ],
            "phase_crossings": [_row(c.rad_s, c.gain_db, c.condition, c.gain_condition_db) for c in phases],
            "phase_listed_to_rad_s": float(ends) if loop.dead_time_s else None,
            **_stability(loop),
        }
        if not entry["unstable_poles"]:
            entry["readings"] = _plain(_margin_readings(loop, gains, phases))
            entry["bandwidth_condition"] = _bandwidth_condition(loop, entry["readings"]["bandwidth_rad_s"])
            entry["peaks"] = {kind: _peak(loop, kind) for kind in peaks.KINDS}
            if with_time and not loop.dead_time_s:
                entry["time"] = _time_readings(loop)
        return entry


def _row(*numbers: mpf) -> list[float | None]:
    return [float(x) if mp.isfinite(x) else None for x in numbers]


def _plain(readings: dict[str, Any]) -> dict[str, Any]:
    return {
        name: value if isinstance(value, str) or value is None else float(value) for name, value in readings.items()
    }


def last_phase_rad_s(loop: Loop) -> mpf:
    """Where the list of phase crossovers of a loop with dead time ends."""
    if not loop.dead_time_s:
        return mpf("inf")
    farthest = 2 * mp.pi * FARTHEST_TURN / loop.dead_time_s
    sizes = [abs(r) for r in loop.rational.zeros + loop.rational.poles if r != 0]
    last = 4 * max(sizes, default=mpf(1))
    while last < farthest and abs(loop.rational.at(mp.mpc(0, last))) > QUIET:
        last *= mpf("1.3")
    return min(last, farthest)


def _stability(loop: Loop) -> dict[str, Any]:
    count = unstable_poles_by_encirclement(loop)
    if loop.dead_time_s:
        return {"unstable_poles": count}
    if unstable_poles_by_roots(loop) != count:
        raise ArithmeticError("the two stability references disagree")
    poles = closed_loop_poles(loop)
    conditions = pole_conditions(loop, poles)
    listed = [_row(mp.re(p), mp.im(p), c) for p, c in zip(poles, conditions, strict=True) if mp.im(p) >= 0]
    return {"unstable_poles": count, "closed_loop_poles": sorted(listed)}


def _margin_readings(loop: Loop, gains: list, phases: list) -> dict[str, Any]:
    increase, reduction = margins.gain_margins_db(loop, phases)
    downward = [c.rad_s for c in gains if c.direction < 0]
    readings = {
        "phase_margin_deg": margins.phase_margin_deg(gains),
        "gain_margin_db": increase,
        "gain_reduction_margin_db": reduction,
        "delay_margin_s": margins.delay_margin_s(loop, gains),
        "crossover_rad_s": downward[0] if downward else "absent",
        "last_crossover_rad_s": gains[-1].rad_s if gains else "absent",
        "bandwidth_rad_s": peaks.bandwidth_rad_s(loop) or "absent",
        **margins.error_constants(loop),
        **margins.final_errors(loop),
    }
    if not loop.dead_time_s:
        poles = closed_loop_poles(loop)
        readings["least_damping"] = min(-mp.re(p) / abs(p) for p in poles)
        readings["slowest_pole_rad_s"] = min(-mp.re(p) for p in poles)
    return readings


def _bandwidth_condition(loop: Loop, omega: float | str) -> float | None:
    """Relative change of the bandwidth per relative change of the roots and the gain."""
    if isinstance(omega, str):
        return None
    s = mp.mpc(0, omega)
    steep = abs(mp.re(s * loop.log_slope(s) / (1 + loop.at(s))))
    at_zero = 1 + len(loop.rational.poles) + len(loop.rational.zeros)
    return float(1 + (loop.parameter_weight(s) / abs(1 + loop.at(s)) + at_zero) / steep)


def _peak(loop: Loop, kind: str) -> list[float | None]:
    """[sup, ω (None at infinity), relative change per relative change of the roots]; sup None where unbounded."""
    top, where = peaks.supremum(loop, kind)
    if not mp.isfinite(top):
        return [None, None, None]
    condition = mpf(1)
    if mp.isfinite(where) and where > 0:
        s = mp.mpc(0, where)
        level = loop.at(s)
        condition = loop.parameter_weight(s) * (1 + abs(level)) / abs(1 + level)
    return _row(top, where, condition)


def _time_readings(loop: Loop) -> dict[str, list[float]] | None:
    """Step measures as [value, what 1e-6 of the response's peak makes of it]; None where too long to be sampled."""
    poles = closed_loop_poles(loop)
    try:
        command = features(response(loop, "command", poles=poles))
        load = features(response(loop, "load", poles=poles))
        if max(len(command.times), len(load.times)) > TOO_LONG:
            return None
        readings = _command_readings(command) if command.modal.constant != 0 else {}
        peak = greatest_magnitude(load)
        settled = last_exit(load, peak * mpf("0.02"))
        readings["load_peak"] = (peak, peak * SHARE)
        readings["load_settling_time_s"] = (settled, _time_share(load, settled, peak))
        if len(loop.compensator.zeros) <= len(loop.compensator.poles):
            effort = greatest_magnitude(features(response(loop, "effort", poles=poles)))
            readings["peak_effort"] = (effort, effort * SHARE)
        return {name: [float(x) for x in pair] for name, pair in readings.items()}
    except ArithmeticError:
        return None


SHARE = mpf(10) ** -6


def _command_readings(command: Features) -> dict[str, tuple[mpf, mpf]]:
    measures = step_measures(command)
    peak, final = greatest_magnitude(command), abs(command.modal.constant)
    percent = 100 * SHARE * peak / final
    reached = [first_reach(command, command.modal.constant * part) for part in (mpf("0.1"), mpf("0.9"))]
    slack = {
        "overshoot_pct": percent,
        "undershoot_pct": percent,
        "rise_time_s": sum(_time_share(command, t, peak) for t in reached),
        "settling_time_s": _time_share(command, measures["settling_time_s"], peak),
    }
    return {name: (measures[name], slack[name]) for name in measures}


def _time_share(found: Features, t: mpf, peak: mpf) -> mpf:
    """How far a crossing at t moves when the response moves by 1e-6 of its peak."""
    return SHARE * (peak / abs(found.modal.rate(t)) if t > 0 else 0) + SHARE * t
