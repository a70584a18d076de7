"""A rational model kept as gain, zeros, poles and dead time: never expanded into coefficients."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TypeAlias

import numpy as np
from numpy.typing import NDArray

FloatArray: TypeAlias = NDArray[np.float64]
ComplexArray: TypeAlias = NDArray[np.complex128]


@dataclass(frozen=True, eq=False)
class Factored:
    """gain · Π(s − zero) / Π(s − pole) · exp(−s · dead_time_s), with real coefficients.

    Roots stand as they were given: a pole and a zero at the same place are both kept, so that a hidden
    cancellation still shows in S, T, C·S and P·S.
    """

    gain: float
    """Factor before the products; never 0."""
    zeros: ComplexArray
    """(m,) [rad/s]; each complex root is followed by its exact conjugate."""
    poles: ComplexArray
    """(n,) [rad/s]; each complex root is followed by its exact conjugate."""
    dead_time_s: float = 0.0

    def __mul__(self, other: Factored) -> Factored:
        """The series connection: roots are concatenated, nothing is cancelled."""
        return Factored(
            self.gain * other.gain,
            np.concatenate([self.zeros, other.zeros]),
            np.concatenate([self.poles, other.poles]),
            self.dead_time_s + other.dead_time_s,
        )

    @property
    def relative_degree(self) -> int:
        """Number of poles minus number of zeros; negative for an improper model."""
        return len(self.poles) - len(self.zeros)
