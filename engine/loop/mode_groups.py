"""Roots that lie close together: their residues are huge and cancel, so a ring of nodes round them stands for them.

The part of a response that belongs to a group of roots is (1/2πi)·∮ Y(s)·e^{st} ds on a circle round the group. The
trapezoidal rule on that circle converges geometrically and turns the integral into another sum of exponentials with
harmless weights (Trefethen & Weideman, SIAM Review 56, 2014: The exponentially convergent trapezoidal rule). It holds
for roots that coincide exactly as well, and depends on where single roots lie only as much as the response does.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from engine.loop.modal import ModalSums, Transfers
from engine.model.factored import ComplexArray, FloatArray

# Link distances tried, widest first, relative to how far a root lies from the imaginary axis.
REACHES = (0.5, 0.25, 0.1, 0.04, 0.01, 1e-3, 1e-5, 1e-8)
# A group's radius over the distance to the next singularity must leave room for the circle.
ROOM = 0.4
RING_ACCURACY = 1e-14
MOST_NODES = 240


def with_rings(
    sums: ModalSums,
    transfers: Transfers,
    cases: NDArray[np.int64],
    amplitudes: FloatArray,
    integrations: NDArray[np.int64],
    horizon_s: float = np.inf,
) -> ModalSums:
    """The sums with each crowd of roots of `cases` replaced by a ring of nodes.

    Rings at the imaginary axis, which cannot stay left of it, are kept small enough to serve up to `horizon_s`.
    """
    replaced = {}
    for case in cases.tolist():
        made = _ringed(transfers, case, amplitudes, integrations, 10.0 / (horizon_s * transfers.scale[case]))
        if made is not None:
            replaced[case] = made
    if not replaced:
        return sums
    width = max(sums.exponents.shape[1], *(len(exponents) for exponents, _, _ in replaced.values()))
    count = len(sums.exponents)
    exponents = np.full((count, width), -1.0 + 0.0j)
    weights = np.zeros((count, 3, width), dtype=np.complex128)
    exponents[:, : sums.exponents.shape[1]] = sums.exponents
    weights[:, :, : sums.exponents.shape[1]] = sums.weights
    offset, slope = sums.offset.copy(), sums.slope.copy()
    for case, (own_exponents, own_weights, steady) in replaced.items():
        exponents[case], weights[case] = -1.0, 0.0
        exponents[case, : len(own_exponents)] = own_exponents
        weights[case, :, : len(own_exponents)] = own_weights
        if not steady:
            offset[case], slope[case] = 0.0, 0.0
    return ModalSums(exponents, weights, offset, slope)


def _ringed(
    transfers: Transfers, case: int, amplitudes: FloatArray, integrations: NDArray[np.int64], widest: float
) -> tuple[ComplexArray, ComplexArray, bool] | None:
    """Exponents [rad/s], weights (3, m), and whether the input's own pole at 0 stays outside the rings."""
    roots = transfers.roots[case, transfers.live[case]]
    found = _grouping(np.concatenate([roots, [0.0]]), widest)
    if found is None:
        return None
    label, rings = found
    single = [k for k in range(len(roots)) if np.count_nonzero(label == label[k]) == 1 and roots[k].imag >= 0.0]
    exponents = [roots[single]]
    twice = np.where(roots[single].imag > 0.0, 2.0, 1.0)
    denominator = np.array([np.prod(np.delete(roots[k] - roots, k)) for k in single], dtype=np.complex128)
    weights = [_driven(transfers, case, roots[single], denominator, amplitudes, integrations) * twice]
    for centre, radius, nodes in rings:
        turn = 2.0 * np.pi * (np.arange(nodes) + 0.5) / nodes
        if centre.imag == 0.0:
            turn = turn[turn < np.pi]
        arm = radius * np.exp(1j * turn)
        s = centre + arm
        whole = np.prod(s[:, None] - roots, axis=1)
        exponents.append(s)
        weights.append(_driven(transfers, case, s, whole, amplitudes, integrations) * arm * (2.0 / nodes))
    steady = np.count_nonzero(label == label[-1]) == 1
    return np.concatenate(exponents) * transfers.scale[case], np.concatenate(weights, axis=1), steady


def _driven(
    transfers: Transfers,
    case: int,
    s: ComplexArray,
    denominator: ComplexArray,
    amplitudes: FloatArray,
    integrations: NDArray[np.int64],
) -> ComplexArray:
    """(3, k) amplitude·numerator/(denominator·s^integrations), the latter in unscaled time."""
    points = np.full((len(transfers.scale), len(s)), 1.0 + 0.0j)
    points[case] = s
    step = transfers.numerators(points)[case] * amplitudes[:, None] / (denominator * s)
    ramp = integrations[:, None] == 2
    driven: ComplexArray = np.where(ramp, step / (s * transfers.scale[case]), step)
    return driven


def _grouping(points: ComplexArray, widest: float) -> tuple[NDArray[np.int64], list[tuple[complex, float, int]]] | None:
    """A group label per point, and centre, radius and number of nodes of the rings of the upper half plane.

    The last point is the input's own pole. None where no reach gives groups that stand apart.
    """
    distance = np.abs(points[:, None] - points)
    depth = np.abs(points.real)
    near = np.minimum(depth[:, None], depth)
    for reach in REACHES:
        label = _components(distance <= np.maximum(reach * near, 1e-9))
        groups = [np.flatnonzero(label == each) for each in np.unique(label)]
        crowded = [group for group in groups if len(group) > 1]
        if not crowded:
            return None
        rings = [_ring(points, group, widest) for group in crowded]
        whole = [ring for ring in rings if ring is not None]
        if len(whole) == len(rings):
            return label, [ring for ring in whole if ring[0].imag >= 0.0]
    return None


def _components(linked: NDArray[np.bool_]) -> NDArray[np.int64]:
    """Label of the connected component of each point."""
    label = np.arange(len(linked))
    for _ in range(len(linked)):
        joined = np.where(linked, label, len(linked)).min(axis=1)
        if np.array_equal(joined, label):
            break
        label = joined
    return label


def _ring(points: ComplexArray, group: NDArray[np.int64], widest: float) -> tuple[complex, float, int] | None:
    """Centre, radius and nodes of a circle that holds the group and nothing else."""
    members, others = points[group], np.delete(points, group)
    centre = complex(members.mean())
    if abs(centre.imag) <= 1e-12 * abs(centre):
        centre = complex(centre.real, 0.0)
    inner = float(np.abs(members - centre).max())
    outer = float(np.abs(others - centre).min()) if len(others) else np.inf
    # Nodes right of the imaginary axis would grow; a group at the axis itself cannot avoid that.
    if len(points) - 1 not in group and abs(centre.real) > 1e-3 * widest:
        outer = min(outer, abs(centre.real))
    elif widest > 0.0:
        outer = min(outer, widest)
    if not np.isfinite(outer):
        outer = max(4.0 * inner, 1.0)
    if inner > ROOM * outer:
        return None
    radius = max(np.sqrt(inner * outer), 0.4 * outer)
    rate = max(inner / radius, radius / outer)
    nodes = int(np.ceil(np.log(RING_ACCURACY) / np.log(rate)))
    return centre, float(radius), min(max(nodes, 16) + nodes % 2, MOST_NODES)
