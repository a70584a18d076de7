"""The engine against 60-digit references on seeded random loops.

`random_loops.json` is written by `python -m tests.outside.make_reference`; a part of it is recomputed here every time.
Tolerance: 1e-8 relative, or 100 roundings of the entries times the condition of the value where that is more.
"""

from __future__ import annotations

from functools import lru_cache
from typing import Any

import numpy as np
import pytest
from mpmath import mp, mpc, mpf

from engine.design.assess import assess
from engine.design.parse import parse_design
from tests.outside import exact_polynomial as polynomial
from tests.outside import hinf_norm
from tests.outside.agreement import PEAKS, disagreements, off, time_disagreements
from tests.outside.closed_loop import unstable_poles_by_encirclement
from tests.outside.delayed_responses import DelayedSeries
from tests.outside.loop import Loop, Part, loop_of_design
from tests.outside.make_reference import entry as recomputed
from tests.outside.make_reference import stored
from tests.outside.random_loops import COUNT
from tests.outside.responses import SIGNALS, Modal, response

ENTRIES = stored()
RATIONAL = [e for e in ENTRIES if "closed_loop_poles" in e]
STABLE = [e for e in ENTRIES if not e["unstable_poles"]]
STABLE_RATIONAL = [e for e in RATIONAL if not e["unstable_poles"]]
UNSTABLE_RATIONAL = [e for e in RATIONAL if e["unstable_poles"]]
DELAYED = [e for e in STABLE if "closed_loop_poles" not in e]
RESPONSE_SHARE = 1e-6


def name_of(entry: dict) -> str:
    return entry["design"]["plant_cases"][0]["name"]


@lru_cache(maxsize=4)
def assessed(index: int) -> dict[str, Any]:
    return assess(parse_design(ENTRIES[index]["design"]), curves=True)


def each(entries: list[dict]) -> Any:
    return pytest.mark.parametrize("entry", entries, ids=name_of)


def test_the_loops_cover_what_they_promise():
    assert len(ENTRIES) == COUNT >= 300
    loops = [loop_of_design(e["design"]) for e in ENTRIES]
    assert {len(x.rational.poles) for x in loops} == set(range(1, 15))
    roots = [complex(r) for x in loops for r in x.rational.zeros + x.rational.poles if r != 0]
    sizes = [abs(r) for r in roots]
    assert max(sizes) / min(sizes) > 1e6
    assert min(-r.real / abs(r) for r in roots if r.real < 0) < 6e-4
    assert sum(any(mp.re(p) > 0 for p in x.rational.poles) for x in loops) >= 20
    assert sum(any(mp.re(z) > 0 for z in x.rational.zeros) for x in loops) >= 20
    assert sum(x.rational.gain < 0 for x in loops) >= 50
    assert len(ENTRIES) - len(RATIONAL) >= 60
    assert len(STABLE) >= 200
    assert len(ENTRIES) - len(STABLE) >= 30
    reduced = [e for e in STABLE if e["readings"]["gain_reduction_margin_db"] != "unlimited"]
    assert len(reduced) >= 20  # conditionally stable or open-loop unstable


@pytest.mark.parametrize("index", range(5, COUNT, 41))
def test_the_stored_references_are_what_the_references_say(index):
    fresh = recomputed(index)
    assert _rounded(fresh) == _rounded(ENTRIES[index])


def _rounded(value: Any) -> Any:
    """Twelve digits: between machines the last digits of double-precision search results may differ."""
    if isinstance(value, dict):
        return {k: _rounded(v) for k, v in value.items() if k != "time"}
    if isinstance(value, list):
        return [_rounded(v) for v in value]
    return float(f"{value:.11e}") if isinstance(value, float) else value


@each(ENTRIES)
def test_frequency_side(entry):
    assert disagreements(entry, assessed(entry["index"])["cases"][0]) == []


@each([e for e in STABLE if e.get("time")])
def test_step_measures(entry):
    assert time_disagreements(entry, assessed(entry["index"])["cases"][0]) == []


@each(STABLE_RATIONAL[::2])
def test_peaks_by_hamiltonian_eigenvalues(entry):
    """Where the realisation reproduces the peak to 1e-9, its norm and the engine's peak agree to 1e-8."""
    with mp.workdps(60):
        loop = loop_of_design(entry["design"])
        poles = _polished_poles(loop, entry)
        judged = 0
        for kind, (name, spelled) in PEAKS.items():
            sup, where, condition = entry["peaks"][kind]
            if sup is None or sup == 0:
                continue
            space = hinf_norm.modal_state_space(loop, kind, poles)
            at = 1e12 if where is None else where
            if abs(hinf_norm.gain_at(space, at) / sup - 1) > 1e-9 or condition * 1e-15 > 1e-9:
                continue
            norm = hinf_norm.norm(space)
            if norm < hinf_norm.gain_at(space, at) * (1 - 1e-9):
                continue  # below a gain that its own state space reaches: the norm has refuted itself
            judged += 1
            got = assessed(entry["index"])["cases"][0]["readings"][name]["value"]
            want = spelled(norm)
            scale = 20 / np.log(10) if name.endswith("_db") else abs(want)
            assert list(off(name, got, want, 1e-8 * scale)) == []
        if not judged:
            pytest.skip("no realisation in double precision is exact enough to judge this loop")


