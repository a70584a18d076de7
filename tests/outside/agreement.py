"""Compare what the engine says about one plant case with a record of the references; every difference in words."""

from __future__ import annotations

import math
from collections.abc import Iterator
from typing import Any

EPS = 2.0**-52
CLOSE = 1e-8
PEAKS = {
    "sensitivity": ("peak_sensitivity", lambda sup: sup),
    "complementary_sensitivity": ("peak_complementary_sensitivity", lambda sup: sup),
    "effort": ("effort_gain_db", lambda sup: 20 * math.log10(sup)),
    "disk": ("disk_margin", lambda sup: 2 / sup),
}
AS_IT_IS = ("phase_margin_deg", "gain_margin_db", "gain_reduction_margin_db")
STRUCTURAL = (
    "position_error_constant",
    "velocity_error_constant",
    "acceleration_error_constant",
    "step_error",
    "ramp_error",
    "parabola_error",
)


def allowed(condition: float | None) -> float:
    """The relative tolerance: 1e-8, or what rounding of the entries alone does to an ill-conditioned value."""
    return max(CLOSE, 100 * EPS * condition) if condition is not None else math.inf


def disagreements(entry: dict[str, Any], case: dict[str, Any]) -> list[str]:
    """Everything in which the engine's `case` differs from the record `entry`; empty when they agree."""
    found = [*_stability(entry, case), *_gain_crossings(entry, case), *_phase_crossings(entry, case)]
    if not entry["unstable_poles"] and case["stable"]:
        found += [*_margins(entry, case), *_structural(entry, case), *_poles(entry, case), *_peaks(entry, case)]
    return found


def off(what: str, got: float | None, want: float, tolerance: float) -> Iterator[str]:
    """One line if `got` is not within the absolute `tolerance` of `want`."""
    if got is None or not abs(got - want) <= tolerance:
        yield f"{what}: engine {got!r}, reference {want!r}, allowed ±{tolerance:.2g}"


def _stability(entry: dict, case: dict) -> Iterator[str]:
    if case["stable"] != (entry["unstable_poles"] == 0):
        yield f"stability: engine {case['stability']!r}, reference {entry['unstable_poles']} unstable poles"
    elif entry["unstable_poles"] != case["unstable_poles"]:
        yield f"unstable poles: engine {case['unstable_poles']}, reference {entry['unstable_poles']}"


def _gain_crossings(entry: dict, case: dict) -> Iterator[str]:
    want, got = entry["gain_crossings"], case["gain_crossovers"]
    if len(want) != len(got):
        yield f"gain crossovers: engine {[c['rad_s'] for c in got]}, reference {[c[0] for c in want]}"
        return
    for (omega, margin, _, condition, turn), crossing in zip(want, got, strict=True):
        yield from off("gain crossover", crossing["rad_s"], omega, allowed(condition) * omega)
        apart = abs((crossing["signed_phase_margin_deg"] - margin + 180) % 360 - 180)
        yield from off(f"margin at {omega:g}: {margin!r}, apart", apart, 0.0, _margin_tolerance(margin, turn))


def _margin_tolerance(margin: float, turn: float | None) -> float:
    return max(CLOSE * max(1.0, abs(margin)), 100 * EPS * turn) if turn is not None else math.inf


def _phase_crossings(entry: dict, case: dict) -> Iterator[str]:
    listed = [c for c in case["phase_crossovers"] if c["rad_s"] not in (0, None)]
    want = entry["phase_crossings"]
    if entry["phase_listed_to_rad_s"] is not None:
        # With dead time both lists end somewhere: judge what both had to see, and that no loud one is left out.
        end = entry["phase_listed_to_rad_s"] * (1 - CLOSE)
        last = max([c["rad_s"] for c in listed] + [c[0] for c in want if c[1] > 0], default=0.0) * (1 + CLOSE)
        listed = [c for c in listed if c["rad_s"] < end]
        want = [c for c in want if c[0] < last]
    if len(want) != len(listed):
        yield f"phase crossovers: engine {[c['rad_s'] for c in listed]}, reference {[c[0] for c in want]}"
        return
    for (omega, gain_db, condition, wobble), crossing in zip(want, listed, strict=True):
        yield from off("phase crossover", crossing["rad_s"], omega, allowed(condition) * omega)
        tolerance = max(CLOSE * max(1.0, abs(gain_db)), 100 * EPS * wobble) if wobble is not None else math.inf
        yield from off(f"gain at phase crossover {omega:g}", crossing["gain_db"], gain_db, tolerance)


