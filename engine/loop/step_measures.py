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

from dataclasses import dataclass

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

_NO_SIZE = "the final value is 0, so there is no size to compare with"
_IMPULSE = "the response to a step begins with an impulse: more zeros than poles"
_NO_LOAD = "the load does not reach the output"


@dataclass(frozen=True, eq=False)
class StepFacts:
    """What the searches found in each of c stable cases; every array is (c,)."""

    top: FloatArray
    top_at_s: FloatArray
    bottom: FloatArray
    bottom_at_s: FloatArray
    rise_from_s: FloatArray
    rise_to_s: FloatArray
    settled_s: FloatArray
    effort: FloatArray
    effort_at_s: FloatArray
    load: FloatArray
    load_at_s: FloatArray
    load_settled_s: FloatArray


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
    sized = np.abs(final[:, COMMAND]) > NO_FINAL_VALUE * net.scale[:, COMMAND]
    return [
        _case_readings(facts, case, float(final[case, COMMAND]), bool(sized[case]), impulse[case].tolist())
        for case in range(len(final))
    ]


def _facts(net: Net, final: FloatArray, responses: Responses) -> StepFacts:
    """Two searches: the load's band is known only once its peak is."""
    cases = np.arange(len(final))
    count = len(cases)
    size = np.abs(final[:, COMMAND])
    sign = np.where(final[:, COMMAND] < 0.0, -1.0, 1.0)
    ones, none = np.ones(count), np.zeros(count)
    rows = [
        (GREATEST, COMMAND, sign, none, size),
        (GREATEST, COMMAND, -sign, none, none),
        (FIRST_REACHED, COMMAND, sign, none, 0.1 * size),
        (FIRST_REACHED, COMMAND, sign, none, 0.9 * size),
        (LAST_OUTSIDE, COMMAND, none, final[:, COMMAND], BAND * size),
        (GREATEST, EFFORT, none, none, np.abs(final[:, EFFORT])),
        (GREATEST, LOAD, none, none, np.abs(final[:, LOAD])),
    ]
    tasks = Tasks(
        np.repeat(np.array([row[0] for row in rows]), count),
        np.tile(cases, len(rows)),
        np.repeat(np.array([row[1] for row in rows]), count),
        np.concatenate([row[2] * ones for row in rows]),
        np.concatenate([row[3] for row in rows]),
        np.concatenate([row[4] for row in rows]),
    )
    found = search(tasks, net, responses)
    values, times = found.value.reshape(len(rows), count), found.at_s.reshape(len(rows), count)
    settled = _load_settling(cases, values[6], final[:, LOAD], net, responses)
    return StepFacts(
        values[0], times[0], values[1], times[1], times[2], times[3], times[4],
        values[5], times[5], values[6], times[6], settled.at_s,
    )  # fmt: skip


def _load_settling(cases: IntArray, peak: FloatArray, final: FloatArray, net: Net, responses: Responses) -> Findings:
    kind = np.full(len(cases), LAST_OUTSIDE)
    row = np.full(len(cases), LOAD)
    return search(Tasks(kind, cases, row, np.zeros(len(cases)), final, BAND * peak), net, responses)


def _case_readings(facts: StepFacts, case: int, final: float, sized: bool, impulse: list[bool]) -> dict[str, Reading]:
    """The seven readings of one case."""
    readings: dict[str, Reading] = {}
    if impulse[COMMAND]:
        readings |= dict.fromkeys(MEASURES[:4], without_value("unbounded", _IMPULSE))
    elif not sized:
        readings |= dict.fromkeys(MEASURES[:4], without_value("absent", _NO_SIZE))
    else:
        percent = 100.0 / abs(final)
        readings["overshoot_pct"] = _excursion(
            percent * (float(facts.top[case]) - abs(final)), float(facts.top_at_s[case])
        )
        readings["undershoot_pct"] = _excursion(percent * float(facts.bottom[case]), float(facts.bottom_at_s[case]))
        reached = float(facts.rise_to_s[case])
        readings["rise_time_s"] = value(reached - float(facts.rise_from_s[case]), at_s=reached)
        settled = float(facts.settled_s[case])
        readings["settling_time_s"] = value(settled, at_s=settled)
    readings["peak_effort"] = _peak(impulse[EFFORT], float(facts.effort[case]), float(facts.effort_at_s[case]))
    readings["load_peak"] = _peak(impulse[LOAD], float(facts.load[case]), float(facts.load_at_s[case]))
    if impulse[LOAD]:
        readings["load_settling_time_s"] = without_value("unbounded", _IMPULSE)
    elif facts.load[case] == 0.0:
        readings["load_settling_time_s"] = without_value("absent", _NO_LOAD)
    else:
        settled = float(facts.load_settled_s[case])
        readings["load_settling_time_s"] = value(settled, at_s=settled)
    return readings


def _excursion(percent: float, at_s: float) -> Reading:
    """An excursion; without one, 0 and no instant."""
    if not np.isfinite(at_s):
        return value(0.0)
    return value(percent, at_s=at_s)


def _peak(impulse: bool, peak: float, at_s: float) -> Reading:
    if impulse:
        return without_value("unbounded", _IMPULSE)
    if not np.isfinite(at_s):
        return value(peak, why="approached as time goes on, never exceeded")
    return value(peak, at_s=at_s)
