"""Seeded random designs: orders 1 to 14, corners over six decades, damping down to 0.0005, both signs, dead time."""

from __future__ import annotations

import random

import numpy as np
from mpmath import mp, mpc

from tests.outside.closed_loop import unstable_poles_by_encirclement
from tests.outside.loop import Loop, loop_of_design
from tests.outside.sector import Axis

COUNT = 330
FAMILIES = (
    "mixed", "mixed", "mixed", "light modes", "light modes", "right half plane", "right half plane",
    "conditional", "delayed", "delayed", "delayed light modes", "low order",
)  # fmt: skip


def family_of(index: int) -> str:
    """The kind of loop that number `index` is."""
    return FAMILIES[index % len(FAMILIES)]


def random_design(index: int) -> dict:
    """Design number `index`; the same on every machine and in every release of Python (only `random()` is used)."""
    source = random.Random(f"loop {index}")
    for _ in range(400):
        design = _draw(source, family_of(index), index)
        if design is not None and not _too_near_the_boundary(loop_of_design(design)):
            return design
    raise ArithmeticError(f"no usable loop for index {index}")


def _uniform(source: random.Random, low: float, high: float) -> float:
    return low + (high - low) * source.random()


def _whole(source: random.Random, low: int, high: int) -> int:
    return low + int(source.random() * (high - low + 1))


def _short(x: float) -> float:
    """Six digits: what a person would write, and a compact file."""
    return float(f"{x:.6g}")


def _corner(source: random.Random) -> float:
    return _short(10 ** _uniform(source, -3, 3))


def _damping(source: random.Random, light: bool) -> float:
    return _short(10 ** (_uniform(source, -3.3, -1.5) if light else _uniform(source, -2.5, 0)))


def _pair(source: random.Random, light: bool, right: bool = False) -> list:
    w, zeta = _corner(source), _damping(source, light)
    real, imaginary = _short(w * zeta * (1 if right else -1)), _short(w * (1 - min(zeta, 0.999) ** 2) ** 0.5)
    return [[real, imaginary], [real, -imaginary]]


def _roots(source: random.Random, count: int, light: bool, right: float) -> list:
    """`count` finite roots; each real or pair lies in the right half plane with probability `right`."""
    roots: list = []
    while len(roots) < count:
        flipped = source.random() < right
        if count - len(roots) >= 2 and source.random() < (0.8 if light else 0.35):
            roots += _pair(source, light, flipped)
        else:
            roots.append([_corner(source) * (1 if flipped else -1), 0.0])
    return roots


def _plant(source: random.Random, family: str, index: int) -> dict:
    light = "light" in family
    order = _whole(source, 1, 3) if family == "low order" else _whole(source, 2, 10)
    right = 0.3 if family == "right half plane" else 0.04
    integrators = min(order, (3 if family == "conditional" else 0) + int(source.random() * 2.2))
    if family == "right half plane":
        integrators = min(integrators, 1)
    poles = [[0.0, 0.0]] * integrators + _roots(source, order - integrators, light, right / 2)
    excess = min(order, _whole(source, 1, 3) if family != "low order" else _whole(source, 0, 2))
    zeros = _roots(source, order - excess, light, 0.0 if family == "conditional" else right)
    sign = -1 if source.random() < 0.3 else 1
    model = {"kind": "factored", "gain": sign * _short(10 ** _uniform(source, -2, 2)), "zeros": zeros, "poles": poles}
    if "delayed" in family:
        model["dead_time_s"] = _short(10 ** _uniform(source, -3, 1))
    return model


def _stage(source: random.Random) -> dict:
    kinds = ("lead_lag", "lead_lag", "proportional_integral", "real_pole", "complex_poles", "notch", "rational")
    kind = kinds[_whole(source, 0, len(kinds) - 1)]
    w = _corner(source)
    if kind == "lead_lag":
        return {"kind": kind, "zero_rad_s": w, "pole_rad_s": _short(w * 10 ** _uniform(source, -1.3, 1.3))}
    if kind in ("proportional_integral", "real_pole"):
        return {"kind": kind, "corner_rad_s": w}
    if kind == "complex_poles":
        return {"kind": kind, "natural_rad_s": w, "damping": _short(_uniform(source, 0.05, 1.4))}
    if kind == "notch":
        zero, pole = _short(10 ** _uniform(source, -3, -0.5)), _short(10 ** _uniform(source, -1, 0.1))
        return {"kind": kind, "centre_rad_s": w, "zero_damping": zero, "pole_damping": pole}
    zeros = _roots(source, 2, False, 0.1)
    return {"kind": "rational", "zeros": zeros, "poles": _roots(source, 2, False, 0.0), "gain": 1.0}


def _draw(source: random.Random, family: str, index: int) -> dict | None:
    plant = _plant(source, family, index)
    stages = [_stage(source) for _ in range(_whole(source, 0, 3) if family != "low order" else _whole(source, 0, 1))]
    if family == "conditional":
        stages += [{"kind": "real_zero", "corner_rad_s": _corner(source)} for _ in range(2)]
    design = {
        "format": "loopwright-design/1",
        "plant_cases": [{"name": f"{family} {index}", "model": plant}],
        "compensator": {"gain": 1.0, "stages": stages},
    }
    loop = loop_of_design(design)
    if loop.relative_degree < 0 or not 1 <= len(loop.rational.poles) <= 14:
        return None
    wants_stable = source.random() < 0.85
    for _ in range(25):
        design["compensator"]["gain"] = _gain(source, loop)
        if not _in_range(design["compensator"]["gain"]):
            continue
        drawn = loop_of_design(design)
        if drawn.dead_time_s and drawn.relative_degree == 0 and abs(drawn.rational.gain) > 0.95:
            continue
        if (_unstable(drawn) == 0) == wants_stable:
            return design
    return None


def _in_range(gain: float) -> bool:
    return 1e-12 < abs(gain) < 1e12


def _gain(source: random.Random, loop: Loop) -> float:
    """A gain that puts 0 dB at a random frequency, of either sign."""
    omega = 10 ** _uniform(source, -3, 3)
    sign = 1 if source.random() < 0.5 else -1
    return sign * _short(float(1 / abs(loop.rational.at(mpc(0, omega)))))


def _unstable(loop: Loop) -> int:
    try:
        return unstable_poles_by_encirclement(loop)
    except ArithmeticError:
        return -1


def _too_near_the_boundary(loop: Loop) -> bool:
    """Whether rounding of the entries could decide about stability: −1 within 1e-6 of the curve."""
    with mp.workdps(30):
        axis = Axis(loop)
        corners = np.abs(np.concatenate([axis.nu, axis.sigma]))
        omega = np.unique(np.concatenate([np.geomspace(1e-5, 1e6, 4000), corners[corners > 0]]))
        return bool(np.min(np.abs(1 + axis.value(omega))) < 1e-6)
