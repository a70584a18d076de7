"""The demos: numbers that follow from their data, one landing demo that one drag meets, proof that all can be met."""

from __future__ import annotations

import copy
import json
import math
import re
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from engine.design.assess import assess
from engine.design.document import Stage
from engine.design.measures import MEASURES
from engine.design.parse import parse_design
from engine.design.resolve import plants_of
from engine.model.evaluate import response

FOLDER = Path(__file__).parents[2] / "demo_plants"
INDEX: list[dict[str, Any]] = json.loads((FOLDER / "index.json").read_text("utf-8"))
NAMES = [entry["name"] for entry in INDEX]
LANDING = next(entry["name"] for entry in INDEX if entry["landing"])


def demo(name: str) -> dict[str, Any]:
    """A fresh copy of a demo's document."""
    read: dict[str, Any] = json.loads((FOLDER / f"{name}.json").read_text("utf-8"))
    return read


def verdict(document: dict[str, Any]) -> dict[str, Any]:
    return assess(parse_design(document))


def unmet(assessment: dict[str, Any]) -> list[str]:
    return [
        f"{row['measure']} on {row['case']}: {row['shortfall']}"
        for row in assessment["requirements"]
        if row["met"] is not True
    ]


# --- the index and the documents --------------------------------------------------------------------------------


def test_the_index_lists_every_file_once() -> None:
    files = {path.stem for path in FOLDER.glob("*.json")} - {"index"}
    assert sorted(NAMES) == sorted(files)
    assert sum(entry["landing"] for entry in INDEX) == 1
    assert INDEX[0]["landing"]
    for entry in INDEX:
        assert set(entry) == {"name", "title", "field", "summary", "landing"}
        assert entry["title"] == demo(entry["name"])["title"]
        assert entry["summary"].endswith(".")
        assert re.fullmatch(r"[a-z0-9-]+", entry["name"])


def test_the_fields_of_work_and_the_ways_to_write_a_plant_are_all_there() -> None:
    assert {"pointing", "power conversion", "thermal", "hydraulic", "motion"} <= {entry["field"] for entry in INDEX}
    kinds = {case["model"]["kind"] for name in NAMES for case in demo(name)["plant_cases"]}
    assert kinds == {"factored", "polynomial", "state_space", "expression"}
    places = {
        place
        for name in NAMES
        for row in demo(name)["requirements"]
        for place in ("at_rad_s", "over_rad_s", "mask")
        if place in row
    }
    assert places == {"at_rad_s", "over_rad_s", "mask"}


@pytest.mark.parametrize("name", NAMES)
def test_a_demo_is_a_whole_design(name: str) -> None:
    document = demo(name)
    design = parse_design(document)
    assert design.document() == document
    assert 3 <= len(design.plant_cases) <= 5
    assert 5 <= len(design.requirements) <= 9
    assert {row.rank for row in design.requirements} == {"must", "should"}
    assert all(len(row.reason) > 20 for row in design.requirements)
    assert "Units:" in design.notes
    assert "Cases:" in design.notes
    for signal in (design.signals.command, design.signals.output, design.signals.effort):
        assert signal.name
        assert signal.unit
    assert design.actuator.low is not None
    assert design.actuator.high is not None
    assert len({row.measure for row in design.requirements} & set(MEASURES)) == len(design.requirements)


@pytest.mark.parametrize("name", NAMES)
def test_a_demo_starts_stable_and_every_row_can_be_read(name: str) -> None:
    assessment = verdict(demo(name))
    assert [case["name"] for case in assessment["cases"] if not case["stable"]] == []
    for row in assessment["requirements"]:
        assert row["reading"]["state"] in ("value", "unlimited"), (row["measure"], row["reading"])


# --- met, or short for a reason that can be cured ---------------------------------------------------------------

MET_AT_THE_START = {"dish-elevation", "hydrophone-buck", "detector-cooler"}

KNOWN_GOOD: dict[str, dict[str, Any]] = {
    "falcon-pan": {
        "gain": 0.024,
        "stages": [
            {"kind": "lead_lag", "zero_rad_s": 7.0, "pole_rad_s": 160},
            {"kind": "proportional_integral", "corner_rad_s": 0.8},
            {"kind": "notch", "centre_rad_s": 130, "zero_damping": 0.15, "pole_damping": 0.9},
        ],
    },
    "trike-boost": {
        "gain": 0.42,
        "stages": [
            {"kind": "proportional_integral", "corner_rad_s": 2000},
            {"kind": "real_pole", "corner_rad_s": 2.2e5},
        ],
    },
    "cure-oven": {
        "gain": 0.34,
        "stages": [
            {"kind": "proportional_integral", "corner_rad_s": 1 / 900},
            {"kind": "lead_lag", "zero_rad_s": 1 / 120, "pole_rad_s": 1 / 45},
        ],
    },
    "knife-carriage": {
        "gain": 1.4,
        "stages": [{"kind": "notch", "centre_rad_s": 185, "zero_damping": 0.2, "pole_damping": 0.9}],
    },
    "blower-bearing": {
        "gain": 0.032,
        "stages": [
            {"kind": "proportional_integral", "corner_rad_s": 55},
            {"kind": "lead_lag", "zero_rad_s": 450, "pole_rad_s": 7500},
            {"kind": "notch", "centre_rad_s": 4500, "zero_damping": 0.08, "pole_damping": 0.5},
        ],
    },
}
"""Compensators that meet the sheets which the demos themselves do not meet."""


