"""Roots of an integer polynomial without repeated roots, each enclosed by a disc of its own.

Ehrlich-Aberth iteration, first in doubles, then in integer fixed point whose precision is doubled until the
discs are separate, tell real from complex, and are small beside each component.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from fractions import Fraction
from itertools import pairwise
from typing import TypeAlias

import numpy as np
from numpy.typing import NDArray

from engine.errors import DesignError
from engine.model.exact import IntPolynomial
from engine.model.factored import ComplexArray, FloatArray

ExactComplex: TypeAlias = tuple[Fraction, Fraction]
"""Real and imaginary part; good to 80 bits or more."""

PRECISIONS_BITS = (160, 320, 640, 1280)
ACCURACY_BITS = 80
SWEEPS = 60
MOST_EFFORT = 600_000
"""Bound on the fixed-point steps, counted as degree · precision; the hardest input takes about a second."""


def separated_roots(polynomial: IntPolynomial) -> list[ExactComplex]:
    """All roots in the closed upper half plane; a complex one stands for its pair.

    Parameters
    ----------
    polynomial : integers, no repeated root, no root at 0 and no two roots z, -z

    Raises DesignError where roots lie too close together to be told apart.

    Source: O. Aberth, Iteration methods for finding all zeros of a polynomial simultaneously, Math. Comp. 27
    (1973); enclosure: a disc of radius n·|p/p'| around z holds a root (P. Henrici, Applied and Computational
    Complex Analysis, vol. 1, 6.4; both from memory, pinned by the tests against other methods).
    """
    starts = _double_roots(polynomial)
    work = _FixedPoint.around(starts, PRECISIONS_BITS[0])
    for bits in PRECISIONS_BITS:
        work.refine_to(bits)
        radii = work.iterate(polynomial)
        if radii is not None:
            decided = work.decide(radii)
            if decided is not None:
                return decided
    raise _too_close()


def _too_close() -> DesignError:
    return DesignError("", "has roots too close together to be told apart; give the model as zeros and poles")


# First phase: doubles


def _double_roots(polynomial: IntPolynomial) -> ComplexArray:
    ascending = polynomial[::-1]
    mantissa = np.empty(len(ascending))
    exponent = np.empty(len(ascending), dtype=np.int64)
    for k, c in enumerate(ascending):
        shift = max(abs(c).bit_length() - 60, 0)
        mantissa[k], e = math.frexp(c >> shift)
        exponent[k] = e + shift
    z = _starting_points(mantissa, exponent)
    moving = np.ones(len(z), dtype=bool)
    for _ in range(SWEEPS):
        newton, noise = _newton_step(mantissa, exponent, z)
        moving &= ~noise
        if not moving.any():
            break
        difference = z[:, None] - z[None, :]
        # Coinciding approximations push each other apart by nothing here; the next phase separates them.
        with np.errstate(all="ignore"):
            pull = np.where(difference == 0, 0, 1 / np.where(difference == 0, 1, difference)).sum(axis=1)
            step = newton / (1 - newton * pull)
        step = np.where(np.isfinite(step) & moving, step, 0)
        z = z - step
        moving &= np.abs(step) > 1e-15 * np.abs(z)
    return z


def _starting_points(mantissa: FloatArray, exponent: NDArray[np.int64]) -> ComplexArray:
    """Circles whose radii follow the upper convex hull of log|c_k| (Newton polygon)."""
    used = [k for k in range(len(mantissa)) if mantissa[k]]
    log = {k: math.log2(abs(mantissa[k])) + float(exponent[k]) for k in used}
    hull: list[int] = []
    for k in used:
        while len(hull) > 1 and (log[hull[-1]] - log[hull[-2]]) * (k - hull[-2]) <= (log[k] - log[hull[-2]]) * (
            hull[-1] - hull[-2]
        ):
            hull.pop()
        hull.append(k)
    points: list[complex] = []
    for low, high in pairwise(hull):
        radius_log2 = (log[low] - log[high]) / (high - low)
        if abs(radius_log2) > 300:
            raise DesignError("", f"has roots near 1e{radius_log2 * math.log10(2):+.0f} rad/s; check its units")
        angles = 2 * np.pi * np.arange(high - low) / (high - low) + 0.7 + 0.3 * low
        points.extend(2.0**radius_log2 * np.exp(1j * angles))
    return np.array(points, dtype=np.complex128)


def _newton_step(
    mantissa: FloatArray, exponent: NDArray[np.int64], z: ComplexArray
) -> tuple[ComplexArray, NDArray[np.bool_]]:
    """p/p' at each z, and where p is no more than rounding noise."""
    with np.errstate(divide="ignore"):
        scale = np.frexp(np.abs(z))[1].astype(np.int64)
    powers = exponent[None, :] + np.arange(len(mantissa)) * scale[:, None]
    powers -= powers.max(axis=1, keepdims=True)
    terms = np.ldexp(mantissa[None, :], np.clip(powers, -2000, 0).astype(np.intc))
    unit = np.ldexp(1.0, -scale.astype(np.intc))
    u = z * unit
    size = np.abs(u)
    value = np.zeros(len(z), dtype=np.complex128)
    slope = np.zeros(len(z), dtype=np.complex128)
    bound = np.zeros(len(z))
    for k in range(len(mantissa) - 1, -1, -1):
        slope = slope * u + value
        value = value * u + terms[:, k]
        bound = bound * size + np.abs(terms[:, k])
    noise = np.abs(value) <= 4e-16 * len(mantissa) * bound
    with np.errstate(all="ignore"):
        return value / slope / unit, noise