def _polished_poles(loop: Loop, entry: dict) -> list[mpc]:
    """The stored poles by Newton's method on N + D, to the working precision."""
    slope = polynomial.derivative(loop.closed)
    poles = []
    for real, imaginary, _ in entry["closed_loop_poles"]:
        pole = mpc(real, imaginary)
        for _ in range(4):
            pole -= polynomial.evaluate(loop.closed, pole) / polynomial.evaluate(slope, pole)
        poles += [pole, mp.conj(pole)] if imaginary else [mpc(mp.re(pole))]
    return poles


@each(STABLE_RATIONAL[::2] + UNSTABLE_RATIONAL)
def test_responses_by_partial_fractions(entry):
    with mp.workdps(60):
        loop = loop_of_design(entry["design"])
        poles = _polished_poles(loop, entry)
        curves = assessed(entry["index"])["curves"]
        for signal in SIGNALS:
            if signal == "effort" and len(loop.compensator.zeros) > len(loop.compensator.poles):
                continue
            _compare(curves, signal, response(loop, signal, poles=poles))


def _compare(curves: dict, signal: str, want: Modal) -> None:
    shown = [(t, y) for t, y in zip(curves["time_s"], curves[signal][0], strict=True) if y is not None]
    assert len(shown) > 20
    t, got = np.array(shown).T
    y = want.sampled(t)[0].astype(float)
    off_by = np.abs(got - y) / np.max(np.abs(y))
    worst = int(np.argmax(off_by))
    assert off_by[worst] <= RESPONSE_SHARE, f"{signal} at t = {t[worst]:g}: engine {got[worst]}, reference {y[worst]}"


@each(DELAYED[::2])
def test_slowest_and_least_damped_pole_with_dead_time(entry):
    """No closed-loop pole lies right of the slowest one, counted by encirclements of the loop shifted along s."""
    readings = assessed(entry["index"])["cases"][0]["readings"]
    slowest, least = readings["slowest_pole_rad_s"], readings["least_damping"]
    assert slowest["state"] == "value", slowest
    loop = loop_of_design(entry["design"])
    sigma = mpf(slowest["value"])
    assert unstable_poles_by_encirclement(_shifted(loop, sigma * (1 - mpf("1e-6")))) == 0
    assert unstable_poles_by_encirclement(_shifted(loop, sigma * (1 + mpf("1e-6")))) > 0
    if least["state"] == "value":
        zeta, size = mpf(least["value"]), mpf(least["at_rad_s"])
        pole = size * mpc(-zeta, mp.sqrt(1 - zeta**2))
        step = (1 + loop.at(pole)) / loop.log_slope(pole)
        assert abs(step) < 1e-7 * size  # a root of 1 + L, where L = −1 and so L' = −L'/L


def _shifted(loop: Loop, sigma: mpf) -> Loop:
    """L(s − sigma): its closed-loop poles lie sigma further right."""
    c, p = loop.compensator, loop.plant
    parts = [Part(x.gain, tuple(z + sigma for z in x.zeros), tuple(q + sigma for q in x.poles)) for x in (c, p)]
    grown = Part(parts[1].gain * mp.exp(sigma * loop.dead_time_s), parts[1].zeros, parts[1].poles)
    return Loop(parts[0], grown, loop.dead_time_s)


@each([e for e in DELAYED if len(loop_of_design(e["design"]).rational.poles) <= 5][:10])
def test_responses_by_the_series_of_delayed_terms(entry):
    loop = loop_of_design(entry["design"])
    curves = assessed(entry["index"])["curves"]
    theta = float(loop.dead_time_s)
    # At a kink a biproper loop jumps: which side a sample there shows is rounding, so it is left out.
    times = [t for t in curves["time_s"] if 0 < t < 20 * theta and abs(t / theta - round(t / theta)) > 1e-9]
    picked = sorted(set(times[:: max(1, len(times) // 12)]))
    assert picked
    for signal in SIGNALS:
        if signal == "effort" and len(loop.compensator.zeros) > len(loop.compensator.poles):
            continue
        series = DelayedSeries(loop, signal)
        values = [series.value(mpf(t)) for t in picked]
        peak = float(max(abs(v) for v in values))
        for t, want in zip(picked, values, strict=True):
            got = curves[signal][0][curves["time_s"].index(t)]
            assert list(off(f"{signal} at t = {t:g}", got, float(want), RESPONSE_SHARE * peak)) == []
