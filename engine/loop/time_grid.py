"""The instants at which responses are shown, the same for all cases."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.model.factored import ComplexArray, FloatArray

# A geometric part shows what the fastest modes do, which a uniform one alone would miss; the uniform part is a coarse
# comb times a fine one, so that its exponentials are products of few.
GEOMETRIC = 80
COARSE, FINE = 20, 16
SHARES = np.linspace(0.0, 1.0, GEOMETRIC)
EARLIEST = 1e-7
STEPS = (1.0, 1.2, 1.5, 2.0, 2.5, 3.0, 4.0, 5.0, 6.0, 8.0, 10.0)


@dataclass(frozen=True, eq=False)
class TimeGrid:
    """0, a geometric sequence, kinks, and a uniform sequence up to the horizon, merged in order."""

    time_s: FloatArray
    """(n,) increasing, from 0 (which stands for the instant just after the step)."""
    order: NDArray[np.int64]
    """(n,) positions that put [geometric, uniform] in order."""
    joined_s: FloatArray
    """(n,) [geometric, uniform] as they stand, the order of `basis`."""
    geometric_s: FloatArray
    coarse_s: FloatArray
    fine_s: FloatArray

    def basis(self, exponents: ComplexArray) -> FloatArray:
        """(c, 2m, n) real parts, then imaginary parts of e^{exponent·time} at `joined_s`.

        Growth is cut off far beyond what is shown.
        """
        geometric = _exponential(exponents, self.geometric_s)
        coarse, fine = _exponential(exponents, self.coarse_s), _exponential(exponents, self.fine_s)
        cases, modes = exponents.shape
        uniform = coarse[:, :, :, None] * fine[:, :, None, :]
        uniform = uniform.reshape(cases, modes, len(self.coarse_s) * len(self.fine_s))
        parts = np.empty((cases, 2 * modes, len(self.joined_s)))
        cut = len(self.geometric_s)
        parts[:, :modes, :cut], parts[:, modes:, :cut] = geometric.real, geometric.imag
        parts[:, :modes, cut:], parts[:, modes:, cut:] = uniform.real, uniform.imag
        return parts


def _exponential(exponents: ComplexArray, time_s: FloatArray) -> ComplexArray:
    power = exponents[:, :, None] * time_s
    if np.any(power.real > 250.0):
        power = np.minimum(power.real, 250.0) + 1j * power.imag
    raised: ComplexArray = np.exp(power)
    return raised


def time_grid(horizon_s: float, earliest_s: float, kinks_s: FloatArray) -> TimeGrid:
    """About 400 instants from 0 to the horizon [s].

    Parameters
    ----------
    earliest_s : where the geometric part begins
    kinks_s : (k,) instants at which a response may jump: shown just before and after
    """
    first = min(max(earliest_s, EARLIEST * horizon_s), 0.01 * horizon_s)
    step = horizon_s / (COARSE * FINE - 1)
    geometric = first * ((horizon_s - 0.5 * step) / first) ** SHARES
    if len(kinks_s):
        kinks = np.unique(kinks_s[kinks_s < horizon_s])
        geometric = np.concatenate([geometric, np.nextafter(kinks, 0.0), kinks])
    coarse: FloatArray = np.arange(float(COARSE)) * (FINE * step)
    fine: FloatArray = np.arange(float(FINE)) * step
    uniform = (coarse[:, None] + fine).ravel()
    joined = np.concatenate([geometric, uniform])
    order = np.argsort(joined, kind="stable").astype(np.int64)
    return TimeGrid(joined[order], order, joined, geometric, coarse, fine)


def round_horizon(horizon_s: float) -> float:
    """The next round number at or above: a horizon that crept with every move would make the axis restless."""
    decade = 10.0 ** math.floor(math.log10(horizon_s))
    return decade * next(step for step in STEPS if step >= horizon_s / decade * (1.0 - 1e-9))