def test_every_demo_is_met_or_has_a_compensator_that_meets_it() -> None:
    assert MET_AT_THE_START.isdisjoint(KNOWN_GOOD)
    assert MET_AT_THE_START | set(KNOWN_GOOD) == set(NAMES)


@pytest.mark.parametrize("name", sorted(MET_AT_THE_START))
def test_these_start_met(name: str) -> None:
    assessment = verdict(demo(name))
    assert unmet(assessment) == []
    assert assessment["verdict"] == "met"


@pytest.mark.parametrize("name", sorted(KNOWN_GOOD))
def test_these_start_short_and_can_be_met(name: str) -> None:
    document = demo(name)
    assert verdict(document)["verdict"] == "not met"
    document["compensator"] = KNOWN_GOOD[name]
    assert unmet(verdict(document)) == []


# --- the landing demo -------------------------------------------------------------------------------------------

LANDING_STAGE, LANDING_HANDLE = 0, "zero_rad_s"
LANDING_MET_RAD_S = (5.7, 8.3)
"""The handle that meets the sheet, found by trying all of them, and where: 0.16 of a decade, met all along."""


def moved(document: dict[str, Any], stage: int, handle: str, value: float) -> dict[str, Any]:
    copied = copy.deepcopy(document)
    copied["compensator"]["stages"][stage][handle] = value
    return copied


def test_one_drag_meets_the_landing_demo() -> None:
    document = demo(LANDING)
    start = document["compensator"]["stages"][LANDING_STAGE][LANDING_HANDLE]
    assert document["compensator"]["stages"][LANDING_STAGE]["kind"] == "lead_lag"
    low, high = LANDING_MET_RAD_S
    assert high < start < 1.15 * high
    assert math.log10(high / low) > 0.15
    before = verdict(document)
    assert before["verdict"] == "not met"
    assert [row["measure"] for row in before["requirements"] if row["met"] is False] == ["phase_margin_deg"]
    for place in np.geomspace(low, high, 25).tolist():
        assessment = verdict(moved(document, LANDING_STAGE, LANDING_HANDLE, place))
        assert unmet(assessment) == [], place
        assert assessment["verdict"] == "met"


# --- what each demo is there for --------------------------------------------------------------------------------


def readings(name: str, compensator: dict[str, Any] | None = None) -> list[dict[str, Any]]:
    document = demo(name)
    if compensator:
        document["compensator"] = compensator
    return [case["readings"] for case in verdict(document)["cases"]]


@pytest.mark.parametrize("name", ["dish-elevation", "blower-bearing"])
def test_these_are_stable_only_between_two_gains(name: str) -> None:
    document = demo(name)
    assert "gain_reduction_margin_db" in {row["measure"] for row in document["requirements"]}
    for factor in (1e-2, 1e2):
        changed = copy.deepcopy(document)
        changed["compensator"]["gain"] *= factor
        assert not any(case["stable"] for case in verdict(changed)["cases"])


def test_the_dish_has_three_integrators_and_the_boost_a_right_half_plane_zero() -> None:
    dish = parse_design(demo("dish-elevation"))
    for plant in plants_of(dish.plant_cases):
        assert np.count_nonzero(plant.poles == 0) == 2
    assert any(stage.kind == "proportional_integral" for stage in dish.compensator.stages)
    for plant in plants_of(parse_design(demo("trike-boost")).plant_cases):
        assert np.count_nonzero(plant.zeros.real > 0) == 1


def test_dead_time_light_damping_and_a_negative_plant_are_there() -> None:
    plants = {name: plants_of(parse_design(demo(name)).plant_cases) for name in NAMES}
    assert {name for name in NAMES if plants[name][0].dead_time_s > 0} == {
        "hydrophone-buck",
        "cure-oven",
        "detector-cooler",
        "knife-carriage",
        "blower-bearing",
    }
    modes = plants["falcon-pan"][0].poles
    light = modes[modes.imag > 0]
    assert np.all(-light.real / np.abs(light) < 0.05)
    assert all(response(plant, np.array([0j]))[0].real < 0 for plant in plants["detector-cooler"])


