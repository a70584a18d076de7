"""Every measure a requirement can name: its words, its unit, and how slack is counted.

The one table behind the ledger, the command line, the API's list of measures and the judging of requirements.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal, TypeAlias

Side: TypeAlias = Literal["at_least", "at_most"]
Scale: TypeAlias = Literal["angle", "decibel", "percent", "ratio"]
"""How slack is counted: Δ/30°, Δ/6 dB, Δ/10 points, ln of the ratio."""


@dataclass(frozen=True, slots=True)
class Measure:
    """One thing that can be read from a loop and required of it."""

    name: str
    label: str
    unit: str
    scale: Scale
    usual: Side
    """The side on which requirements usually bound it."""
    what: str
    """One sentence: what the number is."""
    read_from: str
    """The transfer or response it is read from."""
    group: str
    per_frequency: bool = False
    """True where a requirement must say at which frequencies."""


def _m(name: str, label: str, unit: str, scale: Scale, usual: Side, group: str, read_from: str, what: str) -> Measure:
    return Measure(name, label, unit, scale, usual, what, read_from, group)


def _f(name: str, label: str, unit: str, scale: Scale, usual: Side, read_from: str, what: str) -> Measure:
    return Measure(name, label, unit, scale, usual, what, read_from, "at chosen frequencies", per_frequency=True)


_MARGINS, _ROBUST, _SPEED = "margins", "robustness and effort", "speed"
_STEADY, _COMMAND, _LOAD, _POLES = "steady state", "command response", "load response", "closed-loop poles"

_ALL = (
    _m("phase_margin_deg", "phase margin", "°", "angle", "at_least", _MARGINS, "L = C·P",
       "Least distance of the loop phase from −180° over all gain crossovers."),
    _m("gain_margin_db", "gain margin", "dB", "decibel", "at_least", _MARGINS, "L = C·P",
       "Gain increase that brings the loop to the stability boundary."),
    _m("gain_reduction_margin_db", "gain-reduction margin", "dB", "decibel", "at_least", _MARGINS, "L = C·P",
       "Gain decrease that brings the loop to the stability boundary."),
    _m("delay_margin_s", "delay margin", "s", "ratio", "at_least", _MARGINS, "L = C·P",
       "Extra dead time that brings the loop to the stability boundary."),
    _m("disk_margin", "disk margin", "", "ratio", "at_least", _ROBUST, "(1 − L)/(1 + L)",
       "Simultaneous gain and phase change the loop survives, from 0 to 2."),
    _m("peak_sensitivity", "peak sensitivity", "", "ratio", "at_most", _ROBUST, "S = 1/(1 + L)",
       "Largest |S|: the inverse of the least distance of L from −1."),
    _m("peak_complementary_sensitivity", "peak complementary sensitivity", "", "ratio", "at_most", _ROBUST,
       "T = L/(1 + L)", "Largest |T|: the resonance peak of the closed loop."),
    _m("effort_gain_db", "effort gain", "dB", "decibel", "at_most", _ROBUST, "C·S",
       "Largest gain from measurement noise to actuator effort."),
    _m("crossover_rad_s", "crossover", "rad/s", "ratio", "at_least", _SPEED, "L = C·P",
       "First frequency at which the loop gain falls through 0 dB."),
    _m("last_crossover_rad_s", "last crossover", "rad/s", "ratio", "at_most", _SPEED, "L = C·P",
       "Last frequency at which the loop gain passes 0 dB."),
    _m("bandwidth_rad_s", "bandwidth", "rad/s", "ratio", "at_least", _SPEED, "T = L/(1 + L)",
       "Lowest frequency at which |T| is |T(0)|/√2."),
    _m("position_error_constant", "position constant", "", "ratio", "at_least", _STEADY, "L = C·P",
       "Loop gain at zero frequency."),
    _m("velocity_error_constant", "velocity constant", "1/s", "ratio", "at_least", _STEADY, "L = C·P",
       "Limit of s·L(s) at zero frequency."),
    _m("acceleration_error_constant", "acceleration constant", "1/s²", "ratio", "at_least", _STEADY, "L = C·P",
       "Limit of s²·L(s) at zero frequency."),
    _m("step_error", "step error", "", "ratio", "at_most", _STEADY, "S = 1/(1 + L)",
       "Final error to a unit step."),
    _m("ramp_error", "ramp error", "s", "ratio", "at_most", _STEADY, "S = 1/(1 + L)",
       "Final error to a ramp of one unit a second."),
    _m("parabola_error", "parabola error", "s²", "ratio", "at_most", _STEADY, "S = 1/(1 + L)",
       "Final error to t²/2."),
    _m("overshoot_pct", "overshoot", "%", "percent", "at_most", _COMMAND, "step of the command",
       "How far the step response passes its final value."),
    _m("undershoot_pct", "undershoot", "%", "percent", "at_most", _COMMAND, "step of the command",
       "How far the step response first goes the wrong way."),
    _m("rise_time_s", "rise time", "s", "ratio", "at_most", _COMMAND, "step of the command",
       "From 10 % to 90 % of the final value."),
    _m("settling_time_s", "settling time", "s", "ratio", "at_most", _COMMAND, "step of the command",
       "Last exit from ±2 % of the final value."),
    _m("peak_effort", "peak effort", "", "ratio", "at_most", _COMMAND, "effort after a step of the command",
       "Largest actuator effort after a step of the scenario's amplitude."),
    _m("load_peak", "load peak", "", "ratio", "at_most", _LOAD, "P·S, step of the load",
       "Largest deviation after a load step of the scenario's amplitude."),
    _m("load_settling_time_s", "load settling time", "s", "ratio", "at_most", _LOAD, "P·S, step of the load",
       "Last exit from ±2 % of the load peak around the final value."),
    _m("least_damping", "least damping", "", "ratio", "at_least", _POLES, "closed-loop poles",
       "Smallest damping ratio of any closed-loop pole."),
    _m("slowest_pole_rad_s", "slowest pole", "rad/s", "ratio", "at_least", _POLES, "closed-loop poles",
       "Smallest decay rate of any closed-loop pole."),
    _f("loop_gain_db", "loop gain", "dB", "decibel", "at_least", "L = C·P", "|L| at the frequencies named."),
    _f("loop_phase_deg", "loop phase", "°", "angle", "at_least", "L = C·P", "Phase of L at the frequencies named."),
    _f("sensitivity_db", "sensitivity", "dB", "decibel", "at_most", "S = 1/(1 + L)",
       "|S| at the frequencies named."),
    _f("complementary_sensitivity_db", "complementary sensitivity", "dB", "decibel", "at_most", "T = L/(1 + L)",
       "|T| at the frequencies named."),
    _f("effort_gain_at_db", "effort gain", "dB", "decibel", "at_most", "C·S", "|C·S| at the frequencies named."),
    _f("load_gain_db", "load gain", "dB", "decibel", "at_most", "P·S",
       "Gain from a load at the plant input to the output at the frequencies named."),
    _f("command_gain_db", "command gain", "dB", "decibel", "at_most", "T = L/(1 + L)",
       "Gain from command to output at the frequencies named."),
)  # fmt: skip

MEASURES: dict[str, Measure] = {measure.name: measure for measure in _ALL}
"""By name, in the order in which they are offered."""

SCALE_STEP: dict[Scale, float] = {"angle": 30.0, "decibel": 6.0, "percent": 10.0}
"""What counts as one unit of slack; "ratio" counts ln of the ratio instead."""
