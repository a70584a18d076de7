"""Real and complex polynomials at high precision: coefficients lowest power first, roots with an error bound."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from itertools import pairwise

import numpy as np
from mpmath import mp, mpc, mpf

DIGITS = 60
"""Digits that every reference value is meant to carry."""
ACCURACY_BITS = 150
"""A root counts as found when its error bound is below 2**-150 (45 digits) of its own size."""


def multiply(a: Sequence, b: Sequence) -> list:
    """The product's coefficients."""
    product = [mpf(0)] * (len(a) + len(b) - 1)
    for i, x in enumerate(a):
        for j, y in enumerate(b):
            product[i + j] += x * y
    return product


def add(a: Sequence, b: Sequence) -> list:
    """The sum's coefficients."""
    longer, shorter = (list(a), b) if len(a) >= len(b) else (list(b), a)
    for i, y in enumerate(shorter):
        longer[i] += y
    return longer


def scale(a: Sequence, factor: mpf) -> list:
    """Every coefficient times `factor`."""
    return [factor * x for x in a]


def derivative(a: Sequence) -> list:
    """The derivative's coefficients; [0] for a constant."""
    return [i * x for i, x in enumerate(a)][1:] or [mpf(0)]


def evaluate(a: Sequence, at: mpc) -> mpc:
    """The polynomial's value, by Horner's rule."""
    total = mpf(0)
    for x in reversed(a):
        total = total * at + x
    return total


def from_roots(roots: Sequence, gain: float = 1) -> list:
    """gain · Π(s − root), real, from roots in which every complex one comes with its conjugate."""
    product = [mpf(gain)]
    for root in roots:
        if mp.im(root) == 0:
            product = multiply(product, [-mp.re(root), mpf(1)])
        elif mp.im(root) > 0:
            product = multiply(product, [abs(root) ** 2, -2 * mp.re(root), mpf(1)])
    return product


def on_axis(a: Sequence) -> list:
    """Complex coefficients in ω of the polynomial at s = jω."""
    turn = (mpc(1), mpc(0, 1), mpc(-1), mpc(0, -1))
    return [x * turn[i % 4] for i, x in enumerate(a)]


def magnitude_squared(a: Sequence) -> list:
    """Coefficients in x = ω² of |a(jω)|² for a real polynomial."""
    mirrored = [x if i % 2 == 0 else -x for i, x in enumerate(a)]
    even = multiply(a, mirrored)[::2]
    return [x if i % 2 == 0 else -x for i, x in enumerate(even)]


def trimmed(a: Sequence) -> list:
    """Without leading zero coefficients, and without those that are only rounding of the sum that made them."""
    a = list(a)
    while len(a) > 1 and a[-1] == 0:
        a.pop()
    return a


def roots(coefficients: Sequence, wanted: Callable[[mpc], bool] = lambda root: True) -> list[mpc]:
    """All roots, each `wanted` one with an error bound below 2**-150 of its size; zeros at the origin first.

    Aberth's simultaneous iteration, started from the Newton polygon and run first in double precision. Multiple
    roots settle slowly: name the wanted ones where a many-fold root elsewhere is known and of no interest.
    """
    a = trimmed(coefficients)
    at_origin = next(i for i, x in enumerate(a) if x != 0)
    a = a[at_origin:]
    found: list[mpc] = []
    if len(a) > 1:
        for digits in (80, 160, 320, 640):
            with mp.workdps(digits):
                found = _aberth(a, _double_start(a))
                if all(_error_bound(a, z) <= mpf(2) ** -ACCURACY_BITS * abs(z) for z in found if wanted(z)):
                    break
        else:
            raise ArithmeticError("polynomial roots do not settle at 640 digits")
    dust = mpf(2) ** -ACCURACY_BITS  # an imaginary part below the error bound is no imaginary part
    return [mpc(0)] * at_origin + [mpc(mp.re(z)) if abs(mp.im(z)) <= dust * abs(z) else z for z in found]


def _error_bound(a: Sequence, z: mpc) -> mpf:
    """Radius of a disk around `z` that holds a root: the least of (n choose k)-type bounds by derivatives.

    For a k-fold root the k-th Taylor coefficient gives the bound |n!/(k!(n−k)!)·p(z)/c_k|^(1/k).
    """
    bounds = []
    taylor = list(a)
    value = abs(evaluate(a, z)) + mpf(2) ** (-mp.prec) * sum(abs(x) * abs(z) ** i for i, x in enumerate(a))
    for k in range(1, min(len(a), 13)):
        taylor = derivative(taylor)
        slope = abs(evaluate(taylor, z)) / mp.factorial(k)
        if slope:
            bounds.append((mp.binomial(len(a) - 1, k) * value / slope) ** (mpf(1) / k))
    return min(bounds)