# --- plants against the data their notes give -------------------------------------------------------------------
# By hand, from first principles; the documents state rounded numbers, hence the tolerance.

ROUNDING = 0.01


def agrees(name: str, index: int, want: Any, places: list[float], tolerance: float = ROUNDING) -> None:
    plant = plants_of(parse_design(demo(name)).plant_cases)[index]
    s = 1j * np.array(places)
    got = response(plant, s)
    np.testing.assert_allclose(got, want(s), rtol=tolerance)


@pytest.mark.parametrize(
    ("index", "load", "belt", "friction"),
    [(0, 0.34, 1450, 1.1), (1, 0.19, 1450, 1.1), (2, 0.46, 1450, 1.1), (3, 0.34, 1450, 3.0), (4, 0.34, 1090, 1.1)],
)
def test_camera_two_bodies_on_a_belt(index: int, load: float, belt: float, friction: float) -> None:
    rotor = 7.5e-5 * 40**2
    torque = 0.062 * 40 * 0.9
    mode = math.sqrt(belt * (1 / rotor + 1 / load))
    damper = 2 * 0.02 * mode / (1 / rotor + 1 / load)

    def angle_mrad(s: Any) -> Any:
        joint = damper * s + belt
        own, lens = rotor * s**2 + joint, load * s**2 + friction * s + joint
        # `belt`, not `joint`, on top: the note leaves the zero of the belt's own damping out.
        return 1000 * torque * belt / (own * lens - joint**2) / (1 + s / 1200)

    agrees("falcon-pan", index, angle_mrad, [0.1, 1.0, 8.0, 20.0, 60.0, 300.0])


@pytest.mark.parametrize(
    ("index", "reflector", "mount", "drive", "damping"),
    [
        (0, 380, 4.2e5, 160, 0.012),
        (1, 560, 4.2e5, 160, 0.015),
        (2, 300, 4.2e5, 160, 0.012),
        (3, 380, 4.2e5, 90, 0.012),
        (4, 380, 2.9e5, 160, 0.012),
    ],
)
def test_dish_reflector_on_its_mount(index: int, reflector: float, mount: float, drive: float, damping: float) -> None:
    damper = 2 * damping * math.sqrt(mount / reflector) * reflector

    def elevation_mrad(s: Any) -> Any:
        joint = damper * s + mount
        lower, upper = 140 * s**2 + joint, reflector * s**2 + joint
        return 1000 * upper / (lower * upper - joint**2) / (1 + s / drive)

    agrees("dish-elevation", index, elevation_mrad, [0.1, 1.0, 5.0, 30.0, 60.0, 200.0])


@pytest.mark.parametrize(
    ("index", "vin", "ohm", "farad", "esr"),
    [
        (0, 36, 12, 330e-6, 0.012),
        (1, 30, 12, 330e-6, 0.012),
        (2, 42, 12, 330e-6, 0.012),
        (3, 42, 90, 330e-6, 0.012),
        (4, 30, 12, 250e-6, 0.03),
    ],
)
def test_boost_averaged_current_mode(index: int, vin: float, ohm: float, farad: float, esr: float) -> None:
    share, half = vin / 60, math.pi * 200e3

    def bus_v(s: Any) -> Any:
        zeros = (1 + s * esr * farad) * (1 - s * 22e-6 / (ohm * share**2))
        poles = (1 + s * ohm * farad / 2) * (1 + 2 * 0.62 * s / half + (s / half) ** 2)
        return ohm * share / (2 * 0.05) * zeros / poles

    agrees("trike-boost", index, bus_v, [10.0, 500.0, 2e4, 2e5, 6e5])


@pytest.mark.parametrize(
    ("index", "vin", "ohm", "farad", "esr"),
    [(0, 24, 0.5, 470e-6, 0.009), (1, 30, 16.7, 470e-6, 0.009), (2, 18, 0.5, 470e-6, 0.009), (3, 30, 0.5, 4e-4, 0.016)],
)
def test_buck_filter_as_a_circuit(index: int, vin: float, ohm: float, farad: float, esr: float) -> None:
    def output_v(s: Any) -> Any:
        load = 1 / (1 / ohm + 1 / (esr + 1 / (s * farad)))
        return vin * load / (load + 0.012 + s * 10e-6) * np.exp(-5e-6 * s)

    # The note's denominator leaves the product of the two small resistances out.
    agrees("hydrophone-buck", index, output_v, [100.0, 5e3, 1.4e4, 1e5, 1e6], 0.02)


