"""The comparison that brute force rests on must notice: a value off by a millionth, a crossing lost or invented."""

from __future__ import annotations

import copy

import pytest

from tests.outside.agreement import disagreements, time_disagreements
from tests.outside.designs import case_of
from tests.outside.make_reference import stored

ENTRY = next(
    e
    for e in stored()
    if not e["unstable_poles"] and e.get("time") and len(e["gain_crossings"]) > 1 and e["phase_crossings"]
)
UNSTABLE = next(e for e in stored() if e["unstable_poles"])
LIMITED_BELOW = next(
    e for e in stored() if not e["unstable_poles"] and e["readings"]["gain_reduction_margin_db"] != "unlimited"
)


def test_the_engine_agrees_to_begin_with():
    assert disagreements(ENTRY, case_of(ENTRY["design"])) == []
    assert time_disagreements(ENTRY, case_of(ENTRY["design"])) == []


COMPARED = [
    "phase_margin_deg", "gain_margin_db", "delay_margin_s", "crossover_rad_s", "last_crossover_rad_s",
    "bandwidth_rad_s", "peak_sensitivity", "peak_complementary_sensitivity", "effort_gain_db", "disk_margin",
    "least_damping", "slowest_pole_rad_s",
]  # fmt: skip


@pytest.mark.parametrize("measure", COMPARED)
def test_a_reading_off_by_a_millionth_is_noticed(measure):
    case = copy.deepcopy(case_of(ENTRY["design"]))
    if case["readings"][measure]["state"] != "value":
        case["readings"][measure] |= {"state": "value", "value": 1.0}
    else:
        case["readings"][measure]["value"] *= 1 + 1e-6
    assert any(measure in line for line in disagreements(ENTRY, case))


def test_a_reduction_margin_off_by_a_millionth_is_noticed():
    case = copy.deepcopy(case_of(LIMITED_BELOW["design"]))
    case["readings"]["gain_reduction_margin_db"]["value"] *= 1 + 1e-6
    assert any("gain_reduction_margin_db" in line for line in disagreements(LIMITED_BELOW, case))


@pytest.mark.parametrize("measure", sorted(ENTRY["time"]))
def test_a_step_measure_off_by_a_thousandth_is_noticed(measure):
    case = copy.deepcopy(case_of(ENTRY["design"]))
    case["readings"][measure]["value"] = case["readings"][measure]["value"] * 1.001 + 0.001
    assert any(measure in line for line in time_disagreements(ENTRY, case))


@pytest.mark.parametrize("listing", ["gain_crossovers", "phase_crossovers"])
def test_a_crossing_lost_invented_or_moved_is_noticed(listing):
    for spoil in (
        lambda crossings: crossings.pop(),
        lambda crossings: crossings.append(crossings[-1] | {"rad_s": crossings[-1]["rad_s"] * 1.5}),
        lambda crossings: crossings[0].update(rad_s=crossings[0]["rad_s"] * (1 + 1e-6)),
    ):
        case = copy.deepcopy(case_of(ENTRY["design"]))
        spoil(case[listing])
        assert disagreements(ENTRY, case)


def test_a_wrong_verdict_on_stability_is_noticed():
    case = copy.deepcopy(case_of(ENTRY["design"]))
    assert disagreements(ENTRY, case | {"stable": False})
    case = copy.deepcopy(case_of(UNSTABLE["design"]))
    assert disagreements(UNSTABLE, case) == []
    assert disagreements(UNSTABLE, case | {"stable": True})
    assert disagreements(UNSTABLE, case | {"unstable_poles": case["unstable_poles"] + 1})


def test_a_pole_that_moved_is_noticed():
    case = copy.deepcopy(case_of(ENTRY["design"]))
    case["closed_loop_poles"][0][0] *= 1 + 1e-6
    assert any("closed-loop pole" in line for line in disagreements(ENTRY, case))
