"""Roots of a function between two places where its sign differs, to the working precision."""

from __future__ import annotations

from collections.abc import Callable

from mpmath import mp, mpf


def bracketed_root(f: Callable[[mpf], mpf], a: mpf, b: mpf) -> mpf:
    """The place between a and b where f changes sign: 60 bisections, then secant steps until they stand still."""
    fa, fb = f(a), f(b)
    if fa == 0 or fb == 0:
        return a if fa == 0 else b
    if fa * fb > 0:
        raise ArithmeticError(f"no change of sign between {a} and {b}")
    for _ in range(60):
        middle = (a + b) / 2
        value = f(middle)
        if value == 0:
            return middle
        if value * fa < 0:
            b, fb = middle, value
        else:
            a, fa = middle, value
    for _ in range(12):
        if fb == fa:
            break
        a, fa, b = b, fb, b - fb * (b - a) / (fb - fa)
        fb = f(b)
        if abs(b - a) <= mpf(10) ** (5 - mp.dps) * abs(b):
            break
    return b
