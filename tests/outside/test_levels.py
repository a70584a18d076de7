"""Levels at a frequency, over a band and against a mask: judged by 40-digit values and by dense sampling.

A worst case is checked from two sides: the level at the place it names is the level it names, and no sample of the
band is worse.
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from mpmath import mp, mpc, mpf

from tests.outside.designs import assessed
from tests.outside.loop import Loop, loop_of_design
from tests.outside.make_reference import stored
from tests.outside.sector import Axis

STABLE = [e for e in stored() if not e["unstable_poles"]]
QUANTITIES = (
    "loop_gain_db", "sensitivity_db", "complementary_sensitivity_db", "effort_gain_at_db", "load_gain_db",
    "command_gain_db",
)  # fmt: skip
SAMPLES = 20_000


def each(step: int, start: int = 0):
    return pytest.mark.parametrize("entry", STABLE[start::step], ids=lambda e: e["design"]["plant_cases"][0]["name"])


def level_db(loop: Loop, quantity: str, omega: float) -> float:
    """The level at jω in 40 digits, factor by factor."""
    with mp.workdps(40):
        s = mpc(0, omega)
        level = loop.at(s)
        value = {
            "loop_gain_db": lambda: level,
            "sensitivity_db": lambda: 1 / (1 + level),
            "complementary_sensitivity_db": lambda: level / (1 + level),
            "command_gain_db": lambda: level / (1 + level),
            "effort_gain_at_db": lambda: loop.compensator.at(s) / (1 + level),
            "load_gain_db": lambda: loop.plant.at(s) * mp.exp(-s * loop.dead_time_s) / (1 + level),
        }[quantity]()
        return float(20 * mp.log10(abs(value)))


def sampled_db(loop: Loop, quantity: str, omega: np.ndarray) -> np.ndarray:
    """The same in double precision on many frequencies."""
    level = Axis(loop).value(omega)
    part = {"effort_gain_at_db": loop.compensator, "load_gain_db": loop.plant}.get(quantity)
    if part is not None:
        above = np.abs(Axis(Loop(part, type(part)(mpf(1), (), ()), mpf(0))).value(omega))
    elif quantity == "loop_gain_db":
        return 20 * np.log10(np.abs(level))
    else:
        above = 1.0 if quantity == "sensitivity_db" else np.abs(level)
    return 20 * np.log10(above / np.abs(1 + level))


def middle_rad_s(entry: dict) -> float:
    crossings = entry["gain_crossings"]
    return crossings[0][0] if crossings else 1.0


def rows(entry: dict, requirements: list[dict]) -> list[dict]:
    return assessed(entry["design"] | {"requirements": requirements})["requirements"]


@each(5)
def test_levels_at_a_frequency(entry):
    loop = loop_of_design(entry["design"])
    places = [middle_rad_s(entry) * factor for factor in (1e-3, 0.3, 1.0, 1.7, 400.0)]
    wanted = [(q, w) for q in QUANTITIES for w in places]
    found = rows(entry, [{"measure": q, "at_rad_s": w, "at_most": 0} for q, w in wanted])
    for (quantity, omega), row in zip(wanted, found, strict=True):
        s = mpc(0, omega)
        shake = float(loop.parameter_weight(s) / min(1, abs(1 + loop.at(s)))) * 100 * 2.0**-52 * 20 / math.log(10)
        want = level_db(loop, quantity, omega)
        np.testing.assert_allclose(row["reading"]["value"], want, atol=max(1e-8, shake), err_msg=f"{quantity} {omega}")


@each(5, start=2)
def test_phase_at_a_frequency_is_the_sum_of_the_factors(entry):
    loop = loop_of_design(entry["design"])
    places = [middle_rad_s(entry) * factor for factor in (1e-3, 0.3, 1.0, 1.7, 30.0)]
    found = rows(entry, [{"measure": "loop_phase_deg", "at_rad_s": w, "at_least": 0} for w in places])
    for omega, row in zip(places, found, strict=True):
        s = mpc(0, omega)
        want = float(mp.degrees(mp.arg(loop.at(s))))
        apart = (row["reading"]["value"] - want + 180) % 360 - 180
        assert abs(apart) < max(1e-8, float(loop.parameter_weight(s)) * 1e-12), omega


@each(6, start=1)
@pytest.mark.parametrize("side", ["at_most", "at_least"])
def test_worst_levels_over_a_band(entry, side):
    loop = loop_of_design(entry["design"])
    low, high = middle_rad_s(entry) * 0.05, middle_rad_s(entry) * 20
    found = rows(entry, [{"measure": q, "over_rad_s": [low, high], side: 0.0} for q in QUANTITIES])
    omega = np.geomspace(low, high, SAMPLES)
    for quantity, row in zip(QUANTITIES, found, strict=True):
        got, at = row["reading"]["value"], row["reading"]["at_rad_s"]
        assert low * (1 - 1e-12) <= at <= high * (1 + 1e-12)
        np.testing.assert_allclose(got, level_db(loop, quantity, at), atol=1e-7, err_msg=quantity)
        levels = sampled_db(loop, quantity, omega)
        if side == "at_most":
            assert got >= np.max(levels) - 1e-7, quantity
        else:
            assert got <= np.min(levels) + 1e-7, quantity


@each(7, start=3)
def test_worst_against_a_mask(entry):
    loop = loop_of_design(entry["design"])
    middle = middle_rad_s(entry)
    mask = [[middle * 0.05, -20.0], [middle * 0.7, 3.0], [middle * 15, 8.0]]
    quantities = ("sensitivity_db", "complementary_sensitivity_db", "load_gain_db")
    found = rows(entry, [{"measure": q, "mask": mask, "mask_side": "at_most"} for q in quantities])
    omega = np.geomspace(mask[0][0], mask[-1][0], SAMPLES)
    corners, limits = np.log([w for w, _ in mask]), [limit for _, limit in mask]
    for quantity, row in zip(quantities, found, strict=True):
        got, at = row["reading"]["value"], row["reading"]["at_rad_s"]
        np.testing.assert_allclose(got, level_db(loop, quantity, at), atol=1e-7, err_msg=quantity)
        np.testing.assert_allclose(row["limit"], np.interp(np.log(at), corners, limits), atol=1e-9)
        over = sampled_db(loop, quantity, omega) - np.interp(np.log(omega), corners, limits)
        assert got - row["limit"] >= np.max(over) - 1e-7, quantity
        # Contract: dB Δ/6 dB; told within ±20.
        np.testing.assert_allclose(row["slack"], np.clip((row["limit"] - got) / 6, -20, 20), atol=1e-9)
