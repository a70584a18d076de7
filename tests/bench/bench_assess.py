"""How long a full live assessment takes, and how that compares with a plain scipy.signal script.

Run: python -m tests.bench.bench_assess [--steps 200]

Five cases, order 12 with two modes of damping 0.005, 600 frequencies, every measure, three responses; then the same
with dead time. Both programs run in the same process on one core; medians and their ratios are printed.

The script gives curves and responses on grids: no polished crossing, no proof, no suprema, no dead time. Its time grid
is uniform, as scipy.signal wants it. With as many samples as the assessment draws it steps over the first instants of
the effort; `same_curves` is the coarsest grid (doubling) on which its three responses, joined by straight lines, agree
with the assessment's (which are good to 1e-6) to 1 % of their peaks. The first figure flatters the script, the second
compares like with like.
"""

from __future__ import annotations

import argparse
import json
import os

os.environ.update(dict.fromkeys(("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS"), "1"))

import statistics
import time
from collections.abc import Callable
from typing import Any

import numpy as np
from scipy import signal

from engine.design.assess import assess_with_arrays
from engine.design.parse import parse_design
from engine.design.resolve import loops_of
from engine.loop.loop_set import LoopSet
from server.collector import settle_collector
from tests.bench.live_designs import live_design

DEAD_TIME_S = 0.004


def plain_script(loops: LoopSet, horizon_s: float, samples: int) -> dict[str, Any]:
    """What an engineer would write with scipy.signal: margins off the grid, three step responses a case."""
    omega = np.logspace(-2, 4, 600)
    time_s = np.linspace(0, horizon_s, samples)
    found = []
    for plant in loops.plants:
        c = loops.compensator
        zeros, poles, gain = [*c.zeros, *plant.zeros], [*c.poles, *plant.poles], c.gain * plant.gain
        _, response = signal.freqs_zpk(zeros, poles, gain, omega)
        magnitude = 20 * np.log10(np.abs(response))
        phase = np.degrees(np.unwrap(np.angle(response)))
        at = np.flatnonzero(np.diff(np.sign(magnitude)))
        through = np.flatnonzero(np.diff(np.sign(phase + 180)))
        sensitivity = 1 / (1 + response)
        numerator, denominator = np.real(gain * np.poly(zeros)), np.real(np.poly(poles))
        closed = np.polyadd(numerator, denominator)
        np_c, dp_c = np.real(c.gain * np.poly(c.zeros)), np.real(np.poly(c.poles))
        np_p, dp_p = np.real(plant.gain * np.poly(plant.zeros)), np.real(np.poly(plant.poles))
        tops = (numerator, np.polymul(np_p, dp_c), np.polymul(np_c, dp_p))
        responses = [signal.step((top, closed), T=time_s)[1] for top in tops]
        found.append((magnitude, phase, phase[at] + 180, -magnitude[through], np.abs(sensitivity).max(), responses))
    return {"cases": found}


def same_curves(loops: LoopSet, arrays: dict[str, Any], horizon_s: float) -> tuple[int, float]:
    """Samples of the coarsest uniform grid on which the script draws our responses to 1 % of their peaks; its error."""
    samples, error = 200, np.inf
    while error > 0.01 and samples < 100_000:
        samples *= 2
        grid_s = np.linspace(0, horizon_s, samples)
        error = 0.0
        for index, case in enumerate(plain_script(loops, horizon_s, samples)["cases"]):
            for name, response in zip(("command", "load", "effort"), case[-1], strict=True):
                wanted = arrays[name][index]
                off = np.abs(np.interp(arrays["time_s"], grid_s, response) - wanted).max()
                error = max(error, float(off / np.abs(wanted).max()))
    return samples, error


def median_ms(work: Callable[[int], Any], steps: int) -> float:
    """Median wall time of `work(step)` in milliseconds, after a warm-up."""
    for step in range(5):
        work(step)
    taken = []
    for step in range(steps):
        start = time.perf_counter()
        work(step)
        taken.append(1e3 * (time.perf_counter() - start))
    return statistics.median(taken)


def main() -> None:
    """Print the figures as one JSON object."""
    options = argparse.ArgumentParser(description=__doc__)
    options.add_argument("--steps", type=int, default=200)
    steps = options.parse_args().steps
    designs = [parse_design(live_design(step)) for step in range(97)]
    delayed = [parse_design(live_design(step, DEAD_TIME_S)) for step in range(97)]
    arrays = assess_with_arrays(designs[0])[1]
    horizon_s, samples = float(arrays["time_s"][-1]), len(arrays["time_s"])
    fine, error = same_curves(loops_of(designs[0]), arrays, horizon_s)
    settle_collector()  # as the live worker does
    ours = median_ms(lambda step: assess_with_arrays(designs[step % 97]), steps)
    few = max(steps // 10, 10)
    script = median_ms(lambda step: plain_script(loops_of(designs[step % 97]), horizon_s, samples), few)
    same = median_ms(lambda step: plain_script(loops_of(designs[step % 97]), horizon_s, fine), few)
    with_dead_time = median_ms(lambda step: assess_with_arrays(delayed[step % 97]), steps)
    reading_in = median_ms(lambda step: parse_design(live_design(step)), steps)
    figures = {
        "assessment_ms": ours,
        "assessment_with_dead_time_ms": with_dead_time,
        "frequencies": len(arrays["omega_rad_s"]),
        "samples": samples,
        "script_ms": script,
        "script_over_assessment": script / ours,
        "script_same_curves_samples": fine,
        "script_same_curves_error": error,
        "script_same_curves_ms": same,
        "script_same_curves_over_assessment": same / ours,
        "parse_ms": reading_in,
    }
    print(json.dumps({name: round(value, 4) for name, value in figures.items()}, indent=2))


if __name__ == "__main__":
    main()
