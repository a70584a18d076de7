"""The readings of step responses: overshoot, undershoot, rise and settling time, peak effort, load peak.

All are read from the response to a step command of the scenario's amplitude, whatever shape is displayed, and from the
step load. Decisions where the contract leaves room:

- A response whose final value is 0 has no size to compare with: overshoot, undershoot, rise and settling time are
  `absent`.
- Undershoot is the excursion to the side opposite to the final value, in percent of it.
- Response values just after the step (t = 0+) count: a response that starts inside its band has settled at 0 s.
- A transfer function with more zeros than poles answers a step with an impulse: the peak, and all that is compared with
  it, is `unbounded`.
- Nothing is read from an unstable loop, nor from one on the stability boundary: `unstable`.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from engine.loop.modal import COMMAND, EFFORT, LOAD
from engine.loop.reading import Reading, value, without_value
from engine.loop.response_search import (
    FIRST_REACHED,
    GREATEST,
    LAST_OUTSIDE,
    BoolArray,
    Findings,
    IntArray,
    Net,
    Responses,
    Tasks,
    search,
)
from engine.model.factored import FloatArray

MEASURES = (
    "overshoot_pct",
    "undershoot_pct",
    "rise_time_s",
    "settling_time_s",
    "peak_effort",
    "load_peak",
    "load_settling_time_s",
)
BAND = 0.02
# A final value below this share of the peak is rounding of 0.
NO_FINAL_VALUE = 1e-10
# Two values of one peak that differ by less are the same.
SAME = 1e-12
# Samples that look for the load's peak between three instants of the net.
CLOSER = 48

# What is searched for in every case: greatest and least output, 10 % and 90 % of the final value, the last exit from
# the band round it, the greatest effort, the load's peak and the last exit from the band that goes with it.
LAYOUT = (
    (GREATEST, COMMAND),
    (GREATEST, COMMAND),
    (FIRST_REACHED, COMMAND),
    (FIRST_REACHED, COMMAND),
    (LAST_OUTSIDE, COMMAND),
    (GREATEST, EFFORT),
    (GREATEST, LOAD),
    (LAST_OUTSIDE, LOAD),
)

_NO_SIZE = "the final value is 0, so there is no size to compare with"
_IMPULSE = "the response to a step begins with an impulse: more zeros than poles"
_NO_LOAD = "the load does not reach the output"


@dataclass(frozen=True, slots=True)
class StepFacts:
    """What the searches found in one stable case."""

    top: float
    bottom: float
    rise_from_s: float
    rise_to_s: float
    settled_s: float
    effort: float
    load: float
    load_settled_s: float
    top_at_s: float
    bottom_at_s: float
    effort_at_s: float
    load_at_s: float


def step_readings(net: Net, final: FloatArray, responses: Responses, impulse: BoolArray) -> list[dict[str, Reading]]:
    """Readings of the stable cases.

    Parameters
    ----------
    net : the responses at the first instants
    final : (c, 3) final values
    responses : the responses anywhere
    impulse : (c, 3) whether the step causes an impulse at t = 0
    """
    facts = _facts(net, final, responses)
    sized = (np.abs(final[:, COMMAND]) > NO_FINAL_VALUE * net.scale[:, COMMAND]).tolist()
    each = zip(facts, final[:, COMMAND].tolist(), sized, impulse.tolist(), strict=True)
    return [_case_readings(*of_case) for of_case in each]


def _facts(net: Net, final: FloatArray, responses: Responses) -> list[StepFacts]:
    """One search for everything; the load's band comes from a first look at its peak, and is checked against it."""
    cases = np.arange(len(final))
    count = len(cases)
    size = np.abs(final[:, COMMAND])
    sign = np.where(final[:, COMMAND] < 0.0, -1.0, 1.0)
    none = np.zeros(count)
    expected = _likely_load_peak(net, final, responses)
    kinds, rows = _layout(count)
    command, load = final[:, COMMAND], final[:, LOAD]
    tasks = Tasks(
        kinds,
        np.concatenate([cases] * len(LAYOUT)),
        rows,
        np.concatenate([sign, -sign, sign, sign, none, none, none, none]),
        np.concatenate([none, none, none, none, command, none, none, load]),
        np.concatenate(
            [size, none, 0.1 * size, 0.9 * size, BAND * size, np.abs(final[:, EFFORT]), np.abs(load), BAND * expected]
        ),
    )
    found = search(tasks, net, responses)
    values, times = found.value.reshape(len(LAYOUT), count), found.at_s.reshape(len(LAYOUT), count)
    peak, load_settled = values[6], times[7]
    if np.any(np.abs(peak - expected) > SAME * peak):
        load_settled = _load_settling(cases, peak, final[:, LOAD], net, responses).at_s
    columns = [values[0], values[1], times[2], times[3], times[4], values[5], peak, load_settled]
    instants = [times[0], times[1], times[5], times[6]]
    return [StepFacts(*numbers) for numbers in np.stack([*columns, *instants], axis=1).tolist()]


