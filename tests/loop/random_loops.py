"""Seeded random loops for the checks of roots and responses, and their polynomials at many digits."""

from __future__ import annotations

import mpmath as mp
import numpy as np

from engine.model.factored import ComplexArray, Factored


def random_roots(rng: np.random.Generator, count: int, decades: tuple[float, float], right: float) -> ComplexArray:
    """`count` roots: real ones, pairs damped from 0.0005 to 1, integrators; `right`: share in the right half plane."""
    roots: list[complex] = []
    while len(roots) < count:
        size = 10 ** rng.uniform(*decades)
        side = 1.0 if rng.random() < right else -1.0
        if count - len(roots) >= 2 and rng.random() < 0.55:
            damping = 10 ** rng.uniform(-3.3, 0.0)
            root = size * complex(side * damping, np.sqrt(1.0 - damping * damping))
            roots += [root, root.conjugate()]
        else:
            roots.append(0j if rng.random() < 0.15 else complex(side * size))
    return np.array(roots, dtype=np.complex128)


def random_loop(
    rng: np.random.Generator, order: int, decades: tuple[float, float], right: float = 0.1, excess: int = 0
) -> Factored:
    """A loop whose gain makes |L| = 1 somewhere inside the decades; either sign."""
    poles = random_roots(rng, order, decades, right)
    zeros = random_roots(rng, int(rng.integers(0, order - excess + 1)), decades, right)
    crossing = 10 ** rng.uniform(*decades)
    size = np.prod(np.abs(1j * crossing - poles) / crossing) / np.prod(np.abs(1j * crossing - zeros) / crossing)
    gain = size * crossing ** (len(poles) - len(zeros)) * rng.choice([-1.0, 1.0, 1.0])
    return Factored(float(gain), zeros, poles)


def expanded(roots: ComplexArray) -> list[mp.mpf]:
    """Real coefficients of Π(s − root), highest power first, in the working precision of mpmath."""
    total = [mp.mpf(1)]
    for root in roots:
        if root.imag < 0.0:
            continue
        factor = [mp.mpf(1), -mp.mpf(root.real)]
        if root.imag > 0.0:
            factor = [mp.mpf(1), -2 * mp.mpf(root.real), mp.mpf(root.real) ** 2 + mp.mpf(root.imag) ** 2]
        product = [mp.mpf(0)] * (len(total) + len(factor) - 1)
        for i, a in enumerate(total):
            for j, b in enumerate(factor):
                product[i + j] += a * b
        total = product
    return total


def characteristic_polynomial(loop: Factored) -> list[mp.mpf]:
    """Coefficients of D + N, highest power first."""
    d = expanded(loop.poles)
    n = [mp.mpf(loop.gain) * c for c in expanded(loop.zeros)]
    length = max(len(d), len(n))
    return [a + b for a, b in zip([0] * (length - len(d)) + d, [0] * (length - len(n)) + n, strict=True)]
