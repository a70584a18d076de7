"""Damping and speed of the closed-loop poles."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np

from engine.loop.closed_loop_roots import ClosedLoopRoots
from engine.loop.reading import Reading, value, without_value

_NAMES = ("least_damping", "slowest_pole_rad_s")
_NONE = dict.fromkeys(_NAMES, without_value("unlimited", "the closed loop has no poles"))
_UNLISTED = dict.fromkeys(
    _NAMES,
    without_value("not determinable", "the closed-loop poles are not known for sure"),
)
REACH = 3.0
"""With dead time, poles up to this multiple of the last crossover are judged by their damping."""


def pole_measures(roots: ClosedLoopRoots, last_crossover_rad_s: Sequence[float]) -> list[dict[str, Reading]]:
    """Per case `least_damping`: least −Re/|·| over the closed-loop poles; `slowest_pole_rad_s`: least −Re [rad/s].

    The slowest pole is the one whose part of the response dies away last, whether it oscillates or not.

    With dead time there are endlessly many poles, the higher the less damped and the fainter: the damping ratio of
    e^−sθ's chain tends to 0 while its share in the response does as well. Only poles up to REACH times the last
    crossover (the first phase crossover where there is none, inf where nothing crosses) count for the damping.
    """
    # A list that the argument principle has not confirmed may lack the very pole that counts.
    confirmed = [found is None or found.counted for found in roots.dominant]
    listed = [count if sure else 0 for count, sure in zip(roots.count.tolist(), confirmed, strict=True)]
    if not roots.roots.shape[1]:
        return [dict(_NONE if complete else _UNLISTED) for complete in roots.complete.tolist()]
    size = np.abs(roots.roots)
    rate = np.where(np.isnan(size), math.inf, -roots.roots.real)
    limit = np.where(roots.complete, math.inf, REACH * np.asarray(last_crossover_rad_s))
    damping = rate / np.where(size > 0, size, 1.0)
    damping = np.where(np.isnan(size) | (size > limit[:, None]), math.inf, damping)
    least, slowest = np.argmin(damping, axis=1), np.argmin(rate, axis=1)
    rows = np.arange(len(size))
    found = zip(
        roots.complete.tolist(),
        listed,
        damping[rows, least].tolist(),
        size[rows, least].tolist(),
        rate[rows, slowest].tolist(),
        size[rows, slowest].tolist(),
        limit.tolist(),
        strict=True,
    )
    return [
        _readings(complete, ratio, at, decay, place, end) if count else dict(_NONE if complete else _UNLISTED)
        for complete, count, ratio, at, decay, place, end in found
    ]


def _readings(complete: bool, ratio: float, at: float, decay: float, place: float, end: float) -> dict[str, Reading]:
    if not (math.isfinite(decay) and math.isfinite(place)):
        return dict(_UNLISTED)
    slowest = value(decay, at_rad_s=place)
    if complete:
        return {_NAMES[0]: value(ratio, at_rad_s=at), _NAMES[1]: slowest}
    if math.isinf(ratio):
        return {_NAMES[0]: _UNLISTED[_NAMES[0]], _NAMES[1]: slowest}
    why = "of the closed-loop poles" + ("" if math.isinf(end) else f" up to {end:.4g} rad/s; higher ones are fainter")
    return {_NAMES[0]: value(ratio, at_rad_s=at, why=why), _NAMES[1]: slowest}