@pytest.mark.parametrize(
    ("index", "pump", "through", "joint"),
    [(0, 3.4, 0.35, 0.9), (1, 2.2, 0.38, 0.9), (2, 4.3, 0.33, 0.9), (3, 3.4, 0.35, 0.5)],
)
def test_cooler_two_bodies(index: int, pump: float, through: float, joint: float) -> None:
    def detector_k(s: Any) -> Any:
        mount = joint + 0.02 + 22 * s
        plate = through + joint + 9 * s - joint**2 / mount
        return -pump / plate * joint / mount / (1 + 0.6 * s) * np.exp(-0.25 * s)

    agrees("detector-cooler", index, detector_k, [1e-3, 0.01, 0.1, 1.0])


def test_cooler_pumps_what_its_current_leaves() -> None:
    for ampere, watt_per_ampere in [(1.2, 3.4), (1.75, 2.2), (0.8, 4.3)]:
        assert 6.1 - 2.2 * ampere == pytest.approx(watt_per_ampere, abs=0.06)


@pytest.mark.parametrize(
    ("index", "flow", "volumes_l", "kg", "damping"),
    [
        (0, 1.0, (0.875, 0.875), 640, 0.12),
        (1, 1.0, (0.875 - 0.144 * 3.12, 0.875 + 0.144 * 3.12), 640, 0.10),
        (2, 1.08, (0.875, 0.875), 640, 0.07),
        (3, math.sqrt(105 / 165), (0.875, 0.875), 675, 0.12),
        (4, 1.0, (0.875, 0.875), 975, 0.09),
    ],
)
def test_carriage_on_its_oil(
    index: int, flow: float, volumes_l: tuple[float, float], kg: float, damping: float
) -> None:
    area = 31.2e-4
    stiffness = 1.1e9 * area**2 * sum(1000 / litre for litre in volumes_l)
    natural = math.sqrt(stiffness / kg)
    mm_per_s = 1000 * flow * 40e-3 / 60 / 10 / area

    def gap_mm(s: Any) -> Any:
        oil = 1 + 2 * damping * s / natural + (s / natural) ** 2
        valve = 1 + 2 * 0.75 * s / 380 + (s / 380) ** 2
        return mm_per_s / (s * oil * valve) * np.exp(-0.002 * s)

    agrees("knife-carriage", index, gap_mm, [0.1, 5.0, 30.0, 100.0], 0.02)


@pytest.mark.parametrize(
    ("index", "bias", "kg", "bending"),
    [(0, 3.0, 14, 4600), (1, 2.4, 14, 4600), (2, 3.4, 14, 4600), (3, 3.0, 17, 4250)],
)
def test_bearing_rigid_shaft_and_first_bending(index: int, bias: float, kg: float, bending: float) -> None:
    newton_per_ampere, newton_per_metre = 180 * bias / 3, 1.15e6 * (bias / 3) ** 2

    def position_um(s: Any) -> Any:
        rigid = 1 / (s**2 - newton_per_metre / kg)
        bend = 0.12 / (s**2 + 2 * 0.004 * bending * s + bending**2)
        return 1e6 * newton_per_ampere / kg * (rigid + bend) * 9000 / (s + 9000) * np.exp(-4e-5 * s)

    agrees("blower-bearing", index, position_um, [1.0, 100.0, 1000.0, 3000.0, 4100.0, 8000.0])


def test_oven_is_the_step_test_it_was_read_from() -> None:
    for index, (gain, slow, quick, dead) in enumerate(
        [(11, 900, 120, 35), (12.5, 620, 110, 32), (9.6, 1350, 130, 38), (11.8, 980, 140, 62)]
    ):
        agrees(
            "cure-oven",
            index,
            lambda s, g=gain, a=slow, b=quick, d=dead: g / ((1 + a * s) * (1 + b * s)) * np.exp(-d * s),
            [1e-4, 1e-3, 1e-2, 0.1],
            1e-12,
        )


# --- no textbook plant ------------------------------------------------------------------------------------------


@pytest.mark.parametrize("name", NAMES)
def test_no_plant_is_a_blackboard_one(name: str) -> None:
    for plant in plants_of(parse_design(demo(name)).plant_cases):
        assert len(plant.poles) + (plant.dead_time_s > 0) >= 3


def test_the_demos_use_most_kinds_of_stage() -> None:
    kinds = {stage["kind"] for name in NAMES for stage in demo(name)["compensator"]["stages"]}
    known = {kind.model_fields["kind"].annotation.__args__[0] for kind in Stage.__args__[0].__args__}
    assert kinds <= known
    assert {"lead_lag", "proportional_integral", "integrator", "real_pole", "complex_zeros", "notch"} <= kinds