# Second phase: integer fixed point


@dataclass
class _FixedPoint:
    """Approximations (x + iy)/2^scale as integers, with `bits` significant bits for the smallest root."""

    x: list[int]
    y: list[int]
    scale: int
    bits: int
    effort: int = 0

    @classmethod
    def around(cls, z: ComplexArray, bits: int) -> _FixedPoint:
        smallest = min(math.frexp(abs(c))[1] for c in z.tolist())
        scale = max(bits - smallest, 1)
        x = [int(Fraction(c.real) * (1 << scale)) for c in z.tolist()]
        y = [int(Fraction(c.imag) * (1 << scale)) for c in z.tolist()]
        return cls(x, y, scale, bits)

    def refine_to(self, bits: int) -> None:
        shift = bits - self.bits
        self.x = [v << shift for v in self.x]
        self.y = [v << shift for v in self.y]
        self.scale += shift
        self.bits = bits

    def iterate(self, polynomial: IntPolynomial) -> list[int] | None:
        """Sweep until every root stands in rounding noise; radii of their discs, None where one has none."""
        count = len(self.x)
        evaluator = _Evaluator(polynomial, self.bits + count + 16)
        waiting = set(range(count))
        for _ in range(SWEEPS):
            self.effort += len(waiting) * count * (1 + self.bits // 300)
            if self.effort > MOST_EFFORT:
                raise _too_close()
            for i in sorted(waiting):
                if self._improve(i, evaluator):
                    waiting.discard(i)
            if not waiting:
                break
        radii = [evaluator.radius(self.x[i], self.y[i], self.scale) for i in range(count)]
        return None if None in radii else [r for r in radii if r is not None]

    def _improve(self, i: int, evaluator: _Evaluator) -> bool:
        """One Aberth step for root i; True when it has arrived."""
        x, y = self.x[i], self.y[i]
        level = max(abs(x), abs(y)).bit_length() + 1 - self.scale  # |z| < 2^level
        step = evaluator.newton_step(x, y, self.scale, level)
        if step is None:
            # A stationary point of p: leave it sideways.
            self.x[i] += (abs(x) >> 8) + 3
            self.y[i] += (abs(y) >> 9) + 5
            return False
        nx, ny, arrived = step
        if arrived:
            return True
        unit = 1 << (self.scale + level)
        pull = 0j
        for j, (other_x, other_y) in enumerate(zip(self.x, self.y, strict=True)):
            if j != i:
                difference = complex((x - other_x) / unit, (y - other_y) / unit)
                if difference:
                    pull += 1 / difference
        newton = complex(nx / unit, ny / unit)
        damping = 1 - newton * pull
        factor = 1 / damping if abs(damping) > 1e-6 else 1 + 0.5j
        fx, fy = int(factor.real * 2.0**60), int(factor.imag * 2.0**60)
        self.x[i] = x - ((nx * fx - ny * fy) >> 60)
        self.y[i] = y - ((nx * fy + ny * fx) >> 60)
        return False

    def decide(self, radii: list[int]) -> list[ExactComplex] | None:
        """Real roots and upper halves of pairs, None where the discs do not settle it yet."""
        count = len(radii)
        spots = [(self.x[i], self.y[i], radii[i]) for i in range(count)]
        if any(_touch(spots[i], spots[j]) for i in range(count) for j in range(i)):
            return None
        roots: list[ExactComplex] = []
        unit = 1 << self.scale
        pairs = 0
        for i, (x, y, radius) in enumerate(spots):
            reach = radius << ACCURACY_BITS
            if abs(y) > radius:
                # Components relative to themselves: the damping of a light mode is its small real part.
                if reach > abs(y) or reach > abs(x):
                    return None
                pairs += 1 if y > 0 else -1
                if y > 0:
                    roots.append((Fraction(x, unit), Fraction(y, unit)))
            elif reach > abs(x) or any(_touch((x, -y, radius), spots[j]) for j in range(count) if j != i):
                return None
            else:
                # Its mirror image meets no other disc, so the root is its own conjugate.
                roots.append((Fraction(x, unit), Fraction(0)))
        return roots if pairs == 0 else None


def _touch(one: tuple[int, int, int], other: tuple[int, int, int]) -> bool:
    reach = one[2] + other[2]
    return (one[0] - other[0]) ** 2 + (one[1] - other[1]) ** 2 <= reach * reach


class _Evaluator:
    """p and p' by Horner's rule in fixed point, scaled to the size of the argument."""

    def __init__(self, polynomial: IntPolynomial, width: int) -> None:
        self._polynomial = polynomial
        self._width = width
        self._degree = len(polynomial) - 1
        # Each step truncates by less than 3 units and |u| < 1, so the errors only add up.
        self._value_error = 4 * len(polynomial)
        self._slope_error = 4 * len(polynomial) ** 2
        self._scaled: dict[int, list[int]] = {}

    def _coefficients(self, level: int) -> list[int]:
        known = self._scaled.get(level)
        if known is None:
            powers = [(self._degree - k) * level for k in range(self._degree + 1)]
            top = max(abs(c).bit_length() + p for c, p in zip(self._polynomial, powers, strict=True) if c)
            known = [_shifted(c, p + self._width - top) for c, p in zip(self._polynomial, powers, strict=True)]
            self._scaled[level] = known
        return known

    def _evaluate(self, x: int, y: int, scale: int, level: int) -> tuple[int, int, int, int]:
        width = self._width
        ux = _shifted(x, width - scale - level)
        uy = _shifted(y, width - scale - level)
        hx = hy = dx = dy = 0
        for c in self._coefficients(level):
            dx, dy = ((dx * ux - dy * uy) >> width) + hx, ((dx * uy + dy * ux) >> width) + hy
            hx, hy = ((hx * ux - hy * uy) >> width) + c, (hx * uy + hy * ux) >> width
        return hx, hy, dx, dy

    def newton_step(self, x: int, y: int, scale: int, level: int) -> tuple[int, int, bool] | None:
        """p/p' in the units of x and y, and whether p is down in the noise; None where p' is."""
        hx, hy, dx, dy = self._evaluate(x, y, scale, level)
        arrived = max(abs(hx), abs(hy)) <= self._value_error
        size = dx * dx + dy * dy
        if size <= self._slope_error**2:
            return None
        shift = scale + level
        nx = _shifted(hx * dx + hy * dy, shift) // size
        ny = _shifted(hy * dx - hx * dy, shift) // size
        return nx, ny, arrived or (nx in (0, -1) and ny in (0, -1))

    def radius(self, x: int, y: int, scale: int) -> int | None:
        """Radius of a disc around (x, y) that holds a root, in the same units; None where p' is noise."""
        level = max(abs(x), abs(y)).bit_length() + 1 - scale
        hx, hy, dx, dy = self._evaluate(x, y, scale, level)
        slope = math.isqrt(dx * dx + dy * dy) - self._slope_error
        if slope <= 0:
            return None
        value = math.isqrt(hx * hx + hy * hy) + 1 + self._value_error
        # The argument itself is cut to `width` bits: two more units cover that.
        return (
            _shifted(self._degree * value, scale + level) // slope + 2 + (1 << max(scale + level - self._width + 1, 0))
        )


def _shifted(number: int, bits: int) -> int:
    return number << bits if bits >= 0 else number >> -bits
