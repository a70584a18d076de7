"""Step measures of loops with dead time, from the exact series of delayed terms."""

from __future__ import annotations

import pytest
from mpmath import mp, mpf

from tests.outside.agreement import off
from tests.outside.delayed_responses import DelayedSeries
from tests.outside.designs import case_of, design_of, factored
from tests.outside.loop import loop_of_design
from tests.outside.polish import bracketed_root

PER_DELAY = 8
LOOPS = {
    # name: (design, horizon in dead times: settled far below 2 % there)
    "integrating, Skogestad's setting": (design_of(factored(0.5, poles=[0], dead_time_s=1.0)), 16),
    "lag with delay, proportional": (design_of(factored(0.4, poles=[-0.2], dead_time_s=1.0), gain=1.6), 20),
    "two lags with delay, proportional-integral": (
        design_of(
            factored(2.0, poles=[-1, -2], dead_time_s=0.5),
            gain=0.7,
            stages=[{"kind": "proportional_integral", "corner_rad_s": 0.8}],
        ),
        20,
    ),
    "zero in the right half plane": (
        design_of(factored(-0.3, zeros=[2.0], poles=[0, -1.5], dead_time_s=0.8), gain=0.9),
        22,
    ),
}


class Sampled:
    """A response between kinks: 8 samples a dead time, extrema by golden section on the exact series."""

    def __init__(self, series: DelayedSeries, theta: mpf, horizon: int) -> None:
        self.series = series
        grid = [theta * k / PER_DELAY for k in range(horizon * PER_DELAY + 1)]
        values = [series.value(t) for t in grid]
        self.times, self.values = [grid[0]], [values[0]]
        for i in range(1, len(grid) - 1):
            if (values[i] - values[i - 1]) * (values[i + 1] - values[i]) < 0:
                top = self._extremum(grid[i - 1], grid[i + 1], 1 if values[i] > values[i - 1] else -1)
                self.times.append(top)
                self.values.append(series.value(top))
            else:
                self.times.append(grid[i])
                self.values.append(values[i])

    def _extremum(self, a: mpf, b: mpf, sign: int) -> mpf:
        ratio = (mp.sqrt(5) - 1) / 2
        for _ in range(34):  # 1e-7 of the bracket: the value is good to 1e-14
            c, d = b - ratio * (b - a), a + ratio * (b - a)
            if sign * self.series.value(c) > sign * self.series.value(d):
                b = d
            else:
                a = c
        return (a + b) / 2

    def reach(self, level: mpf) -> mpf:
        for i in range(1, len(self.times)):
            if (self.values[i - 1] - level) * (self.values[i] - level) < 0:
                return self._root(level, self.times[i - 1], self.times[i])
        raise ArithmeticError("level is never reached")

    def last_exit(self, final: mpf, half_width: mpf) -> mpf:
        for i in range(len(self.times) - 1, 0, -1):
            if abs(self.values[i - 1] - final) > half_width >= abs(self.values[i] - final):
                edge = final + half_width * mp.sign(self.values[i - 1] - final)
                return self._root(edge, self.times[i - 1], self.times[i])
        raise ArithmeticError("never outside")

    def _root(self, level: mpf, a: mpf, b: mpf) -> mpf:
        with mp.workdps(20):
            return bracketed_root(lambda t: self.series.value(t) - level, a, b)


@pytest.mark.parametrize(("design", "horizon"), LOOPS.values(), ids=LOOPS.keys())
def test_step_measures_with_dead_time(design, horizon):
    with mp.workdps(40):
        loop = loop_of_design(design)
        command = Sampled(DelayedSeries(loop, "command"), loop.dead_time_s, horizon)
        load = Sampled(DelayedSeries(loop, "load"), loop.dead_time_s, horizon)
        below, above = loop.rational.denominator[0], loop.rational.numerator[0]
        final = above / (below + above)
        load_final = loop.plant.numerator[0] * loop.compensator.denominator[0] / (below + above)
        assert abs(command.values[-1] - final) < mpf("5e-3") * abs(final)  # the horizon holds the last exit
        load_peak = max(abs(v) for v in load.values)
        want = {
            "overshoot_pct": max(mpf(0), max(v / final for v in command.values) - 1) * 100,
            "undershoot_pct": max(mpf(0), -min(v / final for v in command.values)) * 100,
            "rise_time_s": command.reach(final * mpf("0.9")) - command.reach(final * mpf("0.1")),
            "settling_time_s": command.last_exit(final, abs(final) * mpf("0.02")),
            "load_peak": load_peak,
            "load_settling_time_s": load.last_exit(load_final, load_peak * mpf("0.02")),
        }
    readings = case_of(design)["readings"]
    found = [
        line
        for name, value in want.items()
        for line in off(name, readings[name]["value"], float(value), 1e-6 * max(abs(float(value)), 1e-2))
    ]
    assert found == []
