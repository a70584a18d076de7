"""Damping and speed of the closed-loop poles."""

from __future__ import annotations

import numpy as np

from engine.loop.closed_loop_roots import ClosedLoopRoots
from engine.loop.reading import Reading, value, without_value

_NAMES = ("least_damping", "slowest_pole_rad_s")
_ENDLESS = dict.fromkeys(
    _NAMES, without_value("not determinable", "with dead time the closed loop has endlessly many poles")
)
_NONE = dict.fromkeys(_NAMES, without_value("unlimited", "the closed loop has no poles"))


def pole_measures(roots: ClosedLoopRoots) -> list[dict[str, Reading]]:
    """Per case `least_damping`: least −Re/|·| over the closed-loop poles; `slowest_pole_rad_s`: least −Re [rad/s].

    The slowest pole is the one whose part of the response dies away last, whether it oscillates or not.
    """
    if not roots.roots.shape[1]:
        return [dict(_NONE if complete else _ENDLESS) for complete in roots.complete.tolist()]
    size = np.abs(roots.roots)
    rate = np.where(np.isnan(size), np.inf, -roots.roots.real)
    damping = rate / np.where(size > 0, size, 1.0)
    damping = np.where(np.isnan(damping), np.inf, damping)
    rows = np.arange(len(size))
    least, slowest = np.argmin(damping, axis=1), np.argmin(rate, axis=1)
    found = zip(
        roots.complete.tolist(),
        roots.count.tolist(),
        damping[rows, least].tolist(),
        size[rows, least].tolist(),
        rate[rows, slowest].tolist(),
        size[rows, slowest].tolist(),
        strict=True,
    )
    return [
        {_NAMES[0]: value(ratio, at_rad_s=at), _NAMES[1]: value(decay, at_rad_s=place)}
        if complete and count
        else dict(_NONE if complete else _ENDLESS)
        for complete, count, ratio, at, decay, place in found
    ]
