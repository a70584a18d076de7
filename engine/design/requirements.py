"""Judging one row of the sheet on every plant case it names."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import cast

import numpy as np

from engine.design.document import Requirement
from engine.design.measures import MEASURES, SCALE_STEP, Measure, Side
from engine.design.wording import number, quantity
from engine.loop.at_frequency import BandQuantity, extreme_over, level_at, worst_against_mask
from engine.loop.loop_set import LoopSet
from engine.loop.reading import Reading, value, without_value

MOST_SLACK = 20.0
"""Slack is a finite number: a ratio to an exact zero counts as this much."""
ROUNDING_SLACK = 1e-9
"""Slacks of two cases that differ by less differ by rounding only."""
_LEAST_DB = -600.0


@dataclass(frozen=True, slots=True)
class Judged:
    """One requirement on one plant case, or the worst of them."""

    reading: Reading
    slack: float | None
    """Positive is good; None where there is no number to compare."""
    met: bool | None
    """None: not assessable."""
    shortfall: str = ""
    """What is missing, in the measure's own unit; "" when met."""
    case: int | None = None
    limit: float | None = None
    """The limit that binds (for a mask, its value at the worst frequency)."""


def judge(row: Requirement, readings: Sequence[Mapping[str, Reading]], stable: Sequence[bool],
          loops: LoopSet, chosen: Sequence[int], unit: str) -> Judged:  # fmt: skip
    """The worst case of one requirement.

    Parameters
    ----------
    row : the requirement
    readings : per plant case, all readings by measure name
    stable : per plant case; every requirement needs a stable loop
    loops : the loops, for measures read at chosen frequencies
    chosen : indices of the plant cases the row applies to
    unit : in which a shortfall is told
    """
    measure = MEASURES[row.measure]
    if measure.per_frequency:
        judged = _judge_at_frequencies(row, measure, loops)
    else:
        judged = [_compare(row, measure, case[row.measure]) for case in readings]
    per_case = [_with_case(judged[index], index, stable[index]) for index in chosen]
    worst = _first_of_the_worst(per_case)
    if worst.met is False and worst.reading.value is not None and worst.limit is not None:
        return replace(worst, shortfall=_shortfall(unit, worst.reading.value, worst.limit))
    return worst


def _first_of_the_worst(per_case: Sequence[Judged]) -> Judged:
    """The worst case; of several that agree but for rounding the first, so that its name stays while a marker moves."""
    worst_kind, worst_room = min(_badness(judged) for judged in per_case)
    return next(
        judged
        for judged in per_case
        for kind, room in [_badness(judged)]
        if kind == worst_kind and room <= worst_room + ROUNDING_SLACK
    )


def slack_of(scale: str, side: Side, found: float, limit: float) -> float:
    """Room on one side, positive is good: angles Δ/30°, dB Δ/6, percent Δ/10 points, else ln of the ratio."""
    if scale != "ratio":
        room = (found - limit if side == "at_least" else limit - found) / SCALE_STEP[scale]  # type: ignore[index]
    elif found <= 0 or limit <= 0:
        better = found >= limit if side == "at_least" else found <= limit
        room = 0.0 if found == limit else math.copysign(MOST_SLACK, 1.0 if better else -1.0)
    else:
        # log1p keeps the sign right when value and limit agree to the last digits.
        room = (
            math.log1p((found - limit) / limit)
            if abs(found - limit) < 0.5 * limit
            else math.log(found) - math.log(limit)
        )
        room = room if side == "at_least" else -room
    return min(max(room, -MOST_SLACK), MOST_SLACK)


def _with_case(judged: Judged, index: int, stable: bool) -> Judged:
    if not stable:
        why = "the closed loop is unstable"
        return Judged(without_value("unstable", why), None, False, why, index)
    return Judged(judged.reading, judged.slack, judged.met, judged.shortfall, index, judged.limit)


def _badness(judged: Judged) -> tuple[int, float]:
    """Sort key: unmet without a number, unmet, not assessable, met with least room, met without limit."""
    if judged.met is None:
        return (2, 0.0)
    if judged.slack is None:
        return (4, 0.0) if judged.met else (0, 0.0)
    return (3 if judged.met else 1, judged.slack)


def _compare(row: Requirement, measure: Measure, reading: Reading) -> Judged:
    sides: list[tuple[Side, float]] = []
    if row.at_least is not None:
        sides.append(("at_least", row.at_least))
    if row.at_most is not None:
        sides.append(("at_most", row.at_most))
    return min((_one_side(measure, reading, side, limit) for side, limit in sides), key=_badness)


def _one_side(measure: Measure, reading: Reading, side: Side, limit: float) -> Judged:
    if reading.state == "value" and reading.value is not None:
        met = reading.value >= limit if side == "at_least" else reading.value <= limit
        slack = slack_of(measure.scale, side, reading.value, limit)
        return Judged(reading, slack, met, "", None, limit)
    if reading.state == "not determinable":
        return Judged(reading, None, None, reading.why, None, limit)
    met = reading.state == "unlimited" and side == "at_least"
    return Judged(reading, None, met, "" if met else reading.why or reading.state, None, limit)


def _shortfall(unit: str, found: float, limit: float) -> str:
    gap = quantity(abs(found - limit), "points" if unit == "%" else unit)
    return f"{gap} {'short' if found < limit else 'over'}"


# --- measures read at chosen frequencies ------------------------------------------------------------------------


def _judge_at_frequencies(row: Requirement, measure: Measure, loops: LoopSet) -> list[Judged]:
    if row.mask is not None:
        return _judge_mask(row, measure, loops)
    sides: list[tuple[Side, float]] = []
    if row.at_least is not None:
        sides.append(("at_least", row.at_least))
    if row.at_most is not None:
        sides.append(("at_most", row.at_most))
    per_side = []
    quantity = cast(BandQuantity, measure.name)
    for side, limit in sides:
        if row.at_rad_s is not None:
            levels = level_at(loops, quantity, row.at_rad_s)
            places = [row.at_rad_s] * loops.count
        else:
            low, high = row.over_rad_s or (math.nan, math.nan)
            levels, found_at = extreme_over(loops, quantity, low, high, "least" if side == "at_least" else "greatest")
            places = [float(place) for place in found_at]
        per_side.append([
            _one_side(measure, _level(float(level), place), side, limit)
            for level, place in zip(levels, places, strict=True)
        ])  # fmt: skip
    return [min(pair, key=_badness) for pair in zip(*per_side, strict=True)]


def _judge_mask(row: Requirement, measure: Measure, loops: LoopSet) -> list[Judged]:
    side: Side = row.mask_side or measure.usual
    mask = np.array(row.mask, dtype=np.float64)
    levels, limits, places = worst_against_mask(loops, cast(BandQuantity, measure.name), mask, side)
    return [
        _one_side(measure, _level(float(level), float(place)), side, float(limit))
        for level, limit, place in zip(levels, limits, places, strict=True)
    ]


def _level(level: float, at_rad_s: float) -> Reading:
    """A level as a reading; an exact zero or pole on the axis is told instead of an infinite number."""
    if math.isnan(level):
        return without_value("absent", f"not defined at {number(at_rad_s)} rad/s")
    if math.isinf(level):
        if level > 0:
            return without_value("unbounded", f"infinite at {number(at_rad_s)} rad/s")
        return value(_LEAST_DB, at_rad_s=at_rad_s, why="exactly zero there")
    return value(level, at_rad_s=at_rad_s)
