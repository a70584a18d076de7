"""The loop as the references see it: gains, zeros, poles and dead time of compensator and plant, in mpmath numbers."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

from mpmath import mp, mpc, mpf

from tests.outside import exact_polynomial as polynomial

Roots = tuple[mpc, ...]


@dataclass(frozen=True)
class Part:
    """gain · Π(s − zero) / Π(s − pole)."""

    gain: mpf
    zeros: Roots
    poles: Roots

    def __mul__(self, other: Part) -> Part:
        return Part(self.gain * other.gain, self.zeros + other.zeros, self.poles + other.poles)

    @cached_property
    def numerator(self) -> list:
        return polynomial.from_roots(self.zeros, self.gain)

    @cached_property
    def denominator(self) -> list:
        return polynomial.from_roots(self.poles)

    def at(self, s: mpc) -> mpc:
        """The value at s, factor by factor."""
        return self.gain * mp.fprod(s - z for z in self.zeros) / mp.fprod(s - p for p in self.poles)


UNITY = Part(mpf(1), (), ())


@dataclass(frozen=True)
class Loop:
    """L(s) = C(s)·P(s)·exp(−s·dead_time_s)."""

    compensator: Part
    plant: Part
    dead_time_s: mpf

    @cached_property
    def rational(self) -> Part:
        """C·P without the dead time, nothing cancelled."""
        return self.compensator * self.plant

    @cached_property
    def closed(self) -> list:
        """N + D: the closed-loop polynomial of the rational part (meaningful without dead time)."""
        return polynomial.add(self.rational.numerator, self.rational.denominator)

    @property
    def relative_degree(self) -> int:
        return len(self.rational.poles) - len(self.rational.zeros)

    def at(self, s: mpc) -> mpc:
        """L(s)."""
        return self.rational.at(s) * mp.exp(-s * self.dead_time_s)

    def log_slope(self, s: mpc) -> mpc:
        """L'(s)/L(s)."""
        part = self.rational
        ups = mp.fsum(1 / (s - z) for z in part.zeros)
        downs = mp.fsum(1 / (s - p) for p in part.poles)
        return ups - downs - self.dead_time_s

    def parameter_weight(self, s: mpc) -> mpf:
        """Σ|root|/|s − root| + 1: relative change of |L(s)|, and radians of phase, per relative change of all roots."""
        part = self.rational
        spread = mp.fsum(abs(r) / abs(s - r) for r in part.zeros + part.poles)
        return 1 + spread + abs(s) * self.dead_time_s


def part_of_model(model: dict) -> tuple[Part, mpf]:
    """A `factored` model of a design, as part and dead time."""
    assert model["kind"] == "factored", model
    part = Part(mpf(model["gain"]), _complex(model["zeros"]), _complex(model["poles"]))
    return part, mpf(model.get("dead_time_s", 0))


def part_of_stage(stage: dict) -> Part:
    """A compensator stage of a design, written from the contract's formulas."""
    kind = stage["kind"]
    if kind == "lead_lag":
        z, p = mpf(stage["zero_rad_s"]), mpf(stage["pole_rad_s"])
        return Part(p / z, (mpc(-z),), (mpc(-p),))
    if kind == "proportional_integral":
        return Part(mpf(1), (mpc(-mpf(stage["corner_rad_s"])),), (mpc(0),))
    if kind == "integrator":
        return Part(mpf(1), (), (mpc(0),))
    if kind == "real_zero":
        w = mpf(stage["corner_rad_s"])
        return Part(1 / w, (mpc(-w),), ())
    if kind == "real_pole":
        w = mpf(stage["corner_rad_s"])
        return Part(w, (), (mpc(-w),))
    if kind in ("complex_zeros", "complex_poles"):
        w = mpf(stage["natural_rad_s"])
        pair = _quadratic(w, mpf(stage["damping"]))
        return Part(1 / w**2, pair, ()) if kind == "complex_zeros" else Part(w**2, (), pair)
    if kind == "notch":
        w = mpf(stage["centre_rad_s"])
        return Part(mpf(1), _quadratic(w, mpf(stage["zero_damping"])), _quadratic(w, mpf(stage["pole_damping"])))
    assert kind == "rational", kind
    return Part(mpf(stage["gain"]), _complex(stage["zeros"]), _complex(stage["poles"]))


def loop_of_design(design: dict, case: int = 0) -> Loop:
    """The loop of one plant case of a plain design document (factored plants only)."""
    compensator = Part(mpf(design["compensator"]["gain"]), (), ())
    for stage in design["compensator"]["stages"]:
        if stage.get("enabled", True):
            compensator = compensator * part_of_stage(stage)
    plant, dead_time_s = part_of_model(design["plant_cases"][case]["model"])
    return Loop(compensator, plant, dead_time_s)


def _complex(pairs: list) -> Roots:
    return tuple(mpc(x[0], x[1]) if isinstance(x, list | tuple) else mpc(x) for x in pairs)


def _quadratic(natural: mpf, damping: mpf) -> Roots:
    """Roots of s² + 2·damping·natural·s + natural²."""
    if damping < 1:
        imaginary = natural * mp.sqrt(1 - damping**2)
        return (mpc(-damping * natural, imaginary), mpc(-damping * natural, -imaginary))
    spread = natural * mp.sqrt(damping**2 - 1)
    return (mpc(-damping * natural + spread), mpc(-damping * natural - spread))
