"""Damping and speed of the closed-loop poles."""

from __future__ import annotations

import numpy as np

from engine.loop.reading import Reading, value, without_value
from engine.model.factored import ComplexArray

_NONE = "the closed loop has no poles"


def pole_measures(roots: ComplexArray, complete: bool) -> dict[str, Reading]:
    """`least_damping`: least −Re/|·| over the closed-loop poles; `slowest_pole_rad_s`: least −Re [rad/s].

    The slowest pole is the one whose part of the response dies away last, whether it oscillates or not.
    """
    if not complete:
        why = "with dead time the closed loop has endlessly many poles"
        return dict.fromkeys(("least_damping", "slowest_pole_rad_s"), without_value("not determinable", why))
    if not len(roots):
        return dict.fromkeys(("least_damping", "slowest_pole_rad_s"), without_value("unlimited", _NONE))
    damping = -roots.real / np.abs(roots)
    least, slowest = int(np.argmin(damping)), int(np.argmax(roots.real))
    return {
        "least_damping": value(damping[least], at_rad_s=float(np.abs(roots[least]))),
        "slowest_pole_rad_s": value(-roots[slowest].real, at_rad_s=float(np.abs(roots[slowest]))),
    }
