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
from engine.loop.rings import components
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
    from_s: FloatArray,
    horizon_s: float = np.inf,
) -> ModalSums:
    """The sums with each crowd of roots of `cases` replaced by a ring of nodes.

    The sums hold from the instants `from_s` (c,) on. Rings at the imaginary axis, which cannot stay left of it, are
    kept small enough to serve up to `horizon_s`.
    """
    replaced = {}
    for case in cases.tolist():
        heavy = _heavy(sums, case, float(from_s[case]))
        widest = 10.0 / (horizon_s * transfers.scale[case])
        made = _ringed(sums, transfers, case, amplitudes, integrations, heavy, widest)
        if made is not None:
            replaced[case] = made
    if not replaced:
        return sums
    width = max(sums.exponents.shape[1], *(len(exponents) for exponents, _, _ in replaced.values()))
    more = width - sums.exponents.shape[1]
    exponents = np.pad(sums.exponents, ((0, 0), (0, more)), constant_values=-1.0)
    weights = np.pad(sums.weights, ((0, 0), (0, 0), (0, more)))
    offset, slope = sums.offset.copy(), sums.slope.copy()
    for case, (own_exponents, own_weights, steady) in replaced.items():
        exponents[case], weights[case] = -1.0, 0.0
        exponents[case, : len(own_exponents)] = own_exponents
        weights[case, :, : len(own_exponents)] = own_weights
        if not steady:
            offset[case], slope[case] = 0.0, 0.0
    return ModalSums(exponents, weights, offset, slope)


def _heavy(sums: ModalSums, case: int, from_s: float) -> NDArray[np.bool_]:
    """(m,) which weights are among those that cancel: within a hundredth of the largest."""
    with np.errstate(all="ignore"):
        size = np.abs(sums.weights[case]) * np.exp(np.minimum(sums.exponents[case].real * from_s, 600.0))
        heavy: NDArray[np.bool_] = ~(size < 0.01 * size.max(axis=1, keepdims=True)).all(axis=0)
    return heavy


def _ringed(
    sums: ModalSums,
    transfers: Transfers,
    case: int,
    amplitudes: FloatArray,
    integrations: NDArray[np.int64],
    heavy: NDArray[np.bool_],
    widest: float,
) -> tuple[ComplexArray, ComplexArray, bool] | None:
    """Exponents [rad/s], weights (3, m), and whether the input's own pole at 0 stays outside the rings."""
    roots = transfers.roots[case, transfers.live[case]]
    # The sums list the roots of the upper half plane in the order of all roots.
    upper = np.flatnonzero(roots.imag >= 0.0)
    weighty = np.zeros(len(roots) + 1, dtype=np.bool_)
    weighty[upper] = heavy[: len(upper)]
    found = _grouping(np.concatenate([roots, [0.0]]), weighty, widest)
    if found is None:
        return None
    ringed, rings = found
    single = np.flatnonzero(~ringed[upper])
    exponents, weights = [sums.exponents[case, single]], [sums.weights[case][:, single]]
    for centre, radius, nodes in rings:
        turn = 2.0 * np.pi * (np.arange(nodes) + 0.5) / nodes
        if centre.imag == 0.0:
            turn = turn[turn < np.pi]
        arm = radius * np.exp(1j * turn)
        exponents.append((centre + arm) * transfers.scale[case])
        weights.append(_driven(transfers, case, centre + arm, amplitudes, integrations) * arm * (2.0 / nodes))
    return np.concatenate(exponents), np.concatenate(weights, axis=1), not ringed[-1]


def _driven(
    transfers: Transfers, case: int, s: ComplexArray, amplitudes: FloatArray, integrations: NDArray[np.int64]
) -> ComplexArray:
    """(3, k) the transforms of the responses at s (k,), the input's poles in unscaled time where there are two."""
    points = np.full((len(transfers.scale), len(s)), 1.0 + 0.0j)
    points[case] = s
    with np.errstate(all="ignore"):
        transfer = transfers.numerators(points)[case] / transfers.denominator(points)[case]
    step = transfer * amplitudes[:, None] / s
    ramp = integrations[:, None] == 2
    driven: ComplexArray = np.where(ramp, step / (s * transfers.scale[case]), step)
    return driven


def _grouping(
    points: ComplexArray, heavy: NDArray[np.bool_], widest: float
) -> tuple[NDArray[np.bool_], list[tuple[complex, float, int]]] | None:
    """Which points lie in rings, and centre, radius and number of nodes of the rings of the upper half plane.

    The last point is the input's own pole. A heavy point that stands alone gets a ring of its own: it may be a double
    root found once. None where no reach gives groups that stand apart.
    """
    distance = np.abs(points[:, None] - points)
    depth = np.abs(points.real)
    near = np.minimum(depth[:, None], depth)
    for reach in REACHES:
        # What a root moves within the horizon decides as well: e^{λt} − 1 cancels for a root that hardly moves.
        label = components(distance <= np.maximum(reach * near, max(1e-9, 0.1 * reach * widest)))
        groups = [np.flatnonzero(label == each) for each in np.unique(label)]
        crowded = [group for group in groups if len(group) > 1 or heavy[group].any()]
        rings = [_ring(points, group, widest) for group in crowded]
        whole = [ring for ring in rings if ring is not None]
        if crowded and len(whole) == len(rings):
            ringed = np.isin(np.arange(len(points)), np.concatenate(crowded))
            return ringed, [ring for ring in whole if ring[0].imag >= 0.0]
    return None


def _ring(points: ComplexArray, group: NDArray[np.int64], widest: float) -> tuple[complex, float, int] | None:
    """Centre, radius and nodes of a circle that holds the group and nothing else."""
    members, others = points[group], np.delete(points, group)
    centre = complex(members.mean())
    if abs(centre.imag) <= 1e-12 * abs(centre):
        centre = complex(centre.real, 0.0)
    inner = max(float(np.abs(members - centre).max()), 1e-7 * abs(centre))
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
