"""Circles round groups of open-loop poles, for the first few dead times of a response.

Within a few dead times poles closer together than about 1/θ act as one group. A circle round each group carries the
part of the response that belongs to it, whatever the multiplicity of its poles: see `delayed_steps`.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from engine.model.factored import ComplexArray, FloatArray

NODES = 64
# A group's radius over the distance from its centre to the next pole: the circle goes between them.
ROOM = 0.35


@dataclass(frozen=True, eq=False)
class Rings:
    """Circles of one loop whose centres are real or in the upper half plane."""

    centres: ComplexArray
    """(g,) times the dead time"""
    radii: FloatArray
    """(g,) times the dead time"""


@lru_cache(maxsize=64)
def rings_round(poles: bytes, dead_time_s: float, link: float) -> Rings:
    """Circles round the poles (a complex128 array as bytes, conjugates included) and the input's own pole at 0.

    Poles closer than `link` dead-time radians are one group, and so are those that a circle could not keep apart.
    """
    listed = np.append(np.frombuffer(poles, dtype=np.complex128), 0.0j)
    points = np.asarray(np.unique(listed) * dead_time_s, dtype=np.complex128)
    mirror = np.abs(points[:, None] - points.conj()).argmin(axis=1)
    distance = np.abs(points[:, None] - points)
    linked = distance <= link
    for _ in range(len(points)):
        label = components(linked)
        crowded = _crowded(points, distance, label)
        if crowded is None:
            break
        a, b = crowded
        linked[[a, b, mirror[a], mirror[b]], [b, a, mirror[b], mirror[a]]] = True
    centres, radii = [], []
    for group in (np.flatnonzero(label == each) for each in np.unique(label)):
        centre, inner, outer = _extent(points, distance, group)
        if centre.imag < 0.0:
            continue
        centres.append(centre)
        radii.append(_radius(inner, outer))
    return Rings(np.array(centres, dtype=np.complex128), np.array(radii))


def components(linked: NDArray[np.bool_]) -> NDArray[np.int64]:
    """Label of the connected component of each point."""
    label = np.arange(len(linked))
    for _ in range(len(linked)):
        joined = np.where(linked, label, len(linked)).min(axis=1)
        if np.array_equal(joined, label):
            break
        # Follow each label to its own label as well: long chains join in few rounds.
        label = joined[joined]
    return label


def _extent(points: ComplexArray, distance: FloatArray, group: NDArray[np.int64]) -> tuple[complex, float, float]:
    """Centre of a group's bounding box, its radius, and the distance to the nearest point outside."""
    members = points[group]
    centre = complex(0.5 * (members.real.min() + members.real.max()), 0.5 * (members.imag.min() + members.imag.max()))
    away = np.abs(points - centre)
    outside = np.ones(len(points), dtype=np.bool_)
    outside[group] = False
    return centre, float(away[group].max()), float(away[outside].min(initial=np.inf))


def _crowded(points: ComplexArray, distance: FloatArray, label: NDArray[np.int64]) -> tuple[int, int] | None:
    """A member of a group without room for a circle, and the nearest point outside the group."""
    for each in np.unique(label):
        group = np.flatnonzero(label == each)
        _, inner, outer = _extent(points, distance, group)
        if inner > ROOM * outer:
            outside = np.flatnonzero(label != each)
            between = distance[np.ix_(group, outside)]
            a, b = np.unravel_index(between.argmin(), between.shape)
            return int(group[a]), int(outside[b])
    return None


def _radius(inner: float, outer: float) -> float:
    """Between the group and the next pole; about one dead-time radian, or twice the group, where there is room."""
    wished = max(2.0 * inner, 1.2)
    return float(min(wished, max(0.5 * outer, np.sqrt(inner * outer)))) if np.isfinite(outer) else wished