@lru_cache(maxsize=16)
def _layout(count: int) -> tuple[IntArray, IntArray]:
    """Kind and row of the tasks of `count` cases, case after case within each of LAYOUT."""
    kinds, rows = np.array(LAYOUT, dtype=np.int64).T
    return np.repeat(kinds, count), np.repeat(rows, count)


def _likely_load_peak(net: Net, final: FloatArray, responses: Responses) -> FloatArray:
    """(c,) the load's peak if it lies beside the largest value in the net: more samples there, then Newton's method."""
    cases = np.arange(len(final))
    size = np.abs(net.value[:, LOAD])
    at = size.argmax(axis=1)
    low = net.time_s[cases, np.maximum(at - 1, 0)]
    width = net.time_s[cases, np.minimum(at + 1, size.shape[1] - 1)] - low
    times = low[:, None] + width[:, None] * np.linspace(0.0, 1.0, CLOSER)
    every, row = np.repeat(cases, CLOSER), np.full(len(cases) * CLOSER, LOAD)
    seen = responses.glance(every, row, times.ravel(), np.repeat(width / CLOSER, CLOSER)).value
    best = np.abs(seen).reshape(len(cases), CLOSER).argmax(axis=1)
    t = times[cases, best]
    step = width / (CLOSER - 1)
    low, high = np.maximum(t - step, low), np.minimum(t + step, low + width)
    follow = responses.follow(cases, row[: len(cases)], t)
    with np.errstate(all="ignore"):
        for _ in range(3):
            _, slope, curvature = follow(t)
            move = slope / curvature
            t = np.minimum(np.maximum(t - np.where(np.isfinite(move), move, 0.0), low), high)
    peak: FloatArray = np.maximum(np.maximum(size[cases, at], np.abs(follow(t)[0])), np.abs(final[:, LOAD]))
    return peak


def _load_settling(cases: IntArray, peak: FloatArray, final: FloatArray, net: Net, responses: Responses) -> Findings:
    kind = np.full(len(cases), LAST_OUTSIDE)
    row = np.full(len(cases), LOAD)
    return search(Tasks(kind, cases, row, np.zeros(len(cases)), final, BAND * peak), net, responses)


def _case_readings(facts: StepFacts, final: float, sized: bool, impulse: list[bool]) -> dict[str, Reading]:
    """The seven readings of one case."""
    readings: dict[str, Reading] = {}
    if impulse[COMMAND]:
        readings |= dict.fromkeys(MEASURES[:4], without_value("unbounded", _IMPULSE))
    elif not sized:
        readings |= dict.fromkeys(MEASURES[:4], without_value("absent", _NO_SIZE))
    else:
        percent = 100.0 / abs(final)
        readings["overshoot_pct"] = _excursion(percent * (facts.top - abs(final)), facts.top_at_s)
        readings["undershoot_pct"] = _excursion(percent * facts.bottom, facts.bottom_at_s)
        readings["rise_time_s"] = value(facts.rise_to_s - facts.rise_from_s, at_s=facts.rise_to_s)
        readings["settling_time_s"] = value(facts.settled_s, at_s=facts.settled_s)
    readings["peak_effort"] = _peak(impulse[EFFORT], facts.effort, facts.effort_at_s)
    readings["load_peak"] = _peak(impulse[LOAD], facts.load, facts.load_at_s)
    if impulse[LOAD]:
        readings["load_settling_time_s"] = without_value("unbounded", _IMPULSE)
    elif facts.load == 0.0:
        readings["load_settling_time_s"] = without_value("absent", _NO_LOAD)
    else:
        readings["load_settling_time_s"] = value(facts.load_settled_s, at_s=facts.load_settled_s)
    return readings


def _excursion(percent: float, at_s: float) -> Reading:
    """An excursion; without one, 0 and no instant."""
    if not math.isfinite(at_s):
        return value(0.0)
    return value(percent, at_s=at_s)


def _peak(impulse: bool, peak: float, at_s: float) -> Reading:
    if impulse:
        return without_value("unbounded", _IMPULSE)
    if not math.isfinite(at_s):
        return value(peak, why="approached as time goes on, never exceeded")
    return value(peak, at_s=at_s)
