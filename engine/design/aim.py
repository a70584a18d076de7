"""Choosing the gain by the crossover it gives."""

from __future__ import annotations

import math

import numpy as np

from engine.design.document import Design
from engine.design.resolve import loops_of
from engine.design.wording import number
from engine.errors import DesignError
from engine.model.evaluate import response


def aimed_at(design: Design, crossover_rad_s: float) -> Design:
    """The design with the gain that makes the nominal |L| = 1 at a frequency; the gain keeps its sign.

    Raises
    ------
    DesignError : the loop is zero or infinite at that frequency, or the gain would leave the range of numbers
    """
    nominal = loops_of(design).loops[0]
    level = abs(complex(response(nominal, np.array([1j * crossover_rad_s]))[0]))
    gain = design.compensator.gain / level if 0 < level < math.inf else math.nan
    if not math.isfinite(gain) or gain == 0:
        raise DesignError(
            "aim.crossover_rad_s",
            f"no gain makes the loop cross 0 dB at {number(crossover_rad_s)} rad/s, where it is {number(level)}",
        )
    compensator = design.compensator.model_copy(update={"gain": gain})
    return design.model_copy(update={"compensator": compensator})