def _margins(entry: dict, case: dict) -> Iterator[str]:
    want = entry["readings"]
    turn = max((c[4] or math.inf for c in entry["gain_crossings"]), default=1.0)
    wobble = max((c[3] or math.inf for c in entry["phase_crossings"]), default=1.0)
    loose = {"phase_margin_deg": turn, "gain_margin_db": wobble, "gain_reduction_margin_db": wobble}
    for name in AS_IT_IS:
        absolute = 100 * EPS * loose[name]
        yield from _reading(case, name, want[name], lambda x, a=absolute: max(CLOSE * max(1.0, abs(x)), a))
    steepest = max((c[3] or math.inf for c in entry["gain_crossings"]), default=1.0)
    slow = min((c[0] for c in entry["gain_crossings"]), default=1.0)
    yield from _reading(
        case,
        "delay_margin_s",
        want["delay_margin_s"],
        lambda x: max(CLOSE, 100 * EPS * steepest) * abs(x) + 100 * EPS * turn * math.pi / 180 / slow,
    )
    for name in ("crossover_rad_s", "last_crossover_rad_s"):
        yield from _reading(case, name, want[name], lambda x: allowed(steepest) * abs(x))
    yield from _reading(
        case, "bandwidth_rad_s", want["bandwidth_rad_s"], lambda x: allowed(entry["bandwidth_condition"]) * abs(x)
    )


def _structural(entry: dict, case: dict) -> Iterator[str]:
    for name in STRUCTURAL:
        yield from _reading(case, name, entry["readings"][name], lambda x: 1e-10 * abs(x) + 1e-12)


def _reading(case: dict, name: str, want: Any, tolerance: Any) -> Iterator[str]:
    got = case["readings"][name]
    if isinstance(want, str):
        if got["state"] != want:
            yield f"{name}: engine {got['state']} {got['value']}, reference {want}"
    elif got["state"] != "value":
        yield f"{name}: engine {got['state']} ({got['why']}), reference {want!r}"
    else:
        yield from off(name, got["value"], want, tolerance(want))


def _poles(entry: dict, case: dict) -> Iterator[str]:
    if "closed_loop_poles" not in entry:
        return
    want = [(complex(re, im), condition) for re, im, condition in entry["closed_loop_poles"]]
    got = [complex(*pole) for pole in case["closed_loop_poles"]]
    upper = [p for p in got if p.imag >= 0]
    if len(want) != len(upper):
        yield f"closed-loop poles: engine {got}, reference {want}"
        return
    for pole, condition in want:
        nearest = min(upper, key=lambda p, pole=pole: abs(p - pole))
        upper.remove(nearest)
        yield from off(f"closed-loop pole {pole}", abs(nearest - pole), 0.0, allowed(condition) * abs(pole))
    shake = 100 * EPS * max(condition for _, condition in want)
    least, slowest = (entry["readings"][name] for name in ("least_damping", "slowest_pole_rad_s"))
    yield from _reading(case, "least_damping", least, lambda x: max(CLOSE * x, shake))
    size = min((abs(p) for p, _ in want if -p.real <= slowest * (1 + 1e-9)), default=slowest)
    yield from _reading(case, "slowest_pole_rad_s", slowest, lambda x: max(CLOSE * x, shake * size))


def _peaks(entry: dict, case: dict) -> Iterator[str]:
    for kind, (name, spelled) in PEAKS.items():
        sup, _, condition = entry["peaks"][kind]
        got = case["readings"][name]
        if sup is None:
            if got["state"] != "unbounded":
                yield f"{name}: engine {got['state']} {got['value']}, reference unbounded"
        elif sup == 0:
            continue
        else:
            relative = allowed(condition)
            scale = 20 / math.log(10) if name.endswith("_db") else spelled(sup)
            yield from off(name, got["value"], spelled(sup), relative * scale)


def time_disagreements(entry: dict[str, Any], case: dict[str, Any]) -> list[str]:
    """Step measures: the value within what 1e-6 of the response's peak makes of it."""
    found: list[str] = []
    for name, (want, tolerance) in (entry.get("time") or {}).items():
        found += _reading(case, name, want, lambda x, t=tolerance: t + 1e-12 * abs(x))
    return found
