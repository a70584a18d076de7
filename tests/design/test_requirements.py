"""Judging a row: states before numbers, the worst case first, slack as the contract counts it."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from engine.design.document import Requirement
from engine.design.measures import MEASURES
from engine.design.requirements import MOST_SLACK, judge, slack_of
from engine.loop.loop_set import LoopSet
from engine.loop.reading import Reading, State, value, without_value
from engine.model.factored import Factored

NO_LOOPS = LoopSet((), Factored(1.0, np.empty(0, complex), np.empty(0, complex)))


def _judge(row: dict[str, Any], *found: Reading, stable: list[bool] | None = None, chosen: list[int] | None = None):
    requirement = Requirement(**row)
    readings = [{requirement.measure: reading} for reading in found]
    everywhere = list(range(len(found)))
    return judge(
        requirement,
        readings,
        stable or [True] * len(found),
        NO_LOOPS,
        chosen or everywhere,
        MEASURES[requirement.measure].unit,
    )


# The table of states in the contract: state, met by at_least, met by at_most.
STATES: list[tuple[State, bool | None, bool | None]] = [
    ("unlimited", True, False),
    ("unbounded", False, False),
    ("absent", False, False),
    ("not determinable", None, None),
    ("unstable", False, False),
]


@pytest.mark.parametrize(("state", "least", "most"), STATES)
def test_a_requirement_is_judged_by_state_first(state: State, least: bool | None, most: bool | None) -> None:
    reading = without_value(state, "because")
    assert _judge({"measure": "gain_margin_db", "at_least": 6}, reading).met is least
    assert _judge({"measure": "gain_margin_db", "at_most": 6}, reading).met is most


def test_the_worst_case_is_named() -> None:
    judged = _judge({"measure": "phase_margin_deg", "at_least": 45}, value(50), value(43.6), value(61))
    assert (judged.case, judged.met, judged.shortfall) == (1, False, "1.4° short")
    assert judged.slack == pytest.approx(-1.4 / 30)


def test_of_cases_that_agree_but_for_rounding_the_first_is_named() -> None:
    row = {"measure": "peak_effort", "at_most": 4.5}
    assert _judge(row, value(2.5), value(2.5 * (1 + 1e-13)), value(2.4)).case == 0
    assert _judge(row, value(2.5), value(2.5 * (1 + 1e-6)), value(2.4)).case == 1
    # A miss by the last digit stays a miss.
    limit = _judge(row, value(4.5), value(math.nextafter(4.5, 9.0)))
    assert (limit.met, limit.case) == (False, 1)


def test_a_shortfall_is_told_in_the_unit_of_the_signal() -> None:
    readings = [{"peak_effort": value(7.5)}]
    judged = judge(Requirement(measure="peak_effort", at_most=6), readings, [True], NO_LOOPS, [0], "kW")
    assert judged.shortfall == "1.5 kW over"


def test_a_row_for_some_cases_looks_at_those_only() -> None:
    judged = _judge({"measure": "phase_margin_deg", "at_least": 45}, value(10), value(50), chosen=[1])
    assert (judged.case, judged.met) == (1, True)


def test_an_unstable_loop_meets_nothing() -> None:
    judged = _judge({"measure": "velocity_error_constant", "at_least": 1}, value(9), value(9), stable=[True, False])
    assert (judged.case, judged.met, judged.reading.state, judged.slack) == (1, False, "unstable", None)


def test_a_number_outranks_unlimited_and_a_missing_one_outranks_all() -> None:
    free, held, gone = without_value("unlimited", ""), value(9), without_value("absent", "no crossover")
    assert _judge({"measure": "gain_margin_db", "at_least": 6}, free, held).case == 1
    assert _judge({"measure": "gain_margin_db", "at_least": 6}, free, held, gone).case == 2


def test_not_assessable_hides_behind_nothing_but_a_miss() -> None:
    unknown = without_value("not determinable", "the sweep ends before")
    assert _judge({"measure": "gain_margin_db", "at_least": 6}, value(9), unknown).met is None
    assert _judge({"measure": "gain_margin_db", "at_least": 6}, value(3), unknown).met is False


def test_both_sides_bind() -> None:
    row = {"measure": "crossover_rad_s", "at_least": 4.0, "at_most": 9.0}
    assert _judge(row, value(5)).slack == pytest.approx(math.log(5 / 4))
    assert _judge(row, value(8)).slack == pytest.approx(math.log(9 / 8))
    assert _judge(row, value(10)).shortfall == "1 rad/s over"


SLACKS = [
    ("angle", "at_least", 60.0, 45.0, 0.5),
    ("decibel", "at_least", 3.0, 6.0, -0.5),
    ("percent", "at_most", 20.0, 25.0, 0.5),
    ("ratio", "at_most", 2.0, 1.0, -math.log(2)),
    ("ratio", "at_least", 2.0, 1.0, math.log(2)),
    ("ratio", "at_most", 0.0, 0.02, MOST_SLACK),
    ("ratio", "at_most", 0.0, 0.0, 0.0),
]


@pytest.mark.parametrize(("scale", "side", "found", "limit", "want"), SLACKS)
def test_slack_is_counted_as_the_contract_says(scale: str, side: Any, found: float, limit: float, want: float) -> None:
    assert slack_of(scale, side, found, limit) == pytest.approx(want, rel=1e-14)


@given(
    st.sampled_from(list(MEASURES.values())),
    st.floats(1e-300, 1e300),
    st.floats(1e-300, 1e300),
    st.sampled_from(["at_least", "at_most"]),
)
def test_slack_and_verdict_never_disagree(measure: Any, found: float, limit: float, side: Any) -> None:
    if measure.per_frequency:
        return
    judged = _judge({"measure": measure.name, side: limit}, value(found))
    assert judged.slack is not None
    assert math.isfinite(judged.slack)
    assert judged.met is (judged.slack >= 0)
    assert (judged.shortfall == "") is judged.met