def _double_start(a: Sequence) -> list[mpc]:
    """Starting points: one circle for every edge of the upper hull of (i, ln|a_i|) (Bini 1996)."""
    points = [(i, float(mp.log(abs(x)))) for i, x in enumerate(a) if x != 0]
    hull: list[tuple[int, float]] = []
    for point in points:
        while len(hull) > 1 and _turns_up(hull[-2], hull[-1], point):
            hull.pop()
        hull.append(point)
    start = []
    for (i, low), (j, high) in pairwise(hull):
        radius = mp.exp(mpf((low - high) / (j - i)))
        start += [radius * mp.expjpi(mpf(2) * k / (j - i) + mpf("0.2371") + mpf(i) / 7) for k in range(j - i)]
    return start


def _turns_up(a: tuple[int, float], b: tuple[int, float], c: tuple[int, float]) -> bool:
    return (b[1] - a[1]) * (c[0] - a[0]) <= (c[1] - a[1]) * (b[0] - a[0])


def _aberth(a: Sequence, start: Sequence[mpc]) -> list[mpc]:
    """Aberth's iteration until no root moves by more than the working precision allows."""
    slope = derivative(a)
    z = _warm(a, list(start))
    done = [False] * len(z)
    for _ in range(400):
        for i, zi in enumerate(z):
            if done[i]:
                continue
            value = evaluate(a, zi)
            noise = mpf(2) ** (4 - mp.prec) * sum(abs(x) * abs(zi) ** k for k, x in enumerate(a))
            if abs(value) <= noise:
                done[i] = True
                continue
            newton = evaluate(slope, zi) / value
            others = mp.fsum(1 / (zi - zj) for j, zj in enumerate(z) if j != i and zj != zi)
            step = 1 / (newton - others)
            z[i] = zi - step
            done[i] = abs(step) < mpf(2) ** (6 - mp.prec) * abs(zi)
        if all(done):
            return z
    return z


def _warm(a: Sequence, start: list[mpc]) -> list[mpc]:
    """The same iteration in double precision, where the coefficients fit, to spare slow steps."""
    size = max(abs(x) for x in a)
    b = np.array([complex(x / size) for x in a])
    z = np.array([complex(x) for x in start])
    if len(z) < 3 or not np.all(np.isfinite(z)) or np.any(np.abs(b[[0, -1]]) < 1e-290):
        return start
    with np.errstate(all="ignore"):
        for _ in range(60):
            newton = _log_slope(b, z)
            gaps = z[:, None] - z[None, :]
            np.fill_diagonal(gaps, np.inf)
            z = z - 1 / (newton - np.sum(1 / gaps, axis=1))
    if not np.all(np.isfinite(z)) or len(set(z)) < len(z):
        return start
    return [mpc(x) for x in z]


def _log_slope(b: np.ndarray, z: np.ndarray) -> np.ndarray:
    """p'/p in double precision, through the reversed polynomial outside the unit circle."""
    n = len(b) - 1
    inside = np.abs(z) <= 1
    inner = np.polyval((b[1:] * np.arange(1, n + 1))[::-1], z) / np.polyval(b[::-1], z)
    w = 1 / z
    reverse_slope = b[:-1] * np.arange(n, 0, -1)
    outer = w * (n - w * np.polyval(reverse_slope, w) / np.polyval(b, w))
    return np.where(inside, inner, outer)


def near_positive_real(root: mpc) -> bool:
    """Whether a rough root may turn out real and positive."""
    return mp.re(root) > 0 and abs(mp.im(root)) <= mpf("1e-4") * abs(root)


def positive_real_roots(coefficients: Sequence) -> list[mpf]:
    """The real positive roots, increasing, a multiple root once."""
    return positive_real(roots(coefficients, near_positive_real))


def positive_real(candidates: Sequence[mpc]) -> list[mpf]:
    """The roots that are real and positive, increasing, a multiple root once.

    A root is taken as real when its imaginary part is below 2**-(ACCURACY_BITS/3) of its size: a true pair off the
    axis that near is not met in practice, and a real triple root still passes.
    """
    near = mpf(2) ** -(ACCURACY_BITS // 3)
    real = sorted(mp.re(z) for z in candidates if mp.re(z) > 0 and abs(mp.im(z)) <= near * abs(z))
    return [x for i, x in enumerate(real) if i == 0 or x - real[i - 1] > near * x]
